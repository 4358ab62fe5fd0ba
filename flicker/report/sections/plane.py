"""The plane of modulation over frequency, with the limits, and where this light lies."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from flicker.figures import quantity
from flicker.limits import Curve, risk_curves
from flicker.limits.region import READING, STANDARD
from flicker.markup import Markup, element
from flicker.report.answer import REGION_WORDS, risk
from flicker.report.page import section
from flicker.report.sections._chart import Chart
from flicker.report.sections.answer import REGION_SHAPES

if TYPE_CHECKING:
    from collections.abc import Iterable

    from flicker.limits import Limit
    from flicker.report.sheets import ChannelSheet
    from flicker.results import Component, Family

_FREQUENCIES = (1.0, 10_000.0)  # [Hz]
_MODULATIONS = (0.03, 300.0)  # [%]
_LINES_SHOWN = 60
_BELOW = 30.0  # depth from which its name stands below the mark [%]
_DRAWN = ("ieee1789-low-risk", "ieee1789-no-effect")  # as edges of the regions


@section(of="channel", title="Where it lies", order=50)
def plane(sheet: ChannelSheet) -> Markup | None:
    """Draw the regions, the limits that it was held against, and every family and line."""
    channel = sheet.channel
    if channel.risk_region is None:
        return None
    limits = [verdict.limit for verdict in channel.verdicts if verdict.limit.id not in _DRAWN]
    drawn = draw_plane(channel.components, channel.families, channel.risk_region.region, limits, risk(channel))
    return element("div", drawn, element("p", f"{STANDARD}: {READING}.", class_="reason"), class_="drawings")


def draw_plane(
    lines: Iterable[Component], families: Iterable[Family], region: str, limits: Iterable[Limit], told: str
) -> Markup:
    """Draw a light in the plane; `told` says in words where it lies."""
    placed = [
        (family.fundamental.value, family.percent_flicker.value, family)
        for family in families
        if family.fundamental.value is not None and family.percent_flicker.value is not None
    ]
    found = [(line.frequency, line.modulation) for line in list(lines)[:_LINES_SHOWN]]
    frequencies = [frequency for frequency, *_ in placed]
    chart = Chart(
        (min([_FREQUENCIES[0], *(0.7 * one for one in frequencies)]),
         max([_FREQUENCIES[1], *(1.5 * one for one in frequencies)])),
        _MODULATIONS,
        "frequency (Hz)",
        "modulation (% of the mean)",
        (True, True),
    )  # fmt: skip
    _regions(chart, *risk_curves())
    others = {limit.id: limit.bound for limit in limits if isinstance(limit.bound, Curve)}
    for bound in others.values():
        _bound(chart, bound, "other")
    chart.marks([(x, y, f"line of {quantity(y, '%', 3)} at {quantity(x, 'Hz', 5)}") for x, y in found], "bar", "faint")
    chart.marks(
        [
            (x, y, f"percent flicker {quantity(y, '%', 3)} at {quantity(x, 'Hz', 5)}, {family.origin}")
            for x, y, family in placed
        ],
        REGION_SHAPES[region],
        "light",
    )
    for number, (x, y, _) in enumerate(placed):
        if number == 0:
            chart.name(x, y, f"{quantity(y, '%', 3)} at {quantity(x, 'Hz', 4)}", lift=-19 if y > _BELOW else 11)
    if not placed and not found:
        chart.name(400.0, 0.6, "steady light")
    caption = f"Modulation over frequency with the regions of {STANDARD}; large marks: families, small ones: lines"
    if others:
        caption += f"; dotted: {', '.join(others)}"
    return chart.figure(caption, told)


def _regions(chart: Chart, low_risk: Curve, no_effect: Curve) -> None:
    """Fill and name the three regions; where a curve gives no limit the region reaches to the top."""
    edges = np.array([edge * side for edge in (*low_risk.edges, *no_effect.edges) for side in (1 - 1e-9, 1 + 1e-9)])
    frequency = np.union1d(np.geomspace(*chart.x, 60), edges)
    bottom, top = np.full_like(frequency, chart.y[0]), np.full_like(frequency, chart.y[1])
    low, none = (np.clip(curve.at_each(frequency), *chart.y) for curve in (low_risk, no_effect))
    chart.ground(frequency, bottom, none, "no-observable-effect")
    chart.ground(frequency, none, low, "low-risk", "dots")
    chart.ground(frequency, low, top, "above-low-risk", "hatch")
    for bound in (low_risk, no_effect):
        _bound(chart, bound, "edge")
    chart.name(1.4, 40.0, REGION_WORDS["above-low-risk"], anchor="start", kind="region")
    chart.name(300.0, 0.07, REGION_WORDS["no-observable-effect"], kind="region")
    chart.along(20.0, 0.32, REGION_WORDS["low-risk"], kind="region")


def _bound(chart: Chart, curve: Curve, kind: str) -> None:
    """Draw a bound as far as it reaches and the drawing shows it."""
    for band in curve.bands:
        start, end = max(band.start, chart.x[0]), min(band.end, chart.x[1])
        if start >= end:
            continue
        frequency = np.geomspace(start, end, 40)
        level = np.array([band.at(one) for one in frequency.tolist()])
        seen = (level >= chart.y[0]) & (level <= chart.y[1])
        if seen.any():
            chart.line(frequency[seen], level[seen], kind)
