"""A report in words: the answer first, then every measure with its interval, then the doubts."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from flicker.figures import measure_name, measured, quantity
from flicker.report.along import along_words, severity_words
from flicker.report.answer import caution, depth, next_step, risk, short_reason, what
from flicker.report.overview import OverviewEntry, channel_title, overview, overview_entries
from flicker.report.typesetting import Paint, wrap

if TYPE_CHECKING:
    from flicker.aliases import SameLight
    from flicker.reports import CaptureReport, ChannelReport, Report
    from flicker.results import Note

_INDENT = "  "
_NOTE_MARKS = {"error": "!!", "warning": "! ", "info": "i "}
_COLOURS = {"no-observable-effect": "36", "low-risk": "34", "above-low-risk": "35"}  # beside marks and words
_LINES_SHOWN = 20
_CAMERA_HINT = "what a camera will record of it: flicker bands CAPTURE --camera CAMERA.toml"


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
    blocks = [capture_words(capture, width=width, colour=colour, verbose=verbose) for capture in report.captures]
    entries = [entry for capture in report.captures for entry in overview_entries(capture)]
    return "\n\n".join([*filter(None, blocks), *closing_words(entries, width=width, colour=colour)])


def capture_words(capture: CaptureReport, *, width: int = 100, colour: bool = False, verbose: bool = False) -> str:
    """Put one capture into words: a block a channel, empty for a capture that was not read."""
    paint = Paint(colour=colour)
    blocks = ("\n".join(_channel_block(capture, channel, width, paint, verbose)) for channel in capture.channels)
    return "\n\n".join(blocks)


def closing_words(entries: Sequence[OverviewEntry], *, width: int = 100, colour: bool = False) -> list[str]:
    """Give what stands at the end of a report: several channels side by side, and where a camera comes in."""
    paint = Paint(colour=colour)
    blocks = ["\n".join(overview(entries, width, paint))] if len(entries) > 1 else []
    if any(entry.flickers for entry in entries):
        blocks.append("\n".join(paint.faint(line) for line in wrap(_CAMERA_HINT, width, _INDENT, hang=2)))
    return blocks


def same_light_words(found: SameLight, *, width: int = 100, colour: bool = False) -> str:
    """Say which frequency fits several captures of one light, or why none does."""
    paint = Paint(colour=colour)
    text = found.reason
    if found.frequency is not None:
        half = 1.96 * found.error
        text = f"{quantity(found.frequency, 'Hz', 7)} ± {quantity(half, 'Hz', 2)} fits all captures"
    lines = [paint.bold("One light in all captures"), "", *_answer("What", text, width, paint, ("1",))]
    for frequency, off in found.others[:2]:
        nearest = f"{quantity(frequency, 'Hz', 6)} misses one of them by {off:.3g} standard errors"
        lines += _answer("not", nearest, width, paint, ("0",))
    clocks = f"each clock taken as right to {found.clock * 1e6:g} ppm; --clock-ppm states it"
    return "\n".join([*lines, *_answer("with", clocks, width, paint, ("0",))])


def _channel_block(
    capture: CaptureReport, channel: ChannelReport, width: int, paint: Paint, verbose: bool
) -> Iterable[str]:
    yield paint.bold(channel_title(capture, channel))
    yield from wrap(_recording(channel), width, "")
    yield ""
    region = channel.risk_region.region if channel.risk_region else None
    bold, plain = ("1",), ("0",)
    yield from _answer("What", what(channel), width, paint, bold)
    yield from _other_families(channel, width, paint)
    yield from _answer("Depth", depth(channel), width, paint, bold)
    yield from _answer("Risk", risk(channel), width, paint, ("1", _COLOURS[region]) if region else bold)
    yield from _answer("Care", caution(channel), width, paint, bold)
    yield from _answer("Next", next_step(channel), width, paint, plain)
    yield ""
    yield from _measure_table(channel, width, paint, verbose)
    yield from _missing(channel, width)
    yield from _along(channel, width)
    yield from _notes(channel.notes, width)
    if verbose:
        yield from _details(channel, width, paint)


def _recording(channel: ChannelReport) -> str:
    trace = channel.trace
    recorded = trace.whole or trace
    words = f"{quantity(recorded.duration, 's')} at {quantity(trace.sample_rate, 'Hz')}, {recorded.samples} samples"
    if trace.whole:
        words += f", {quantity(trace.duration, 's')} of it measured, from {trace.start:.6g} s on"
    if not trace.mean_known:
        return f"{words}; the mean level is lost"
    dark = "zero taken as dark" if trace.dark_level is None else f"dark level {quantity(trace.dark_level, trace.unit)}"
    return f"{words}; mean {quantity(channel.observation.mean, trace.unit)} above dark, {dark}"


def _answer(label: str, text: str, width: int, paint: Paint, weight: tuple[str, ...]) -> Iterable[str]:
    """Set one line of the answer beside its label; nothing where there is no text."""
    for number, line in enumerate(wrap(text, width - 9, "")):
        yield f"{_INDENT}{paint.faint(f'{label:<5}') if number == 0 else ' ' * 5}  {paint(line, *weight)}"


def _other_families(channel: ChannelReport, width: int, paint: Paint) -> Iterable[str]:
    for family in channel.families[1:]:
        if family.fundamental.value is None:
            continue
        words = quantity(family.fundamental.value, "Hz", 6)
        if family.percent_flicker.value is not None:
            words += f", {quantity(family.percent_flicker.value, '%', 3)} deep"
        yield from _answer("also", f"{words}, {family.origin}" if family.origin else words, width, paint, ("0",))


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
        if measure.value is None and not (name == "wander_rate" and _keeps_still(channel)):
            reasons.setdefault(short_reason(measure, channel.notes), []).append(measure_name(name))
    if reasons:
        yield ""
        yield f"{_INDENT}not measured"
    for reason, names in reasons.items():
        yield from wrap(f"{', '.join(names)}: {reason}", width, _INDENT * 2, hang=2)


def _along(channel: ChannelReport, width: int) -> Iterable[str]:
    if channel.along:
        first, *rest = along_words(channel.along)
        yield ""
        yield from wrap(first, width, _INDENT, hang=2)
        for sentence in rest:
            yield from wrap(sentence, width, _INDENT * 2, hang=2)
    severity = severity_words(channel.measures["pst_lm"])
    if severity:
        yield ""
        yield from wrap(severity, width, _INDENT, hang=2)


def _keeps_still(channel: ChannelReport) -> bool:
    wander = channel.measures.get("frequency_wander")
    return wander is not None and wander.value == 0.0


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
