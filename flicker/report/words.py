"""A report in words: the answer first, then every measure with its interval, then the doubts."""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.limits.region import STANDARD
from flicker.report.answer import REGION_MARKS, REGION_WORDS, depth, next_step, risk, severity, what
from flicker.report.figures import measure_name, measured, quantity

if TYPE_CHECKING:
    from flicker.analysis import CaptureReport, ChannelReport, Report
    from flicker.results import Note

_INDENT = "  "
_NOTE_MARKS = {"error": "!!", "warning": "! ", "info": "i "}
_COLOURS = {"no-observable-effect": "36", "low-risk": "34", "above-low-risk": "35"}  # beside marks and words
_LINES_SHOWN = 20
_CAMERA_HINT = f"{_INDENT}what a camera will record of it: flicker bands CAPTURE --camera CAMERA.toml"


class Paint:
    """Bold, faint and coloured text where that is wanted, plain text elsewhere."""

    def __init__(self, *, colour: bool) -> None:
        self._colour = colour

    def __call__(self, text: str, *codes: str) -> str:
        """Give the text in these terminal codes."""
        return f"\x1b[{';'.join(codes)}m{text}\x1b[0m" if self._colour and text else text

    def bold(self, text: str) -> str:
        """Give the text in bold."""
        return self(text, "1")

    def faint(self, text: str) -> str:
        """Give the text faint."""
        return self(text, "2")


def report_words(report: Report, *, width: int = 100, colour: bool = False, verbose: bool = False) -> str:
    """
    Put a report into words for a terminal.

    Parameters
    ----------
    report : Report
        What was measured.
    width : int
        Columns that a line may fill.
    colour : bool
        Whether to mark with colour and weight, beside the words.
    verbose : bool
        Add how each figure was obtained, the spectral lines and the history of the readings.

    Returns
    -------
    str
        One block a channel; after several, a table that holds them side by side.
    """
    paint = Paint(colour=colour)
    blocks = [
        "\n".join(_channel_block(capture, channel, width, paint, verbose))
        for capture in report.captures
        for channel in capture.channels
    ]
    if len(blocks) != 1 or len(report.captures) > 1:
        blocks.append("\n".join(_overview(report, width, paint)))
    if any(channel.families for capture in report.captures for channel in capture.channels):
        blocks.append(paint.faint(_CAMERA_HINT))
    return "\n\n".join(blocks)


def channel_title(capture: CaptureReport, channel: ChannelReport) -> str:
    """Name a channel: its file, and its own name where the file holds several."""
    file = Path(capture.path).name if capture.path else "capture"
    return file if len(capture.channels) == 1 else f"{file}, {channel.trace.name}"


def _channel_block(
    capture: CaptureReport, channel: ChannelReport, width: int, paint: Paint, verbose: bool
) -> Iterable[str]:
    yield paint.bold(channel_title(capture, channel))
    yield from wrap(_recording(channel), width, "")
    yield ""
    answers = {
        "What": what(channel),
        "Depth": depth(channel),
        "Risk": risk(channel),
        "Next": next_step(channel),
    }
    region = channel.risk_region.region if channel.risk_region else None
    for label, text in answers.items():
        first, *rest = wrap(text, width - 9, "")
        weight = ("1", _COLOURS[region]) if label == "Risk" and region else ("1",) if label != "Next" else ("0",)
        yield f"{_INDENT}{paint.faint(f'{label:<5}')}  {paint(first, *weight)}"
        yield from (f"{_INDENT}{'':<5}  {paint(line, *weight)}" for line in rest)
    yield from _other_families(channel)
    yield ""
    yield from _measure_table(channel, width, paint, verbose)
    yield from _missing(channel, width)
    yield from _notes(channel.notes, width)
    if verbose:
        yield from _details(channel, width, paint)


def _recording(channel: ChannelReport) -> str:
    trace = channel.trace
    words = f"{quantity(trace.duration, 's')} at {quantity(trace.sample_rate, 'Hz')}, {trace.samples} samples"
    if not trace.mean_known:
        return f"{words}; the mean level is lost"
    dark = "zero taken as dark" if trace.dark_level is None else f"dark level {quantity(trace.dark_level, trace.unit)}"
    return f"{words}; mean {quantity(channel.observation.mean, trace.unit)} above dark, {dark}"


def _other_families(channel: ChannelReport) -> Iterable[str]:
    for family in channel.families[1:]:
        if family.fundamental.value is None:
            continue
        words = f"{_INDENT}{'Also':<5}  {measured(family.fundamental)[0]}"
        if family.percent_flicker.value is not None:
            words += f", {measured(family.percent_flicker)[0]}"
        yield f"{words}, {family.origin}" if family.origin else words


