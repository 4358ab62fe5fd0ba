"""How the measures went along a capture, in words."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from flicker.figures import measure_name, quantity

if TYPE_CHECKING:
    from flicker.along import Along, Throughout
    from flicker.results import Measure

_SHOWN = ("fundamental_frequency", "percent_flicker", "flicker_index", "duty_cycle", "svm", "pst_lm")


def along_words(along: Along) -> Iterator[str]:
    """Say whether the light was the same in all windows, then the smallest and largest of each main measure."""
    count = len(along.windows)
    head = f"along the capture, {_windows(count)} of {quantity(along.length, 's')}: "
    changing = [measure_name(name) for name, one in along.throughout.items() if one.same is False]
    if along.same is None:
        yield head + "too few windows carry a measure to tell whether the light was the same throughout"
    elif changing:
        yield (
            f"{head}the light was NOT the same throughout ({', '.join(changing)} changed by more than the intervals "
            "allow): the figures of the whole capture are a mixture, take a steady part with --start and --duration"
        )
    else:
        yield f"{head}the same light throughout, within the intervals"
    for name in _SHOWN:
        if name in along.throughout:
            yield _course(name, along.throughout[name], count)


def severity_words(measure: Measure) -> str:
    """Say how the short-term severity went along the windows that it is taken in; empty for a single one."""
    if len(measure.series) < 2:
        return ""
    values = ", ".join(f"{value:.3g} from {quantity(start, 's')}" for start, value in measure.series)
    return f"short-term severity in {len(measure.series)} windows of 180 s: {values}; the largest counts"


def _windows(count: int) -> str:
    return "1 window" if count == 1 else f"{count} windows"


def _course(name: str, one: Throughout, count: int) -> str:
    digits = 6 if name == "fundamental_frequency" else 4
    smallest, largest = (quantity(value, one.unit, digits) for value in (one.smallest, one.largest))
    words = f"{measure_name(name)}: {smallest} at {quantity(one.smallest_at, 's')}"
    words += f" to {largest} at {quantity(one.largest_at, 's')}"
    if one.windows < count:
        words += f"; {_windows(count - one.windows)} without"
    return words
