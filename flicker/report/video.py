"""What was read from a video, in words."""

from __future__ import annotations

import textwrap
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.figures import measure_name, measured, quantity
from flicker.report.answer import REGION_MARKS, REGION_WORDS

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from flicker.camera.line_time import LineTime
    from flicker.camera.screen import ScreenMap, Zone
    from flicker.camera.stripes import ChannelStripes
    from flicker.filmed import FilmReport
    from flicker.results import Measure, Note

_NOTE_MARKS = {"error": "!!", "warning": "! ", "info": "i "}
_ZONES_LISTED = 40
_ZONE_COLUMNS = (4, 5, 12, 15, 10, 14, 5)  # characters
_SHOWN = ("percent_flicker", "flicker_index", "rms_modulation", "duty_cycle", "svm", "decay_time")


def stripes_words(report: FilmReport, *, width: int = 100) -> str:
    """
    Put the light of a video into words: the answer first, then a table of the channels, then the doubts.

    Parameters
    ----------
    report : FilmReport
        From `flicker.filmed.read_back`.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        Lines without a line break at the end.
    """
    stripes = report.stripes
    lines = [Path(report.path).name, film_recording(report), ""]
    for label, text in film_answers(report).items():
        lines += _wrapped(text, width, f"  {label:<5}  ", "         ")
    lines.append("")
    lines += list(_table(stripes.channels))
    if stripes.frequency.value is None and stripes.alternatives:
        lines += ["", "  pairs of frequency and line time that fit alike"]
        lines += [
            f"    {quantity(pair['frequency_hz'], 'Hz', 6):<12}  {quantity(pair['line_time_s'], 's')}"
            for pair in stripes.alternatives[:12]
        ]
    lines += list(notes_words(stripes.notes, width))
    return "\n".join(lines)


def film_recording(report: FilmReport) -> str:
    """Say what was filmed: how long, how many frames and lines, at which line time and exposure."""
    stripes, footage = report.stripes, report.stripes.footage
    line = f"{quantity(stripes.line_time, 's')} a line" if stripes.line_time else "line time unknown"
    told = "" if stripes.exposure_told else " (fitted)"
    exposure = f"exposure {quantity(stripes.exposure, 's')}{told}" if stripes.exposure else "exposure unknown"
    return (
        f"{quantity(footage.duration, 's')}: {footage.frames} frames at {quantity(footage.frame_rate, 'Hz', 5)}, "
        f"{footage.lines} lines read {footage.read_direction}, {line}, {exposure}"
    )


def film_answers(report: FilmReport) -> dict[str, str]:
    """Give what is read first, by its label: what it is, how deep, how risky, what to do next."""
    stripes = report.stripes
    deepest = max(stripes.channels, key=lambda channel: channel.measures["percent_flicker"].value or 0.0)
    return {
        "What": ", and ".join(_what(one.frequency) for one in (stripes, *stripes.others)),
        "Depth": _depth(deepest),
        "Risk": _risk(report),
        "Next": _next(report),
    }


def _what(frequency: Measure) -> str:
    if frequency.value is None:
        return f"no frequency: {frequency.reason}"
    value, interval = measured(frequency)
    return f"{value} {interval}, by the camera's clock".replace("  ", " ")


def _depth(channel: ChannelStripes) -> str:
    measure = channel.measures["percent_flicker"]
    if measure.value is None:
        return f"not known: {measure.reason}"
    value, interval = measured(measure)
    return (
        f"percent flicker {value} ({interval}) in {channel.name}; bands of "
        f"{quantity(100 * min(channel.bands.contrast, 1.0), '%')}"
    )


def _risk(report: FilmReport) -> str:
    regions = [region for channel in report.stripes.channels if (region := report.region(channel)) is not None]
    if not regions:
        return "not known without the depth"
    order = list(REGION_WORDS)
    worst = max(regions, key=lambda region: order.index(region.region))
    return f"{REGION_MARKS[worst.region]} {REGION_WORDS[worst.region]} (IEEE 1789-2015, from the deepest channel)"


def _next(report: FilmReport) -> str:
    stripes = report.stripes
    if stripes.line_time is None:
        return "measure the camera's line time: film a light of known frequency and run flicker line-time"
    if stripes.exposure is None:
        return "state --exposure, or film with a shorter one so that the bands show more harmonics"
    broken = next((note for note in stripes.notes if note.severity != "info"), None)
    return (
        f"mend the capture first: see {broken.code} below"
        if broken
        else "hold it against limits: flicker limits lists them"
    )


def channel_rows(channels: Sequence[ChannelStripes]) -> list[list[str]]:
    """Give the cells of a table of the channels side by side, a measure a row, their names in the first."""
    shown = [name for name in _SHOWN if any(channel.measures[name].value is not None for channel in channels)]
    cells = [["", *(channel.name for channel in channels)]]
    for name in shown:
        row = [measure_name(name)]
        for channel in channels:
            measure = channel.measures[name]
            row.append("-" if measure.value is None else " ".join(part for part in measured(measure) if part))
        cells.append(row)
    return cells if shown else []


