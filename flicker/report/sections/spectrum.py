"""The spectrum, with the families of lines named."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import numpy as np

from flicker.figures import quantity
from flicker.markup import Markup, element, markup, table
from flicker.plots.spectrum import envelope
from flicker.report.page import section
from flicker.report.sections._chart import Chart

if TYPE_CHECKING:
    from flicker.report.sheets import ChannelSheet
    from flicker.results import Component, Family

_FAMILY_SHAPES = ("circle", "square", "diamond", "triangle")
_SAME = 2e-3  # of the fundamental by which a line may miss a multiple and still belong to the family
_LINES_MARKED = 60
_LINES_LISTED = 8
_POINTS = 900


@section(of="channel", title="Spectrum", order=40)
def spectrum(sheet: ChannelSheet) -> Markup | None:
    """Draw the spectrum with the lines of each family under one shape of mark, and list the strongest."""
    channel = sheet.channel
    frequencies, amplitudes = channel.observation.spectrum()
    relative = channel.trace.mean_known
    above = frequencies > 0
    frequencies, percent = frequencies[above], (100 if relative else 1) * np.abs(amplitudes[above])
    if frequencies.size < 8:
        return None
    lines = channel.components
    lowest = 0.3 * min((line.frequency for line in lines), default=4 * float(frequencies[0]))
    left, nyquist = max(float(frequencies[0]), lowest), channel.trace.sample_rate / 2
    grid, tops = envelope(frequencies, np.maximum(percent, 1e-9), left, _POINTS)
    floor = float(np.median(tops))
    top = max([float(tops.max()), *(line.modulation for line in lines)])
    unit = "% of the mean" if relative else channel.trace.unit
    chart = Chart(
        (left, 1.08 * nyquist),
        (floor / 3, 5 * top),
        "frequency (Hz)",
        f"peak amplitude ({unit})" if unit else "peak amplitude",
        (True, True),
    )
    chart.area(grid, np.full_like(tops, floor / 3), tops, "noise")
    chart.upright(nyquist, "half the sample rate", "other")
    marked = lines[:_LINES_MARKED]
    chart.needles([(line.frequency, floor, line.modulation) for line in marked], "found")
    named = _by_family(marked, channel.families)
    for place, (family, own) in reversed(list(enumerate(named))):
        shape = _FAMILY_SHAPES[min(place, len(_FAMILY_SHAPES) - 1)] if family else "bar"
        points = [(line.frequency, line.modulation, _says(line, family)) for line in own]
        chart.marks(points, shape, "light" if family else "faint")
        if family and own:
            strongest = max(own, key=lambda line: line.modulation)
            chart.name(strongest.frequency, strongest.modulation, _name(family), lift=10)
    several = len(channel.families) > 1
    rows = [
        (
            quantity(line.frequency, "Hz", 7),
            quantity(line.modulation, "%", 3),
            *([_belongs_to(line, channel.families)] if several else []),
        )
        for line in lines[:_LINES_LISTED]
    ]
    told = "; ".join(f"{row[1]} at {row[0]}" for row in rows[:3]) or "no line was found"
    more = element("p", f"the strongest of {len(lines)} lines; --json lists them all", class_="reason")
    caption = "Peak amplitude over frequency; " + (
        "a mark stands on each line that was found, one shape for each family"
        if lines
        else "no line rises above the noise"
        if relative
        else "no depth, and so no line, without the mean level"
    )
    head = ("line", "modulation", *(["family"] if several else []))
    listed = markup(table(head, rows, numbers=(0, 1)), more if len(lines) > len(rows) else None) if rows else None
    return element(
        "div",
        chart.figure(caption, f"Strongest lines: {told}."),
        element("div", listed) if listed else None,
        class_="drawings",
    )


def _by_family(
    lines: tuple[Component, ...], families: tuple[Family, ...]
) -> list[tuple[Family | None, list[Component]]]:
    groups: list[tuple[Family | None, list[Component]]] = [(family, []) for family in (*families, None)]
    for line in lines:
        family = _family_of(line, families)
        next(own for other, own in groups if other is family).append(line)
    return groups


def _family_of(line: Component, families: tuple[Family, ...]) -> Family | None:
    """Find the family of which the line is a multiple; the deepest where several fit."""
    for family in families:
        fundamental = family.fundamental.value
        if fundamental is None:
            continue
        order = line.frequency / fundamental
        if order > 0.5 and abs(order - round(order)) < _SAME:
            return family
    return None


def _belongs_to(line: Component, families: tuple[Family, ...]) -> str:
    family = _family_of(line, families)
    return _name(family) if family else ""


def _name(family: Family) -> str:
    origin = re.split(r"[:,(]", family.origin)[0].strip()
    return " ".join(part for part in (quantity(family.fundamental.value or 0.0, "Hz", 4), origin) if part)


def _says(line: Component, family: Family | None) -> str:
    words = f"{quantity(line.frequency, 'Hz', 6)}: {quantity(line.modulation, '%', 3)}"
    if family is None or family.fundamental.value is None:
        return words
    order = round(line.frequency / family.fundamental.value)
    return f"{words}, {'fundamental' if order == 1 else f'harmonic {order}'} of {_name(family)}"
