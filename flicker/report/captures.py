"""Captures measured one by one: each becomes data, words and pictures, and its samples are let go."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from flicker.errors import FlickerError, NotMeasurable
from flicker.report.overview import OverviewEntry

if TYPE_CHECKING:
    from flicker.aliases import Seen
    from flicker.markup import Markup
    from flicker.reports import CaptureReport
    from flicker.sweep.manifest import Step


@dataclass(frozen=True)
class Task:
    """What is done to every capture of a run."""

    reading: Mapping[str, Any]  # keywords of `flicker.read`
    measuring: Mapping[str, Any]  # keywords of `flicker.measure`
    width: int = 100
    colour: bool = False
    verbose: bool = False
    figures: Path | None = None  # folder for pictures
    camera: str | None = None  # camera file, for the picture of the predicted frame
    page: bool = False  # whether to make its part of the page


@dataclass(frozen=True)
class Measured:
    """What came of one capture; a capture that could not be read has an error and no words."""

    data: dict[str, Any]  # its entry in the JSON
    entries: tuple[OverviewEntry, ...]
    words: str = ""
    error: str = ""
    no_picture: dict[str, str] = field(default_factory=dict)  # pictures that could not be drawn, and why
    seen: Seen | None = None  # the frequency that it shows
    article: Markup | None = None  # its part of the page, where one was asked for


def measure_capture(item: tuple[Step, str], task: Task) -> Measured:
    """
    Read and measure one capture, put it into words, draw its pictures.

    Parameters
    ----------
    item : (Step, str)
        The capture with what its manifest says of it, and the name for its pictures.
    task : Task
        What is done.

    Returns
    -------
    Measured
        Plain data that travels between processes.
    """
    from flicker.analysis import measure, read, seen_in
    from flicker.report.overview import overview_entries
    from flicker.report.words import capture_words
    from flicker.reports import CaptureReport

    step, name = item
    reading = dict(task.reading)
    if step.dark_level is not None:
        reading["dark_level"] = step.dark_level
    try:
        (capture,) = measure(read(step.capture, **reading), **task.measuring).captures
    except FlickerError as error:
        capture = CaptureReport(step.capture, None, error=str(error))
        return Measured(_data(capture, step), tuple(overview_entries(capture)), error=str(error))
    no_picture: dict[str, str] = {}
    if task.figures is not None:
        from flicker.plots.pictures import write_pictures

        no_picture = dict(write_pictures(capture, task.figures, name).missing)
        if task.camera is not None:
            no_picture |= _write_frame(capture, task.camera, task.figures / f"{name}-frame.png")
    words = capture_words(capture, width=task.width, colour=task.colour, verbose=task.verbose)
    article = None
    if task.page:
        from flicker.report.sheets import capture_article

        article = capture_article(capture)
    found = tuple(overview_entries(capture))
    return Measured(_data(capture, step), found, words, "", no_picture, seen_in(capture), article)


def _write_frame(capture: CaptureReport, camera: str, file: Path) -> dict[str, str]:
    """Draw what a camera will record at the exposures of its file; give the reason where it cannot be told."""
    from flicker.camera import Camera
    from flicker.camera.answer import predict_all
    from flicker.plots.frame import draw_exposures, draw_frame
    from flicker.plots.style import save_figure

    try:
        answer = predict_all(capture.light, Camera.load(camera))
    except NotMeasurable as reason:
        return {file.stem: str(reason)}
    save_figure(draw_frame(answer, 0) if len(answer.predictions) == 1 else draw_exposures(answer), file)
    return {}


def _data(capture: Any, step: Step) -> dict[str, Any]:
    conditions = step.to_dict()
    return {**capture.to_dict(), **({"conditions": conditions} if conditions else {})}