def _table(channels: Sequence[ChannelStripes]) -> Iterable[str]:
    cells = channel_rows(channels)
    wide = [max(len(row[column]) for row in cells) for column in range(len(channels) + 1)] if cells else []
    for row in cells:
        yield "  " + "  ".join(cell.ljust(size) for cell, size in zip(row, wide, strict=True)).rstrip()


def line_time_words(found: LineTime, path: str, written: str | None, *, width: int = 100) -> str:
    """
    Put a line time into words.

    Parameters
    ----------
    found : LineTime
        From `flicker.filmed.find_line_time`.
    path : str
        The video.
    written : str or None
        Camera file that was written.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        Lines without a line break at the end.
    """
    footage = found.footage
    lines = [Path(path).name, ""]
    for label, measure in (
        ("line time", found.line_time),
        ("line rate", found.line_rate),
        ("readout time", found.readout_time),
    ):
        value, interval = measured(measure)
        lines.append(f"  {label:<12}  {value} {interval}".rstrip())
    lines.append(f"  {'lines':<12}  {footage.lines_of_frame}, read {footage.read_direction}")
    lines.append(f"  {'frames':<12}  {footage.frames} at {quantity(footage.frame_rate, 'Hz', 6)}")
    bands = abs(found.bands.turns_per_line) * footage.lines_of_frame
    contrast = quantity(100 * min(found.bands.contrast, 1.0), "%")
    lines += [f"  {'bands':<12}  {bands:.3g} a frame, contrast {contrast}", ""]
    advice = f"written to {written}" if written else "keep it with --camera-out FILE.toml"
    lines += _wrapped(f"{advice}; it holds for this mode of the camera only", width, "  ", "  ")
    return "\n".join([*lines, *notes_words(found.notes, width)])


def map_words(found: ScreenMap, path: str, *, width: int = 100) -> str:
    """
    Put a map into words: what the zones do together, then one line a zone.

    Parameters
    ----------
    found : ScreenMap
        From `flicker.filmed.map_video`.
    path : str
        The video.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        Lines without a line break at the end.
    """
    lines = [Path(path).name, map_recording(found), "", f"  {map_headline(found)}"]
    head, rows = zone_rows(found.zones[:_ZONES_LISTED])
    if rows:
        lines += ["", "  " + _zone_line(head)]
    lines += ["  " + _zone_line(row) for row in rows]
    return "\n".join([*lines, *notes_words(found.notes, width)])


def _zone_line(cells: Sequence[str]) -> str:
    return "  ".join(cell.ljust(size) for cell, size in zip(cells, _ZONE_COLUMNS, strict=True)).rstrip()


def map_recording(found: ScreenMap) -> str:
    """Say what was filmed, and how fine the grid is."""
    rows, columns = found.mean.shape
    footage = found.footage
    return f"{footage.frames} frames at {quantity(footage.frame_rate, 'Hz', 5)}, a grid of {rows} x {columns} cells"


def map_headline(found: ScreenMap) -> str:
    """Say how many zones flicker, and what they do together."""
    return f"{len(found.zones)} zones that flicker ({found.kind}); {int(found.dark.sum())} cells are dark"


def zone_rows(zones: Sequence[Zone]) -> tuple[Sequence[str], Sequence[Sequence[str]]]:
    """Give the head and the cells of a table of zones."""
    rows = []
    for number, zone in enumerate(zones, 1):
        frequency = "-" if zone.frequency is None else quantity(zone.frequency, "Hz", 6)
        duty = "-" if zone.duty is None else f"{zone.duty:.3f}"
        phase = "-" if zone.phase is None else f"{zone.phase:+.3f}"
        depth = quantity(zone.percent_flicker, "%", 4)
        cells = str(len(zone.cells))
        rows.append((str(number), cells, frequency, depth, duty, phase, f"{zone.mean:.3f}"))
    return ("zone", "cells", "frequency", "percent flicker", "duty cycle", "phase (cycles)", "level"), rows


def notes_words(notes: Iterable[Note], width: int) -> Iterable[str]:
    """Give the doubts, the gravest first, after an empty line."""
    order = list(_NOTE_MARKS)
    found = sorted(notes, key=lambda note: order.index(note.severity))
    if found:
        yield ""
    for note in found:
        yield from _wrapped(f"{note.code}: {note.message}", width, f"  {_NOTE_MARKS[note.severity]} ", "     ")


def _wrapped(text: str, width: int, first: str, rest: str) -> list[str]:
    return textwrap.wrap(text, width, initial_indent=first, subsequent_indent=rest, break_long_words=False)
