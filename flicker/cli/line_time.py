"""`flicker line-time`: a camera's line time from a light of known frequency."""

from __future__ import annotations

import click

from flicker.cli.options import FREQUENCY, MOMENT, TIME, Region, output_options
from flicker.cli.output import print_words, spare_the_captures, terminal_width, write_json


@click.command(short_help="A camera's line time, from a light of known frequency.")
@click.argument("video", metavar="VIDEO")
@click.option("--light-frequency", type=FREQUENCY, required=True, help="Frequency of the light in view.")
@click.option("--light-ppm", type=float, metavar="PPM", help="Standard uncertainty of that frequency.")
@click.option("--frame-rate", type=FREQUENCY, help="Frame rate at which the video was really shot.")
@click.option("--region", type=Region(), help="Part of the picture, as stored, in pixels.")
@click.option("--transfer", metavar="NAME|GAMMA", help="How code values relate to light.")
@click.option("--read-direction", metavar="down|up|left|right", help="The way the lines are read; found if left out.")
@click.option("--start", type=MOMENT, help="Where to begin in the video.")
@click.option("--duration", type=TIME, help="How much of the video to use.")
@click.option("--camera-out", metavar="FILE.toml", help="Write a camera file for the other commands.")
@output_options
def command(
    video: str,
    light_frequency: float,
    light_ppm: float | None,
    camera_out: str | None,
    json_target: str | None,
    quiet: bool,
    frame_rate: float | None,
    region: tuple[int, int, int, int] | None,
    transfer: str | None,
    read_direction: str | None,
    start: float | None,
    duration: float | None,
) -> None:
    """Measure a camera's line time from a VIDEO of a light of known frequency.

    A light-emitting diode on a crystal-driven generator serves, or a lamp on the mains (100 or 120 Hz, good to
    about 0.1 %). Choose a frequency that is no multiple of half the frame rate and gives some 8 to 30 bands, a short
    exposure, and a diffuser before the lens. The line time belongs to this mode of the camera: crop, resolution, bit
    depth and frame rate change it.

    Example:

        flicker line-time generator-1003hz.mp4 --light-frequency 1003 --camera-out dock-camera.toml
    """
    from flicker.camera.line_time import camera_file
    from flicker.files import write_text
    from flicker.filmed import find_line_time
    from flicker.report.video import line_time_words

    spare_the_captures([video], [json_target, camera_out])
    found = find_line_time(
        video,
        light_frequency,
        light_ppm=light_ppm or 0.0,
        frame_rate=frame_rate,
        region=region,
        transfer=transfer,
        read_direction=read_direction,
        start=start,
        duration=duration,
    )
    if camera_out is not None:
        write_text(camera_out, camera_file(found.camera))
    write_json(found.to_dict(), json_target)
    print_words(line_time_words(found, video, camera_out, width=terminal_width()), json_target)
