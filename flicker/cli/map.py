"""`flicker map`: flicker over the picture."""

from __future__ import annotations

from typing import Any

import click

from flicker.cli.options import TIME, output_options, page_option, video_options
from flicker.cli.output import command_line, make_folder, print_words, spare_the_captures, terminal_width, write_json


@click.command("map", short_help="Depth, frequency, phase and level over the picture.")
@click.argument("video", metavar="VIDEO")
@video_options
@click.option("--exposure", type=TIME, help="How long a line collects light; fitted if left out.")
@click.option("--camera", "camera_file", metavar="FILE.toml", help="Camera file; the options override it.")
@click.option("--rows", type=click.IntRange(1, 200), default=12, help="Rows of the grid; 12 if left out.")
@click.option("--columns", type=click.IntRange(1, 48), default=16, help="Columns of the grid; 16 if left out.")
@output_options
@page_option
@click.option("--figures", metavar="DIR", help="Write heat maps into a folder.")
def command(
    video: str,
    rows: int,
    columns: int,
    camera_file: str | None,
    json_target: str | None,
    quiet: bool,
    html_target: str | None,
    figures: str | None,
    **how: Any,
) -> None:
    """Map depth, frequency, phase and level over the picture of a VIDEO, and find the zones of a backlight.

    A fast video (240 frames/s and more) needs nothing else; one at an ordinary rate needs the line time. Film the
    screen square, filling the picture, from a tripod with the exposure locked, showing one even grey or white.

    Example:

        flicker map bridge-display-1000fps.mp4 --frame-rate 1000 --exposure 1/2000 --figures pictures
    """
    from flicker.filmed import from_camera, map_video
    from flicker.report.video import map_words

    spare_the_captures([video], [json_target, html_target])
    if camera_file is not None:
        how = from_camera(camera_file, how)
    found = map_video(video, rows=rows, columns=columns, **how)
    words = map_words(found, video, width=terminal_width())
    if figures is not None:
        from flicker.plots.screen import save_map

        words += f"\n  pictures: {save_map(found, make_folder(figures))}"
    write_json(found.to_dict(), json_target)
    if html_target:
        from flicker.files import write_text
        from flicker.report.pages import map_page

        write_text(html_target, map_page(found, video, command_line()))
    print_words(words, json_target)
