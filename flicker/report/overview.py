"""Several channels side by side, the riskiest named."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.limits.region import STANDARD
from flicker.report.answer import REGION_MARKS, REGION_WORDS, risk, severity
from flicker.report.figures import quantity
from flicker.report.typesetting import Paint, wrap

if TYPE_CHECKING:
    from flicker.analysis import CaptureReport, ChannelReport

_HEAD = ("capture", "frequency", "flicker", "index", f"risk ({STANDARD})")


@dataclass(frozen=True)
class OverviewEntry:
    """One line of the overview: what it shows, and how risky it is."""

    cells: tuple[str, ...]
    flickers: bool = False  # whether there is modulation for a camera to see
    severity: tuple[int, float] | None = None  # None where the risk is not known
    risk: str = ""


def overview_entries(capture: CaptureReport) -> list[OverviewEntry]:
    """Give the lines of a capture: one a channel, or one that says that it was not read."""
    if capture.error:
        return [OverviewEntry((Path(capture.path or "").name, "–", "–", "–", "not read"))]
    return [_entry(capture, channel) for channel in capture.channels]


def overview(entries: Sequence[OverviewEntry], width: int, paint: Paint) -> Iterable[str]:
    """Hold all channels side by side, the riskiest named below."""
    columns = [max(len(row[column]) for row in [_HEAD, *(one.cells for one in entries)]) for column in range(5)]
    columns[0] = max(12, min(columns[0], width - sum(columns[1:]) - 10))
    yield "  " + paint.faint(_line(_HEAD, columns))
    for entry in entries:
        yield "  " + _line(entry.cells, columns)
    judged = [(entry.severity, entry) for entry in entries if entry.severity is not None]
    if len(judged) > 1:
        _, worst = max(judged, key=lambda pair: pair[0])
        yield ""
        yield from wrap(f"riskiest: {worst.cells[0]}: {worst.risk}", width, "  ", hang=2)


def channel_title(capture: CaptureReport, channel: ChannelReport) -> str:
    """Name a channel: its file, and its own name where the file holds several."""
    file = Path(capture.path).name if capture.path else "capture"
    return file if len(capture.channels) == 1 else f"{file}, {channel.trace.name}"


def _entry(capture: CaptureReport, channel: ChannelReport) -> OverviewEntry:
    figures = [channel.measures[name] for name in ("fundamental_frequency", "percent_flicker", "flicker_index")]
    texts = [
        "–" if one.value is None else quantity(one.value, one.unit, digits)
        for one, digits in zip(figures, (5, 3, 3), strict=True)
    ]
    place = channel.risk_region
    region = f"{REGION_MARKS[place.region]} {REGION_WORDS[place.region]}" if place else "not known"
    cells = (channel_title(capture, channel), *texts, region)
    flickers = place is not None and place.modulation is not None
    return OverviewEntry(cells, flickers, severity(channel) if place else None, risk(channel))


def _line(row: tuple[str, ...], columns: list[int]) -> str:
    name = row[0] if len(row[0]) <= columns[0] else "…" + row[0][1 - columns[0] :]
    numbers = "  ".join(f"{text:>{size}}" for text, size in zip(row[1:4], columns[1:4], strict=True))
    return f"{name:<{columns[0]}}  {numbers}  {row[4]}".rstrip()