def _measure_table(channel: ChannelReport, width: int, paint: Paint, verbose: bool) -> Iterable[str]:
    rows = [
        (measure_name(name), *measured(measure), measure.method)
        for name, measure in channel.measures.items()
        if measure.value is not None
    ]
    if not rows:
        return
    first, second, third = (max(len(row[column]) for row in rows) for column in range(3))
    yield _INDENT + paint.faint(f"{'measure':<{first}}  {'value':>{second}}  {'95 % interval':<{third}}".rstrip())
    for name, value, interval, method in rows:
        yield f"{_INDENT}{name:<{first}}  {value:>{second}}  {interval}".rstrip()
        if verbose and method:
            yield from (paint.faint(line) for line in wrap(method, width, _INDENT * 3))


def _missing(channel: ChannelReport, width: int) -> Iterable[str]:
    reasons: dict[str, list[str]] = {}
    for name, measure in channel.measures.items():
        if measure.value is None:
            reasons.setdefault(measure.reason, []).append(measure_name(name))
    if reasons:
        yield ""
        yield f"{_INDENT}not measured"
    for reason, names in reasons.items():
        yield from wrap(f"{', '.join(names)}: {reason}", width, _INDENT * 2, hang=2)


def _notes(notes: Iterable[Note], width: int) -> Iterable[str]:
    notes = sorted(notes, key=lambda note: list(_NOTE_MARKS).index(note.severity))
    if notes:
        yield ""
    for note in notes:
        yield from wrap(f"{_NOTE_MARKS[note.severity]} {note.code}: {note.message}", width, _INDENT, hang=3)


def _details(channel: ChannelReport, width: int, paint: Paint) -> Iterable[str]:
    if channel.components:
        yield ""
        yield _INDENT + paint.faint("spectral lines, strongest first")
    for line in channel.components[:_LINES_SHOWN]:
        yield f"{_INDENT}{quantity(line.frequency, 'Hz', 7):>14}  {quantity(line.modulation, '%', 3):>9}"
    if len(channel.components) > _LINES_SHOWN:
        yield f"{_INDENT}and {len(channel.components) - _LINES_SHOWN} weaker ones: --json lists them all"
    if channel.trace.history:
        yield ""
        yield _INDENT + paint.faint("what was done to the readings")
    for step in channel.trace.history:
        yield from wrap(step, width, _INDENT * 2)


def _overview(report: Report, width: int, paint: Paint) -> Iterable[str]:
    """Hold all channels side by side, the riskiest named below."""
    pairs = [(capture, channel) for capture in report.captures for channel in capture.channels]
    rows = [_overview_row(capture, channel) for capture, channel in pairs]
    head = ("capture", "frequency", "flicker", "index", f"risk ({STANDARD})")
    columns = [max(len(row[column]) for row in [head, *rows]) for column in range(5)]
    columns[0] = max(12, min(columns[0], width - sum(columns[1:]) - 10))
    yield _INDENT + paint.faint(_overview_line(head, columns))
    for row in rows:
        yield _INDENT + _overview_line(row, columns)
    yield from (f"{_INDENT}{Path(capture.path or '').name}: not read" for capture in report.captures if capture.error)
    judged = [pair for pair in pairs if pair[1].risk_region]
    if len(judged) > 1:
        capture, channel = max(judged, key=lambda pair: severity(pair[1]))
        yield ""
        yield from wrap(f"riskiest: {channel_title(capture, channel)}: {risk(channel)}", width, _INDENT, hang=2)


def _overview_line(row: tuple[str, ...], columns: list[int]) -> str:
    name = row[0] if len(row[0]) <= columns[0] else "…" + row[0][1 - columns[0] :]
    numbers = "  ".join(f"{text:>{size}}" for text, size in zip(row[1:4], columns[1:4], strict=True))
    return f"{name:<{columns[0]}}  {numbers}  {row[4]}".rstrip()


def _overview_row(capture: CaptureReport, channel: ChannelReport) -> tuple[str, ...]:
    figures = [channel.measures[name] for name in ("fundamental_frequency", "percent_flicker", "flicker_index")]
    texts = [
        "–" if one.value is None else quantity(one.value, one.unit, digits)
        for one, digits in zip(figures, (5, 3, 3), strict=True)
    ]
    place = channel.risk_region
    region = f"{REGION_MARKS[place.region]} {REGION_WORDS[place.region]}" if place else "not known"
    return (channel_title(capture, channel), *texts, region)


def wrap(text: str, width: int, indent: str, hang: int = 0) -> list[str]:
    """Break text into lines, never between a number and its unit."""
    kept = re.sub(r"(?<=\d) (?=%|[kMmµn]?(?:Hz|s|V)\b)", "\N{NO-BREAK SPACE}", text)
    lines = textwrap.wrap(kept, width, initial_indent=indent, subsequent_indent=indent + " " * hang)
    return [line.replace("\N{NO-BREAK SPACE}", " ") for line in lines]
