"""The four lines that a person at the bench reads first: what it is, how deep, how risky, what to do next."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import TYPE_CHECKING

from flicker.limits import risk_curves
from flicker.limits.region import STANDARD
from flicker.report.figures import quantity

if TYPE_CHECKING:
    from flicker.analysis import ChannelReport
    from flicker.limits import Curve, RiskRegion
    from flicker.results import Measure, Note

REGION_WORDS = {
    "no-observable-effect": "no observable effect",
    "low-risk": "low risk",
    "above-low-risk": "above low risk",
}
REGION_MARKS = {"no-observable-effect": "●", "low-risk": "◆", "above-low-risk": "▲"}
_GOES_OUT = 99.5  # percent flicker from which the darkest moment counts as dark [%]


def what(channel: ChannelReport) -> str:
    """Name the light: its frequency, its origin, its duty cycle."""
    frequency = channel.measures["fundamental_frequency"]
    if frequency.value is None:
        return f"no frequency: {short_reason(frequency, channel.notes)}"
    words = quantity(frequency.value, "Hz", 6)
    origin = channel.families[0].origin if channel.families else ""
    words += f", {origin}" if origin else ""
    duty = channel.measures.get("duty_cycle")
    if duty is not None and duty.value is not None and "PWM" in origin:
        words += f"; bright for {quantity(100 * duty.value, '%', 3)} of each period"
    return words


def depth(channel: ChannelReport) -> str:
    """Tell how deep the light is modulated, and what that means."""
    measure = channel.measures["percent_flicker"]
    if measure.value is None:
        return f"not known: {short_reason(measure, channel.notes)}"
    words = f"percent flicker {quantity(measure.value, '%')}"
    if measure.value == 0:
        return f"{words}: steady within {quantity(measure.high or 0.0, '%', 2)}"
    if (measure.high or measure.value) >= _GOES_OUT:
        return f"{words}: the light goes out in every cycle"
    darkest = (100 - measure.value) / (100 + measure.value)
    return f"{words}: the darkest moment keeps {quantity(100 * darkest, '%', 3)} of the brightest"


def short_reason(measure: Measure, notes: Iterable[Note]) -> str:
    """Say why a measure could not be had; where a note says it at length, by the code of that note."""
    return next((f"see {note.code} below" for note in notes if note.message == measure.reason), measure.reason)


def risk(channel: ChannelReport) -> str:
    """Tell the risk region and the number that decides it beside its bound."""
    place = channel.risk_region
    if place is None:
        return "not known without the depth"
    words = f"{REGION_MARKS[place.region]} {REGION_WORDS[place.region]}"
    if place.frequency is None or place.modulation is None:
        return f"{words}: no modulation was found ({STANDARD})"
    words += f": {_deciding(channel, place)} at {quantity(place.frequency, 'Hz', 5)}, "
    name, bound = (
        ("no observable effect", place.no_effect_bound)
        if place.region == "no-observable-effect"
        else ("low risk", place.low_risk_bound)
    )
    words += f"{name} ends at {quantity(bound, '%', 3)}" if bound is not None else "where the standard sets no bound"
    if place.other:
        words += f"; the interval of the frequency also reaches {REGION_WORDS[place.other]}"
    return f"{words} ({STANDARD})"


def next_step(channel: ChannelReport) -> str:
    """Say what to do next: mend the capture, or mend the light."""
    broken = next((note for note in channel.notes if note.severity == "error"), None)
    if broken is not None:
        return f"mend the capture first: {broken.message}"
    place = channel.risk_region
    if place is None:
        unknown = channel.measures["percent_flicker"]
        doubt = next((note.code for note in channel.notes if note.message == unknown.reason), "what hides the depth")
        return f"cure {doubt}, then measure again"
    if place.modulation is None or place.region == "no-observable-effect":
        return "nothing: the strictest practice of this standard is kept"
    low_risk, no_effect = risk_curves()
    goal, curve = ("low risk", low_risk) if place.region == "above-low-risk" else ("no observable effect", no_effect)
    return f"for {goal}, {_cure(channel, place, curve)}"


def severity(channel: ChannelReport) -> tuple[int, float]:
    """Order channels by risk: by region, then by how many times the region's own bound is reached."""
    place = channel.risk_region
    if place is None:
        return -1, 0.0
    bound = place.low_risk_bound if place.region == "above-low-risk" else place.no_effect_bound
    return list(REGION_WORDS).index(place.region), (place.modulation or 0.0) / bound if bound else 0.0


def _deciding(channel: ChannelReport, place: RiskRegion) -> str:
    assert place.modulation is not None
    by_depth = any(family.percent_flicker.value == place.modulation for family in channel.families)
    amount = quantity(place.modulation, "%", 3)
    return f"percent flicker {amount}" if by_depth else f"a spectral line of {amount}"


def _cure(channel: ChannelReport, place: RiskRegion, curve: Curve) -> str:
    assert place.frequency is not None
    assert place.modulation is not None
    fold = _round_up(place.modulation / curve.at(place.frequency))
    words = f"shrink the modulation {quantity(fold, '', 3)}-fold"
    (first, *others) = channel.families or (None,)
    if first is None or others or "mains" in first.origin or first.fundamental.value is None:
        return words
    frequency = _round_up(least_frequency(channel, first.fundamental.value, curve))
    return f"{words} or raise the frequency to {quantity(frequency, 'Hz')}"


def least_frequency(channel: ChannelReport, fundamental: float, curve: Curve) -> float:
    """Lowest fundamental [Hz] at which this waveform, sped up as a whole, keeps the curve; the curve must rise."""
    parts = [(line.frequency, line.modulation) for line in channel.components]
    parts += [(fundamental, channel.families[0].percent_flicker.value or 0.0)]
    return fundamental * max(_allowed_from(curve, frequency, depth) / frequency for frequency, depth in parts)


def _allowed_from(curve: Curve, frequency: float, depth: float) -> float:
    """Lowest frequency, not below the given one, at which the curve allows the depth."""
    if curve.at(frequency) >= depth:
        return frequency
    for band in curve.bands:
        if band.end <= frequency:
            continue
        start = max(band.start, frequency)
        needed = start if band.at(start) >= depth else depth / band.slope if band.slope else math.inf
        if needed < band.end:
            return needed
    return curve.highest


def _round_up(value: float) -> float:
    """Round up to three significant digits, so that what is advised is enough."""
    step = 10.0 ** (math.floor(math.log10(value)) - 2)
    return math.ceil(value / step - 1e-9) * step
