"""The lines that a person at the bench reads first: what it is, how deep, how risky, what to do next."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from flicker.conditioning.frames import ALIASING
from flicker.figures import quantity, round_up
from flicker.limits.region import STANDARD

if TYPE_CHECKING:
    from flicker.limits import RiskRegion
    from flicker.reports import ChannelReport
    from flicker.results import Measure, Note

REGION_WORDS = {
    "no-observable-effect": "no observable effect",
    "low-risk": "low risk",
    "above-low-risk": "above low risk",
}
REGION_MARKS = {"no-observable-effect": "●", "low-risk": "◆", "above-low-risk": "▲"}
_SEIZURES = (3.0, 70.0)  # flicker that can provoke them (public guidance on photosensitivity) [Hz]
_SLIGHT = 5.0  # depth below which IEEE 1789-2015, practice 3, sees no such risk (from memory) [%]
_GOES_OUT = 99.5  # percent flicker from which the darkest moment counts as dark [%]


def what(channel: ChannelReport) -> str:
    """Name the light: its frequency, its origin, its duty cycle."""
    frequency = channel.measures["fundamental_frequency"]
    if frequency.value is None:
        return f"no frequency: {short_reason(frequency, channel.notes)}"
    words = quantity(frequency.value, "Hz", 6)
    if _perhaps_an_alias(channel):
        return f"{words} as the frames show it: a faster light may look like this, see {ALIASING} below"
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
    depth = channel.measures["percent_flicker"]
    if place is None and depth.value == 0:
        return f"not known: the noise would hide a flicker of {quantity(depth.high or 0.0, '%', 2)}"
    if place is None and depth.value is not None:
        return "not known: faster lights look the same at this frame rate"
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
        return f"mend the capture first: see {broken.code} below"
    place = channel.risk_region
    if place is None:
        unknown = channel.measures["percent_flicker"]
        if unknown.value == 0:
            return "record longer, or with more light"
        if unknown.value is not None:
            return "read the light with flicker stripes, or film it at another rate too and add --same-light"
        doubt = next((note.code for note in channel.notes if note.message == unknown.reason), "what hides the depth")
        return f"cure {doubt}, then measure again"
    if place.modulation is None or place.region == "no-observable-effect":
        return "nothing: the strictest practice of this standard is kept"
    if place.region == "above-low-risk":
        return f"for low risk, {_cure(channel, 'ieee1789-low-risk')}"
    return f"for no observable effect, {_cure(channel, 'ieee1789-no-effect')}"


def caution(channel: ChannelReport) -> str:
    """Warn of light that can hurt the one who measures it; empty where there is no such light."""
    for family in channel.families:
        frequency, depth = family.fundamental.value, family.percent_flicker.value
        if frequency is not None and _SEIZURES[0] <= frequency <= _SEIZURES[1] and (depth is None or depth > _SLIGHT):
            return (
                f"{'if the light is really this slow: ' if _perhaps_an_alias(channel) else ''}flicker between 3 and 70 "
                "Hz can provoke seizures in photosensitive people: do not stare into this light, warn those nearby"
            )
    return ""


def _perhaps_an_alias(channel: ChannelReport) -> bool:
    return any(note.code == ALIASING for note in channel.notes)


def severity(channel: ChannelReport) -> tuple[int, float]:
    """Order channels by risk: by region, then by how many times the region's own bound is reached."""
    place = channel.risk_region
    if place is None:
        return -1, 0.0
    bound = place.low_risk_bound if place.region == "above-low-risk" else place.no_effect_bound
    return list(REGION_WORDS).index(place.region), (place.modulation or 0.0) / bound if bound else 0.0


def _deciding(channel: ChannelReport, place: RiskRegion) -> str:
    """Name the modulation that decides; where a line does so at a fundamental, the percent flicker stands beside it."""
    assert place.modulation is not None
    amount = quantity(place.modulation, "%", 3)
    for family in channel.families:
        depth, frequency = family.percent_flicker.value, family.fundamental.value
        if depth == place.modulation:
            return f"percent flicker {amount}"
        if depth is not None and frequency == place.frequency:
            return f"percent flicker {quantity(depth, '%', 3)}, strongest line {amount}"
    return f"a spectral line of {amount}"


def _cure(channel: ChannelReport, limit: str) -> str:
    from flicker.limits import known_limits, margin
    from flicker.tunable import TunableLight

    found = margin(known_limits()[limit], TunableLight.measured(channel), "fail")
    ways = []
    if found.ripple_factor is not None:
        ways.append(f"shrink the modulation {quantity(round_up(found.ripple_factor), '', 3)}-fold")
    only = channel.families[0] if len(channel.families) == 1 else None
    if only is not None and "mains" not in only.origin and found.least_frequency is not None:
        ways.append(f"raise the frequency to {quantity(round_up(found.least_frequency), 'Hz')}")
    return " or ".join(ways) or "change the waveform: neither its frequency nor its depth alone is enough"
