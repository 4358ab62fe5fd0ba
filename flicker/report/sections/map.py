"""Flicker over the picture: heat maps whose cells say their values."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from flicker.figures import quantity
from flicker.markup import Markup, element, markup, pairs, table
from flicker.report.page import section
from flicker.report.sections._chart import WIDTH, figure
from flicker.report.sections.notes import note_list
from flicker.report.video import map_headline, map_recording, zone_rows

if TYPE_CHECKING:
    from collections.abc import Sequence

    from flicker.camera.screen import ScreenMap
    from flicker.trace import FloatArray

_ZONES_NAMED = 40
_FINEST = 0.01  # of the value: a scale shows no finer differences
_LEGEND = 40  # height of the scale below a map
# stops of blue to yellow: their lightness rises evenly, for every kind of colour vision
_RISING = ((0, 34, 78), (65, 77, 107), (124, 123, 120), (187, 173, 108), (255, 234, 70))
_AROUND = ((38, 36, 48), (178, 98, 40), (245, 243, 238), (70, 128, 190), (38, 36, 48))  # a turn, its middle pale
_GREY = ((10, 10, 12), (250, 250, 248))


@section(of="map", title="Answer", order=10)
def map_answer(found: ScreenMap) -> Markup:
    """Say how many zones flicker and what they do together."""
    deepest = max(range(len(found.zones)), key=lambda place: found.zones[place].percent_flicker, default=None)
    step = (
        "nothing flickers here: film again with a shorter exposure if you doubt it"
        if deepest is None
        else f"zone {deepest + 1} is the deepest: read it alone with flicker stripes --region X,Y,WIDTH,HEIGHT, or "
        "put a photodiode on it, and hold it against limits"
    )
    return markup(
        element("p", map_headline(found), class_="sentence"),
        element("p", map_recording(found)),
        pairs([("Next", element("strong", step))], class_="answers"),
    )


@section(of="map", title="Maps", order=20)
def maps(found: ScreenMap) -> Markup:
    """Draw depth, frequency, phase and level; every cell says its values."""
    says = _cells_in_words(found)
    drawn = [
        _heat_map(found, found.percent_flicker, "Percent flicker", "%", _RISING, (0.0, 100.0), says),
        _heat_map(found, found.frequency, "Frequency", "Hz", _RISING, None, says),
        _heat_map(found, found.phase, "Phase ahead of the brightest zone", "cycles", _AROUND, (-0.5, 0.5), says),
        _heat_map(found, found.mean, "Mean level", "of white", _GREY, (0.0, float(np.nanmax(found.mean))), says),
    ]
    return element("div", *drawn, class_="drawings")


@section(of="map", title="Zones", order=30)
def zones(found: ScreenMap) -> Markup | None:
    """List the zones, the brightest first, under the numbers that stand in the maps."""
    head, rows = zone_rows(found.zones[:_ZONES_NAMED])
    return table(head, rows, numbers=range(1, len(head))) if rows else None


@section(of="map", title="Notes", order=70)
def map_notes(found: ScreenMap) -> Markup | None:
    """List the doubts, the gravest first."""
    return note_list(found.notes)


@section(of="map", title="Method", order=80)
def map_method(found: ScreenMap) -> Markup | None:
    """Say what was done to the frames."""
    steps = found.footage.history
    return element("ol", *(element("li", step) for step in steps)) if steps else None


def _cells_in_words(found: ScreenMap) -> list[list[str]]:
    rows, columns = found.mean.shape
    return [[_cell_in_words(found, row, column) for column in range(columns)] for row in range(rows)]


def _cell_in_words(found: ScreenMap, row: int, column: int) -> str:
    where = f"row {row + 1}, column {column + 1}"
    if found.dark[row, column]:
        return f"{where}: dark"
    parts = [
        quantity(float(value), unit, digits)
        for value, unit, digits in (
            (found.percent_flicker[row, column], "% flicker", 3),
            (found.frequency[row, column], "Hz", 5),
            (found.phase[row, column], "cycles ahead", 2),
            (found.mean[row, column], "of white", 3),
        )
        if math.isfinite(value)
    ]
    return f"{where}: {', '.join(parts)}"


def _heat_map(
    found: ScreenMap,
    values: FloatArray,
    name: str,
    unit: str,
    stops: Sequence[tuple[int, int, int]],
    scale: tuple[float, float] | None,
    says: list[list[str]],
) -> Markup:
    rows, columns = values.shape
    known = values[np.isfinite(values)]
    if scale is None:
        scale = (float(known.min()), float(known.max())) if known.size else (0.0, 1.0)
    low, high = scale
    if high - low < _FINEST * high:
        low, high = scale = (low * (1 - _FINEST), high * (1 + _FINEST))
    side = WIDTH / columns
    share = np.clip((values - low) / ((high - low) or 1.0), 0.0, 1.0)
    cells = [
        element(
            "rect",
            element("title", says[row][column]),
            x=f"{column * side:.1f}",
            y=f"{row * side:.1f}",
            width=f"{side:.1f}",
            height=f"{side:.1f}",
            fill=_colour(float(share[row, column]), stops) if math.isfinite(share[row, column]) else "url(#hatch)",
        )
        for row in range(rows)
        for column in range(columns)
    ]
    numbers = [
        element("text", number, x=f"{(middle[1] + 0.5) * side:.1f}", y=f"{(middle[0] + 0.5) * side + 5:.1f}",
                text_anchor="middle", class_="zone")
        for number, zone in enumerate(found.zones[:_ZONES_NAMED], 1)
        for middle in [np.mean(np.array(zone.cells), axis=0)]
    ]  # fmt: skip
    bottom = rows * side
    drawn = markup(element("g", *cells, class_="cells"), *numbers, _legend(bottom + 10, scale, unit, stops))
    told = f"{map_headline(found)}."
    if known.size:
        told += f" From {quantity(float(known.min()), unit, 4)} to {quantity(float(known.max()), unit, 4)}."
    caption = f"{name} ({unit}); hatched: dark, or not known"
    return figure(drawn, caption, told, size=(WIDTH, math.ceil(bottom) + _LEGEND))


def _legend(top: float, scale: tuple[float, float], unit: str, stops: Sequence[tuple[int, int, int]]) -> Markup:
    steps = 40
    pieces = [
        element("rect", x=f"{step * WIDTH / steps:.1f}", y=f"{top:.1f}", width=f"{WIDTH / steps + 0.3:.1f}", height=9,
                fill=_colour(step / (steps - 1), stops))
        for step in range(steps)
    ]  # fmt: skip
    middle = sum(scale) / 2
    ends = [
        element("text", quantity(value, unit, 4), x=place, y=f"{top + 24:.1f}", text_anchor=anchor)
        for value, place, anchor in (
            (scale[0], 0, "start"),
            (middle, WIDTH / 2, "middle"),
            (scale[1], WIDTH, "end"),
        )
    ]
    return element("g", *pieces, *ends, class_="legend")


def _colour(share: float, stops: Sequence[tuple[int, int, int]]) -> str:
    places = np.linspace(0.0, 1.0, len(stops))
    return "#" + "".join(f"{round(np.interp(share, places, part)):02x}" for part in zip(*stops, strict=True))
