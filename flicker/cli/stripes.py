"""`flicker stripes`: the light read back from an ordinary rolling-shutter video."""

from __future__ import annotations

from typing import Any

import click

from flicker.cli.options import TIME, output_options, page_option, video_options
from flicker.cli.output import command_line, print_words, spare_the_captures, terminal_width, write_json


@click.command(short_help="Read the light back from the bands of an ordinary video.")
@click.argument("video", metavar="VIDEO")
@video_options
@click.option("--exposure", type=TIME, help="How long a line collects light; fitted where the bands show it.")
@click.option("--camera", "camera_file", metavar="FILE.toml", help="Camera file; the options override it.")
@click.option("--clock-ppm", type=float, metavar="PPM", help="Standard uncertainty of the camera's clock.")
@output_options
@page_option
def command(
    video: str, camera_file: str | None, json_target: str | None, quiet: bool, html_target: str | None, **how: Any
) -> None:
    """Read the light back from the bands of a rolling-shutter VIDEO, every line a sample.

    Film the lit surface from a tripod with exposure, gain and focus locked, with a short exposure, at a frame rate of
    which the light's frequency is no multiple. The line time comes from flicker line-time or a camera file.

    Example:

        flicker stripes dock-lamp.mp4 --line-time 14.8us --exposure 1/1000
    """
    from flicker.filmed import from_camera, read_back
    from flicker.report.video import stripes_words

    spare_the_captures([video], [json_target, html_target])
    if camera_file is not None:
        how = from_camera(camera_file, how)
    report = read_back(video, **how)
    write_json(report.to_dict(), json_target)
    if html_target:
        from flicker.files import write_text
        from flicker.report.pages import film_page

        write_text(html_target, film_page(report, command_line()))
    print_words(stripes_words(report, width=terminal_width()), json_target)
