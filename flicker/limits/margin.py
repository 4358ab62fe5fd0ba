"""How far a light is from a limit, and the smallest change that reaches it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any, Protocol

import numpy as np

from flicker.limits.limit import Curve, Limit
from flicker.limits.verdict import Outcome, Verdict
from flicker.trace import FloatArray

_ANSWERS = ("least_frequency_hz", "most_percent_flicker", "ripple_factor")
_HAIR = 1e-12  # kept from the edge on the passing side, more than the rounding of a product
_CLOSE = 1e-11  # how near to the edge it is looked for, on a logarithmic scale
_SIDE = 1e-9  # from a critical speed to either side of it
_SLOWEST, _FASTEST = 1e-9, 1e6  # speeds that stand for nought and for infinity
_GRID = 160  # speeds tried where a measure goes smoothly up and down with the frequency


class Tunable(Protocol):
    """
    A light that can be made faster as a whole and shallower about its mean.

    `speed` multiplies every frequency, `scale` every deviation from the mean; 1 leaves the light as it is.
    """

    @property
    def frequency(self) -> float | None:
        """Fundamental of the deepest family; None for steady light. [Hz]"""
        ...

    @property
    def largest_scale(self) -> float:
        """Scale at which the darkest moment is dark; infinite for steady light."""
        ...

    def percent_flicker(self, scale: float) -> float:
        """Depth of the deepest family. [%]"""
        ...

    def figure(self, measure: str, speed: float, scale: float) -> float | None:
        """Give a measure of the changed light; None if it cannot be had."""
        ...

    def modulations(self, measure: str, speed: float, scale: float) -> tuple[FloatArray, FloatArray]:
        """Frequencies [Hz] and depths [%] that a curve is held against, shape (k,) each."""
        ...

    def critical_speeds(self, limit: Limit) -> Sequence[float]:
        """Speeds at which a line or a family crosses an edge of the rule; between them it goes one way."""
        ...


@dataclass(frozen=True, slots=True)
class Margin:
    """
    What a light may become, and must become, to keep a limit; None where `reasons` says why.

    Frequency, depth and ripple are each the answer when nothing else is changed.
    """

    limit: Limit
    verdict: Outcome
    least_frequency: float | None = None  # from which on this waveform always passes [Hz]
    most_percent_flicker: float | None = None  # that passes at this frequency [%]
    ripple_factor: float | None = None  # by which the modulation must shrink, 1 where it passes
    capacitance_factor: float | None = None  # by which a reservoir behind a rectifier must grow
    reasons: dict[str, str] = field(default_factory=dict)

    @property
    def ripple_decibels(self) -> float | None:
        """By how much the modulation must shrink. [dB]"""
        return None if self.ripple_factor is None else 20.0 * math.log10(self.ripple_factor)

    @property
    def pedestal(self) -> float | None:
        """Steady light, as a share of the present mean, that added to this light does the same."""
        return None if self.ripple_factor is None else self.ripple_factor - 1.0

    def to_dict(self) -> dict[str, Any]:
        """Give one entry of `limits` of `flicker margin --json`."""
        return {
            "limit": self.limit.id,
            "verdict": self.verdict,
            "least_frequency_hz": self.least_frequency,
            "most_percent_flicker": self.most_percent_flicker,
            "ripple_factor": self.ripple_factor,
            "ripple_db": self.ripple_decibels,
            "pedestal_percent": None if self.pedestal is None else 100.0 * self.pedestal,
            "capacitance_factor": self.capacitance_factor,
            "reason": "; ".join(dict.fromkeys(self.reasons[key] for key in _ANSWERS if key in self.reasons)),
            "reasons": dict(self.reasons),
        }


def margin_of(verdict: Verdict, light: Tunable) -> Margin:
    """
    Find the smallest changes of a light after which its limit is kept, by the rule that gave the verdict.

    Parameters
    ----------
    verdict : Verdict
        What a limit says of the light.
    light : Tunable
        The same light.

    Returns
    -------
    Margin
        As `margin` finds it, figures enlarged to the upper end of the verdict's interval if the rule is guarded. All
        answers are None, with the reason, where the limit does not apply or the measure could not be had.
    """
    if verdict.verdict == "not-applicable" or verdict.value is None:
        return Margin(verdict.limit, verdict.verdict, reasons=_no_answers(verdict.reason))
    own = light.figure(verdict.limit.measure, 1.0, 1.0) if not isinstance(verdict.limit.bound, Curve) else verdict.value
    end = verdict.value if verdict.decision == "simple" or verdict.high is None else verdict.high
    return margin(verdict.limit, light, verdict.verdict, end / own if own and end else 1.0)


def _no_answers(reason: str) -> dict[str, str]:
    return dict.fromkeys((*_ANSWERS, "capacitance_factor"), reason)


def margin(limit: Limit, light: Tunable, verdict: Outcome, guard: float = 1.0) -> Margin:
    """
    Find the smallest changes of a light that keep a limit.

    Parameters
    ----------
    limit : Limit
        The row of a sheet.
    light : Tunable
        The light.
    verdict : Outcome
        What the limit says of the light as it is.
    guard : float
        Factor by which a figure of the light is enlarged before it is held against the bound, for the interval of a
        measured light; 1 for a light that is known exactly.

    Returns
    -------
    Margin
        Each answer lies on the passing side, nearer to the edge than one part in 10^9.

    Notes
    -----
    The least frequency is the lowest from which on every higher one passes too: light far below the range of a
    limit keeps it as well, and is no cure. Speeds are tried from above at every point where a line crosses an
    edge of the rule; between such points each rule goes one way, and bisection finds its edge.
    """
    if light.frequency is None:
        steady = "the light is steady"
        keys = ("least_frequency_hz", "most_percent_flicker", "capacitance_factor")
        return Margin(limit, verdict, ripple_factor=1.0, reasons=dict.fromkeys(keys, steady))

    def keeps(speed: float, scale: float) -> bool:
        return _keeps(limit, light, speed, scale, guard)

    if light.figure(limit.measure, 1.0, 1.0) is None:
        lost = f"{limit.measure} cannot be computed from this light"
        return Margin(limit, verdict, reasons=_no_answers(lost))
    reasons: dict[str, str] = {}
    speed = _least(lambda one: keeps(one, 1.0), _speeds(limit, light))
    if speed is None:
        passes = keeps(1.0, 1.0)
        reasons["least_frequency_hz"] = "this waveform passes at every frequency" if passes else "no frequency helps"
    scale = _most(lambda one: keeps(1.0, one), light.largest_scale)
    if scale is None:
        reasons["most_percent_flicker"] = reasons["ripple_factor"] = "no depth passes"
    ripple = None if scale is None else 1.0 if keeps(1.0, 1.0) else 1.0 / scale
    capacitance, why = _capacitance(light, ripple)
    if why:
        reasons["capacitance_factor"] = why
    return Margin(
        limit,
        verdict,
        None if speed is None else speed * light.frequency,
        None if scale is None else light.percent_flicker(scale),
        ripple,
        capacitance,
        reasons,
    )


def _keeps(limit: Limit, light: Tunable, speed: float, scale: float, guard: float) -> bool:
    if isinstance(limit.bound, Curve):
        frequencies, depths = light.modulations(limit.measure, speed, scale)
        return bool(np.all(guard * depths <= limit.bound.at_each(frequencies)))
    figure = light.figure(limit.measure, speed, scale)
    if figure is None:
        return False
    return guard * figure < limit.bound if limit.strict else guard * figure <= limit.bound


def _speeds(limit: Limit, light: Tunable) -> list[float]:
    """Speeds to try, the fastest first."""
    assert light.frequency is not None
    critical = list(light.critical_speeds(limit))
    tried = {side * speed for speed in critical for side in (1.0 - _SIDE, 1.0 + _SIDE)}
    if limit.measure == "pst_lm" and critical:
        tried.update(np.geomspace(1e-3 * min(critical), max(critical), _GRID).tolist())
    tried.update((_SLOWEST, _FASTEST))
    return sorted(tried, reverse=True)


def _least(keeps: Callable[[float], bool], speeds: Sequence[float]) -> float | None:
    """Find the speed from which on all pass; None where all pass or the fastest fails."""
    passing = None
    for speed in speeds:
        if not keeps(speed):
            return None if passing is None else _edge(keeps, speed, passing) * (1.0 + _HAIR)
        passing = speed
    return None


def _most(keeps: Callable[[float], bool], largest: float) -> float | None:
    """Find the largest scale that passes; None where even the smallest fails."""
    if keeps(largest):
        return largest
    smallest = _SLOWEST * largest
    return _edge(keeps, largest, smallest) * (1.0 - _HAIR) if keeps(smallest) else None


def _edge(keeps: Callable[[float], bool], failing: float, passing: float) -> float:
    """Close in, on a logarithmic scale, on the edge between a value that fails and one that passes."""
    while True:
        middle = math.sqrt(failing * passing)
        if abs(math.log(failing / passing)) < _CLOSE:
            return passing
        if keeps(middle):
            passing = middle
        else:
            failing = middle


def _capacitance(light: Tunable, ripple: float | None) -> tuple[float | None, str]:
    """
    Tell by how much a reservoir capacitor must grow for the ripple to shrink by that factor.

    Model: a single-stage converter feeds `1 - cos` of twice the mains frequency into a capacitor beside the string's
    dynamic resistance; the light follows the current. Then the depth is `1 / sqrt(1 + (2 w R C)^2)` (by hand).
    """
    assert light.frequency is not None
    depth = light.percent_flicker(1.0) / 100.0
    if not any(abs(light.frequency / mains - 1.0) < 0.01 for mains in (100.0, 120.0)):
        return None, "a reservoir capacitor matters for ripple at twice the mains frequency only"
    if ripple is None:
        return None, "no depth passes"
    if ripple == 1.0:
        return 1.0, ""
    if not 0.0 < depth < 1.0:
        return None, "light that goes out in every cycle has no reservoir to enlarge"
    return math.sqrt((ripple / depth) ** 2 - 1.0) / math.sqrt(depth**-2 - 1.0), ""
