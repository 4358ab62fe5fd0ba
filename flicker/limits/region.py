"""The risk region of IEEE 1789-2015 that a light falls into."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

from flicker.limits.known import known_limits
from flicker.limits.limit import Curve
from flicker.limits.verdict import Modulation, modulations
from flicker.results import Component, Family

Region = Literal["no-observable-effect", "low-risk", "above-low-risk"]
REGIONS: tuple[Region, ...] = ("no-observable-effect", "low-risk", "above-low-risk")
STANDARD = "IEEE 1789-2015"
READING = (
    "decided by the worst of each family's depth at its fundamental and each line's modulation at its own "
    "frequency; the standard gives no rule for several components, this is the program's reading"
)


@dataclass(frozen=True, slots=True)
class RiskRegion:
    """
    Region of the plane of modulation over frequency, and what decided it.

    `frequency` and `modulation` are None for steady light; a bound is None where the light is not limited.
    `other` is the milder region that the interval of the frequency also reaches, when it crosses a step.
    """

    region: Region
    frequency: float | None = None  # [Hz]
    modulation: float | None = None  # [%]
    low_risk_bound: float | None = None  # [%]
    no_effect_bound: float | None = None  # [%]
    other: Region | None = None

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "standard": STANDARD,
            "region": self.region,
            "frequency_hz": self.frequency,
            "modulation_percent": self.modulation,
            "low_risk_bound_percent": self.low_risk_bound,
            "no_effect_bound_percent": self.no_effect_bound,
            "ambiguous_with": self.other,
            "reading": READING,
        }


def risk_curves() -> tuple[Curve, Curve]:
    """Give the curves of low risk and of no observable effect [% over Hz], from the sheet of the standard."""
    known = known_limits()
    low_risk, no_effect = known["ieee1789-low-risk"].bound, known["ieee1789-no-effect"].bound
    assert isinstance(low_risk, Curve)
    assert isinstance(no_effect, Curve)
    return low_risk, no_effect


def risk_region(components: Sequence[Component], families: Sequence[Family]) -> RiskRegion | None:
    """
    Find the region of IEEE 1789-2015 that a light falls into.

    Parameters
    ----------
    components : sequence of Component
        Spectral lines relative to the mean.
    families : sequence of Family
        Fundamentals with the depth of their own waveform; with no lines and no families the light is steady.

    Returns
    -------
    RiskRegion or None
        None if the depth of a family could not be had.

    Notes
    -----
    Every family and every line is placed by its central depth; the worst decides. Both curves step up at 90 Hz:
    there the smallest allowance over the 95 % interval of the frequency is used, and the region that the
    largest would give is stated beside it. What fools the region: light that the capture could not show, above
    half its sample rate or slower than its length.
    """
    if any(family.percent_flicker.value is None for family in families):
        return None
    placed = [_place(one) for one in modulations(components, families)]
    return max(placed, key=_severity, default=RiskRegion("no-observable-effect"))


def _place(one: Modulation) -> RiskRegion:
    low_risk, low_risk_largest, no_effect, no_effect_largest = (
        bound for curve in risk_curves() for bound in _allowance(curve, one)
    )
    region = _region(one.value, low_risk, no_effect)
    milder = _region(one.value, low_risk_largest, no_effect_largest)
    return RiskRegion(
        region,
        one.frequency,
        one.value,
        None if math.isinf(low_risk) else low_risk,
        None if math.isinf(no_effect) else no_effect,
        milder if milder != region else None,
    )


def _allowance(curve: Curve, one: Modulation) -> tuple[float, float]:
    """Smallest and largest allowance where the interval of the frequency crosses a step, else twice the central one."""
    low, high = one.frequency_low, one.frequency_high
    centre = curve.at(one.frequency)
    return (centre, centre) if curve.step_between(low, high) is None else curve.between(low, high)


def _region(depth: float, low_risk: float, no_effect: float) -> Region:
    return REGIONS[0] if depth <= no_effect else REGIONS[1] if depth <= low_risk else REGIONS[2]


def _severity(place: RiskRegion) -> tuple[int, float, float]:
    """Order places: by region, then by how much of the next allowance is used, then by depth."""
    bound = place.low_risk_bound if place.region == "above-low-risk" else place.no_effect_bound
    depth = place.modulation or 0.0
    return REGIONS.index(place.region), (depth / bound if bound else 0.0), depth
