"""`flicker stripes`: the light read back from an ordinary rolling-shutter video."""

from __future__ import annotations

from typing import Any

import click

from flicker.cli.options import TIME, output_options, video_options
from flicker.cli.output import print_words, spare_the_captures, terminal_width, write_json


@click.command()
@click.argument("video", metavar="VIDEO")
@video_options
@click.option("--exposure", type=TIME, help="How long a line collects light; fitted where the bands show it.")
@click.option("--camera", "camera_file", metavar="FILE.toml", help="Camera file; the options override it.")
@click.option("--clock-ppm", type=float, metavar="PPM", help="Standard uncertainty of the camera's clock.")
@output_options
def command(video: str, camera_file: str | None, json_target: str | None, quiet: bool, **how: Any) -> None:
    """Read the light back from the bands of a rolling-shutter VIDEO, every line a sample.

    Film the lit surface from a tripod with exposure, gain and focus locked, with a short exposure, at a frame rate of
    which the light's frequency is no multiple. The line time comes from flicker line-time or a camera file.

    Example:

        flicker stripes dock-lamp.mp4 --line-time 14.8us --exposure 1/1000
    """
    from flicker.filmed import from_camera, read_back
    from flicker.report.video import stripes_words

    spare_the_captures([video], [json_target])
    if camera_file is not None:
        how = from_camera(camera_file, how)
    report = read_back(video, **how)
    write_json(report.to_dict(), json_target)
    print_words(stripes_words(report, width=terminal_width()), json_target)
