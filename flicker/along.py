"""Every measure along a capture, window by window, and whether the light was the same throughout."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from flicker.errors import InputError
from flicker.results import Measure
from flicker.trace import Segment, Trace
from flicker.workers import counted

_FEWEST_SAMPLES = 16  # of a window
_MOST_WINDOWS = 5000
_RARE = 1e-3  # chance, over all measures, that light that is the same throughout is called changing
_WIDEST = 1.96  # half of a 95 % interval over its standard error (normal distribution)
_BY_ONE_SAMPLE = {"duty_cycle": 0.5, "flicker_index": 0.5}  # error over the share of a cycle that one sample takes
_BY_ONE_SAMPLE_RELATIVE = {"rms_modulation": 2.0, "svm": 1.0}  # the same, over the value
_UNTESTED = ("display_flicker_contrast",)  # its interval does not carry a test
_UNCERTAIN = 1.25  # standard errors of short windows are themselves uncertain by about so much (computed)


@dataclass(frozen=True, slots=True)
class Window:
    """One window: where it starts [s], how long it is [s], its sample rate [Hz], every measure taken in it alone."""

    start: float
    duration: float
    sample_rate: float
    measures: Mapping[str, Measure]


@dataclass(frozen=True, slots=True)
class Throughout:
    """
    One measure along the capture: its smallest and largest value with their times [s], and whether it stayed the same.

    `chance` is how often light that stays the same would scatter as much as the windows do; None where fewer than two
    windows carry the measure with an interval.
    """

    same: bool | None
    chance: float | None
    smallest: float
    smallest_at: float
    largest: float
    largest_at: float
    windows: int
    unit: str

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "same": self.same,
            "chance": self.chance,
            "smallest": self.smallest,
            "smallest_at_s": self.smallest_at,
            "largest": self.largest,
            "largest_at_s": self.largest_at,
            "windows": self.windows,
        }


@dataclass(frozen=True, slots=True)
class Along:
    """The windows of a channel in order of time, and each measure throughout them."""

    length: float  # of a window [s]
    windows: tuple[Window, ...]
    throughout: Mapping[str, Throughout]
    left_out: float  # recorded time that no window covers [s]

    @property
    def same(self) -> bool | None:
        """Whether the light was the same throughout; None where no measure can tell."""
        known = [one.same for one in self.throughout.values() if one.same is not None]
        return all(known) if known else None

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "window_s": self.length,
            "left_out_s": self.left_out,
            "same_throughout": self.same,
            "throughout": {name: one.to_dict() for name, one in self.throughout.items()},
            "windows": [
                {
                    "start_s": window.start,
                    "duration_s": window.duration,
                    "measures": {name: measure.to_dict() for name, measure in window.measures.items()},
                }
                for window in self.windows
            ],
        }


def measure_along(trace: Trace, length: float, measured: Callable[[Trace], Mapping[str, Measure]]) -> Along:
    """
    Take every measure in windows along a trace.

    Parameters
    ----------
    trace : Trace
        Conditioned.
    length : float
        Of a window. [s]
    measured : callable
        Takes every measure of a trace.

    Returns
    -------
    Along
        Windows side by side; none reaches over a gap, and what is left of a segment behind its last whole window is
        left out. A window that cannot carry a measure says why.

    Raises
    ------
    InputError
        If a window would hold too few samples, if no segment holds one, or if there would be too many.

    Notes
    -----
    Whether the light was the same throughout: the squared distances of the windows from their weighted mean, over the
    squares of their standard errors, follow the chi-square distribution with one degree of freedom less than there are
    windows (test of homogeneity, Cochran, Biometrics 10 (1954) 101, from memory). What all windows share, such as an
    uncertain dark level, widens every interval alike and makes the test milder. Edges are told to one sample where the
    rate is a multiple of the frequency: so much is allowed to figures that hang on them. Where some windows show a
    periodic flicker and others none, the light was not the same.
    """
    parts = windows_of(trace, length)
    windows = tuple(
        Window(part.start, part.duration, part.sample_rate, measured(part))
        for part in counted(parts, "window", len(parts))
    )
    names = list(windows[0].measures)
    found = {name: one for name in names if (one := throughout(name, windows, len(names)))}
    return Along(length, windows, found, trace.duration - sum(part.duration for part in parts))


def windows_of(trace: Trace, length: float) -> tuple[Trace, ...]:
    """Cut a trace into whole windows of that length [s], none over a gap; errors as `measure_along`."""
    size = round(length * trace.sample_rate)
    if size < _FEWEST_SAMPLES:
        least = _FEWEST_SAMPLES / trace.sample_rate
        raise InputError(f"a window of {length:g} s holds {size} samples: state --window {least:.2g} or longer")
    edges = [*(segment.first for segment in trace.segments), trace.samples]
    parts = [
        trace.replace(
            light=trace.light[begin : begin + size],
            segments=(Segment(0, segment.start + (begin - segment.first) / trace.sample_rate),),
        )
        for segment, (first, last) in zip(trace.segments, pairwise(edges), strict=True)
        for begin in range(first, last - size + 1, size)
    ]
    longest = max(last - first for first, last in pairwise(edges)) / trace.sample_rate
    if not parts:
        gaps = " without a gap" if len(trace.segments) > 1 else ""
        raise InputError(
            f"no window of {length:g} s fits: {longest:.4g} s were recorded{gaps}, state a shorter --window"
        )
    if len(parts) > _MOST_WINDOWS:
        enough = trace.duration / _MOST_WINDOWS
        raise InputError(f"{len(parts)} windows are too many: state --window {enough:.2g} or longer, or a --duration")
    return tuple(parts)


def throughout(name: str, windows: tuple[Window, ...], tests: int = 1) -> Throughout | None:
    """
    Say how one measure went along the windows.

    Parameters
    ----------
    name : str
        Of the measure.
    windows : tuple of Window
        In order of time.
    tests : int
        Measures that are tested side by side; each may raise a false alarm only so much more rarely.

    Returns
    -------
    Throughout or None
        None where no window carries the measure.
    """
    carried = [(window, value) for window in windows if (value := window.measures[name].value) is not None]
    if not carried:
        return None
    least, most = min(carried, key=lambda pair: pair[1]), max(carried, key=lambda pair: pair[1])
    chance = None if name in _UNTESTED else _chance(name, windows)
    same = None if chance is None else chance > _RARE / tests
    if name == "fundamental_frequency" and len(carried) < len(windows):
        same, chance = False, None
    unit = carried[0][0].measures[name].unit
    return Throughout(same, chance, least[1], least[0].start, most[1], most[0].start, len(carried), unit)


def _chance(name: str, windows: tuple[Window, ...]) -> float | None:
    """Chance of the scatter of the windows, if all had the same value."""
    from scipy.stats import chi2

    weighed = []
    for window in windows:
        measure = window.measures[name]
        if measure.value is None or measure.low is None or measure.high is None or not measure.high > measure.low:
            continue
        error = _UNCERTAIN * max(measure.high - measure.value, measure.value - measure.low) / _WIDEST
        error = math.hypot(error, _edge_error(name, measure.value, window))
        weighed.append((measure.value, 1.0 / error**2))
    if len(weighed) < 2:
        return None
    total = math.fsum(weight for _, weight in weighed)
    mean = math.fsum(value * weight for value, weight in weighed) / total
    scatter = math.fsum(weight * (value - mean) ** 2 for value, weight in weighed)
    return float(chi2.sf(scatter, len(weighed) - 1))


def _edge_error(name: str, value: float, window: Window) -> float:
    """Error of a figure where each edge of a switched light is known to one sample only."""
    frequency = window.measures["fundamental_frequency"].value or 0.0
    share = frequency / window.sample_rate
    return share * (_BY_ONE_SAMPLE.get(name, 0.0) + _BY_ONE_SAMPLE_RELATIVE.get(name, 0.0) * abs(value))
