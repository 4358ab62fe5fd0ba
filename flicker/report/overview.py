"""Several channels side by side, the riskiest named."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.figures import quantity
from flicker.limits.region import STANDARD
from flicker.report.answer import REGION_MARKS, REGION_WORDS, risk, severity
from flicker.report.typesetting import Paint, wrap

if TYPE_CHECKING:
    from flicker.reports import CaptureReport, ChannelReport

HEAD = ("capture", "frequency", "flicker", "index", f"risk ({STANDARD})")
_LESSER_COLUMNS = (3, 1)  # left out first where the terminal is narrow
_NARROWEST_NAME = 16


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
    """Hold all channels side by side, the riskiest named below; on a narrow terminal without the lesser columns."""
    rows = [HEAD, *(entry.cells for entry in entries)]
    sizes = [max(len(row[column]) for row in rows) for column in range(len(HEAD))]
    shown = list(range(len(HEAD)))
    for lesser in _LESSER_COLUMNS:
        if _NARROWEST_NAME + sum(sizes[column] + 2 for column in shown[1:]) + 2 > width:
            shown.remove(lesser)
    sizes[0] = max(_NARROWEST_NAME, min(sizes[0], width - sum(sizes[column] + 2 for column in shown[1:]) - 2))
    head, *lines = ("  ".join(_cell(row[column], column, sizes[column]) for column in shown).rstrip() for row in rows)
    yield "  " + paint.faint(head)
    yield from ("  " + line for line in lines)
    worst = riskiest(entries)
    if worst is not None:
        yield ""
        yield from wrap(f"riskiest: {worst.cells[0]}: {worst.risk}", width, "  ", hang=2)


def riskiest(entries: Sequence[OverviewEntry]) -> OverviewEntry | None:
    """Give the entry with the gravest risk; None where fewer than two have a known one."""
    judged = [(entry.severity, entry) for entry in entries if entry.severity is not None]
    return max(judged, key=lambda pair: pair[0])[1] if len(judged) > 1 else None


def _cell(text: str, column: int, size: int) -> str:
    """Set numbers to the right, words to the left; of a long name the end stays, for that tells files apart."""
    if 0 < column < len(HEAD) - 1:
        return f"{text:>{size}}"
    return f"{text:<{size}}" if len(text) <= size else "…" + text[1 - size :]


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
