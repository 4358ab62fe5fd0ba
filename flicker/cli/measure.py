"""`flicker measure`: what a light is, how deep it flickers, how risky that is."""

from __future__ import annotations

from typing import Any

import click

from flicker.cli.options import (
    given,
    many_options,
    output_options,
    page_option,
    reading_options,
    uncertainty_options,
    window_option,
)
from flicker.cli.output import (
    colour_wanted,
    command_line,
    complain,
    make_folder,
    print_words,
    spare_the_captures,
    terminal_width,
    write_json,
)
from flicker.errors import ExitStatus, UnreadableFileError


@click.command(short_help="Depth, frequency and risk of a light, with intervals.")
@click.argument("captures", nargs=-1, metavar="CAPTURE...")
@reading_options
@uncertainty_options
@window_option
@click.option(
    "--same-light",
    is_flag=True,
    help="The captures show one light at different rates: find the frequency that fits them all.",
)
@many_options
@output_options
@page_option
@click.option(
    "--figures",
    metavar="DIR",
    help="Write the waveform, the spectrum, the risk plane and, with --window, the course of the measures as pictures.",
)
@click.option("--camera", "camera_file", metavar="FILE.toml", help="With --figures: draw what this camera will record.")
@click.option("--verbose", is_flag=True, help="Add how each figure was obtained, the lines, the history.")
def command(
    captures: tuple[str, ...],
    clock_ppm: float | None,
    dark_uncertainty: float | None,
    window: float | None,
    same_light: bool,
    manifest: str | None,
    workers: int,
    json_target: str | None,
    quiet: bool,
    html_target: str | None,
    figures: str | None,
    camera_file: str | None,
    verbose: bool,
    **reading: Any,
) -> None:
    """Measure every CAPTURE and print all measures with their intervals and the risk region.

    A capture is a file from a photodiode (WAV, CSV) or a video. The answer comes first: what the light is, how deep it
    flickers, how that stands against IEEE 1789-2015, what to do next.

    Example:

        flicker measure bridge-display-night.csv --dark-level 0.012
    """
    from functools import partial

    from flicker.report.captures import Task, measure_capture
    from flicker.report.words import closing_words, same_light_words
    from flicker.reports import Report
    from flicker.sweep.manifest import Step, read_manifest
    from flicker.workers import counted, side_by_side

    steps = (*(read_manifest(manifest) if manifest else ()), *(Step(capture) for capture in captures))
    if not steps:
        raise click.UsageError("no capture: name one, or a table of them with --manifest")
    paths = [step.capture for step in steps]
    spare_the_captures([*paths, *filter(None, [manifest, reading["dark_capture"]])], [json_target, html_target])
    if camera_file:
        from flicker.camera import Camera

        Camera.load(camera_file)  # a broken file is told before the work begins
        if not figures:
            raise click.UsageError("--camera draws the predicted frame: say where with --figures")
    folder = make_folder(figures) if figures else None
    names = [""] * len(paths)
    if folder:
        from flicker.plots.pictures import picture_names

        names = picture_names(paths)
    width, colour = terminal_width(), colour_wanted()
    measuring = given(clock_ppm=clock_ppm, dark_uncertainty=dark_uncertainty, window=window)
    task = Task(given(**reading), measuring, width, colour, verbose, folder, camera_file, html_target is not None)
    results = []
    found = side_by_side(partial(measure_capture, task=task), list(zip(steps, names, strict=True)), workers)
    for _, result in zip(counted(paths, "capture", len(paths)), found, strict=False):
        if result.error and len(steps) == 1:
            raise UnreadableFileError(result.error)
        if result.error:
            complain(result.error)
        for picture, reason in result.no_picture.items():
            complain(f"no picture {picture}: {reason}")
        if result.words:
            print_words(result.words + "\n", json_target)
        results.append(result)
    settled = None
    if same_light:
        from flicker.aliases import settle

        seen = [result.seen for result in results if result.seen]
        settled = settle(seen, None if clock_ppm is None else 1e-6 * clock_ppm)
    common = {"same_light": settled.to_dict()} if settled else {}
    write_json({**Report(()).to_dict(), "captures": [result.data for result in results], **common}, json_target)
    if html_target:
        from flicker.files import write_text
        from flicker.report.pages import measured_page

        write_text(html_target, measured_page(results, command_line()))
    entries = [entry for result in results for entry in result.entries]
    for block in closing_words(entries, width=width, colour=colour):
        print_words(block + "\n", json_target)
    if settled:
        print_words(same_light_words(settled, width=width, colour=colour) + "\n", json_target)
    if any(result.error for result in results):
        raise SystemExit(int(ExitStatus.UNUSABLE_INPUT))
