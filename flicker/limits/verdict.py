"""A measure held against a limit."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal

from flicker.errors import InputError
from flicker.limits.limit import MODULATION, Curve, Limit
from flicker.results import Component, Family, Measure

Outcome = Literal["pass", "fail", "undecided", "not-applicable"]
OUTCOMES: tuple[Outcome, ...] = ("fail", "undecided", "pass", "not-applicable")  # from the one that weighs most
DECISIONS = ("guarded", "simple")
FEWEST_CYCLES = 1.5  # that a capture must hold for a line to be found
LEVEL_TOLERANCE = 0.5  # points by which a dimming level may miss the one that a limit names
COVERAGE = 1.959963984540054  # standard errors on either side of a 95 % interval (normal distribution)


@dataclass(frozen=True, slots=True)
class Verdict:
    """
    What the limit says of one channel, with all that the decision rests on.

    `bound` is None where there is no limit at that frequency; `low` and `high` are the ends of the 95 % interval.
    """

    limit: Limit
    verdict: Outcome
    value: float | None = None
    low: float | None = None
    high: float | None = None
    bound: float | None = None
    frequency: float | None = None  # at which the bound was read [Hz]
    part: str = ""  # of the light, that decided: family or line
    decision: str = "guarded"
    reason: str = ""

    @property
    def margin(self) -> float | None:
        """How far the value lies under the bound, in percent of the bound; negative beyond it."""
        if self.value is None or not self.bound:
            return None
        return 100.0 * (self.bound - self.value) / abs(self.bound)

    @classmethod
    def from_dict(cls, limit: Limit, data: Mapping[str, Any]) -> Verdict:
        """Take a verdict on that limit back from its JSON form."""
        same = ("verdict", "value", "low", "high", "bound", "decision", "reason")
        return cls(limit, frequency=data["frequency_hz"], part=data["part"], **{name: data[name] for name in same})

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "limit": self.limit.id,
            "measure": self.limit.measure,
            "value": self.value,
            "low": self.low,
            "high": self.high,
            "bound": self.bound,
            "unit": self.limit.unit,
            "frequency_hz": self.frequency,
            "part": self.part,
            "margin_percent": self.margin,
            "verdict": self.verdict,
            "decision": self.decision,
            "reason": self.reason,
            "source": f"{self.limit.source}: {self.limit.clause}",
        }


def overall(outcomes: Iterable[Outcome]) -> Outcome:
    """Give the outcome that weighs most: one fail breaks all, nothing undecided passes."""
    found = set(outcomes)
    return next((outcome for outcome in OUTCOMES if outcome in found), "not-applicable")


@dataclass(frozen=True, slots=True)
class Conditions:
    """What is known about a capture beside its light; None where it is not known."""

    sample_rate: float | None = None  # [Hz]
    duration: float | None = None  # [s]
    level: float | None = None  # dimming level [%]
    supply: str | None = None  # as the manifest writes it


@dataclass(frozen=True, slots=True)
class Modulation:
    """A depth [%] at a frequency [Hz], each with its 95 % interval: of a family, or of one line."""

    value: float
    low: float
    high: float
    frequency: float
    frequency_low: float
    frequency_high: float
    part: str  # family or line


def judge(
    limit: Limit,
    measures: Mapping[str, Measure],
    components: Sequence[Component],
    families: Sequence[Family],
    decision: str = "guarded",
    conditions: Conditions | None = None,
) -> Verdict:
    """
    Hold one channel against one limit.

    Parameters
    ----------
    limit : Limit
        The row of a sheet.
    measures, components, families
        What was found in the channel.
    decision : {"guarded", "simple"}
        Guarded: pass only if the whole 95 % interval keeps the limit, fail only if all of it breaks it, else
        undecided. Simple: the value alone decides.
    conditions : Conditions, optional
        What the scope of the limit needs to know; what is not known does not restrict.

    Returns
    -------
    Verdict
        A measure that could not be had gives `undecided` with its reason, never a pass.

    Raises
    ------
    InputError
        If there is no such decision rule.

    Notes
    -----
    A guarded pass at a true value on the limit happens in at most 2.5 % of captures (one tail of the interval);
    the guard band is that of ILAC-G8:09/2019 with w = U. Where the allowance depends on the frequency, it is
    read over the whole interval of the frequency: the smallest decides a pass, the largest a fail.
    """
    if decision not in DECISIONS:
        raise InputError(f"no decision rule is called '{decision}'; known: {', '.join(DECISIONS)}")
    conditions = conditions or Conditions()
    outside = _out_of_scope(limit, conditions)
    if outside:
        return Verdict(limit, "not-applicable", decision=decision, reason=outside)
    if isinstance(limit.bound, Curve):
        return _judge_curve(limit, limit.bound, measures, components, families, decision, conditions)
    measure = measures.get(limit.measure)
    if measure is None or measure.value is None:
        reason = measure.reason if measure else f"{limit.measure} was not measured"
        return Verdict(limit, "undecided", bound=limit.bound, decision=decision, reason=reason)
    low, high = _interval(measure)
    outcome = _decide(limit, (measure.value, low, high), (limit.bound,) * 3, decision)
    reason = _near(outcome, decision)
    return Verdict(
        limit, outcome, measure.value, measure.low, measure.high, limit.bound, decision=decision, reason=reason
    )


def _out_of_scope(limit: Limit, conditions: Conditions) -> str:
    """Say why the limit does not apply here; empty where it does or where nothing tells."""
    level = conditions.level
    if limit.levels and level is not None and all(abs(level - one) > LEVEL_TOLERANCE for one in limit.levels):
        levels = " and ".join(f"{level:g} %" for level in limit.levels)
        return f"it holds at {levels} light output, and this capture was taken at {level:g} %"
    supply = (conditions.supply or "").lower()
    if limit.mains_only and any(word in supply.replace("/", " ").split() for word in ("dc", "battery")):
        return f"it holds for light sources on the mains, and this one is supplied by {conditions.supply}"
    return ""


def _interval(measure: Measure) -> tuple[float, float]:
    """Ends of the interval of a measure that has a value; the value itself where no end is known."""
    assert measure.value is not None
    low = measure.value if measure.low is None else measure.low
    high = measure.value if measure.high is None else measure.high
    return low, high


def _decide(
    limit: Limit, value: tuple[float, float, float], bound: tuple[float, float, float], decision: str
) -> Outcome:
    """Decide on value, low, high against the bound at the centre, its smallest and its largest."""

    def keeps(number: float, allowed: float) -> bool:
        return number < allowed if limit.strict else number <= allowed

    if decision == "simple":
        return "pass" if keeps(value[0], bound[0]) else "fail"
    if keeps(value[2], bound[1]):
        return "pass"
    return "undecided" if keeps(value[1], bound[2]) else "fail"


def _near(outcome: Outcome, decision: str) -> str:
    return "the 95 % interval reaches across the limit" if outcome == "undecided" and decision == "guarded" else ""


# ---- limits that depend on the frequency -------------------------------------------------------------------------


def modulations(components: Sequence[Component], families: Sequence[Family]) -> Iterator[Modulation]:
    """Give the depth of every family that has one, at its fundamental, then the modulation of every line."""
    for family in families:
        if family.percent_flicker.value is not None and family.fundamental.value is not None:
            yield Modulation(
                family.percent_flicker.value,
                *_interval(family.percent_flicker),
                family.fundamental.value,
                *_interval(family.fundamental),
                "family",
            )
    for line in components:
        spread, drift = COVERAGE * 100.0 * line.standard_error, COVERAGE * line.frequency_error
        low, high = max(line.modulation - spread, 0.0), line.modulation + spread
        yield Modulation(
            line.modulation, low, high, line.frequency, line.frequency - drift, line.frequency + drift, "line"
        )


def _judge_curve(
    limit: Limit,
    curve: Curve,
    measures: Mapping[str, Measure],
    components: Sequence[Component],
    families: Sequence[Family],
    decision: str,
    conditions: Conditions,
) -> Verdict:
    lines = components if limit.measure == MODULATION else ()
    found = [_judge_one(limit, curve, one, decision) for one in modulations(lines, families)]
    worst = max(found, key=_severity, default=None)
    if worst and worst.verdict == "fail":
        return worst
    unknown = _unknown_depth(measures, families)
    if unknown:
        return Verdict(limit, "undecided", decision=decision, reason=unknown)
    best = worst or _steady(limit, measures, decision)
    blind = _blind_range(curve, conditions)
    return replace(best, verdict="undecided", reason=blind) if blind and best.verdict == "pass" else best


def _judge_one(limit: Limit, curve: Curve, one: Modulation, decision: str) -> Verdict:
    centre = curve.at(one.frequency)
    smallest, largest = curve.between(one.frequency_low, one.frequency_high)
    outcome = _decide(limit, (one.value, one.low, one.high), (centre, smallest, largest), decision)
    reason = _near(outcome, decision)
    if math.isinf(centre):
        reason = reason or f"there is no limit at {one.frequency:.6g} Hz"
    step = curve.step_between(one.frequency_low, one.frequency_high)
    if outcome == "undecided" and step is not None:
        reason = f"the limit steps at {step:g} Hz, inside the 95 % interval of the frequency"
    bound = None if math.isinf(centre) else centre
    return Verdict(limit, outcome, one.value, one.low, one.high, bound, one.frequency, one.part, decision, reason)


def _severity(verdict: Verdict) -> tuple[int, float, float]:
    """Order verdicts: fail above undecided above pass, then by how much of the allowance is used, then by depth."""
    rank = ("pass", "undecided", "fail").index(verdict.verdict)
    depth = verdict.value or 0.0
    return rank, (depth / verdict.bound if verdict.bound else 0.0), depth


def _unknown_depth(measures: Mapping[str, Measure], families: Sequence[Family]) -> str:
    """Say why the depth is not known; empty where it is."""
    depths = [family.percent_flicker for family in families]
    whole = measures.get("percent_flicker")
    if whole is not None and not families:
        depths.append(whole)
    return next((depth.reason for depth in depths if depth.value is None), "")


def _steady(limit: Limit, measures: Mapping[str, Measure], decision: str) -> Verdict:
    depth = measures.get("percent_flicker")
    value, low, high = (depth.value, depth.low, depth.high) if depth else (0.0, None, None)
    return Verdict(limit, "pass", value, low, high, decision=decision, reason="no modulation was found")


def _blind_range(curve: Curve, conditions: Conditions) -> str:
    """Say which part of the limited range the capture cannot show; empty where it shows it all."""
    rate, duration = conditions.sample_rate, conditions.duration
    if rate is not None and rate < 2.0 * curve.highest < math.inf:
        return (
            f"at {rate:.6g} samples/s a capture shows nothing above {rate / 2:.6g} Hz, and the limit holds up to "
            f"{curve.highest:g} Hz: sample at {2 * curve.highest:g} Hz or faster"
        )
    if duration is not None and curve.lowest > 0 and duration * curve.lowest < FEWEST_CYCLES:
        return (
            f"a capture of {duration:.3g} s shows nothing slower than {FEWEST_CYCLES / duration:.3g} Hz, and the limit "
            f"begins at {curve.lowest:g} Hz: record at least {2.0 / curve.lowest:.2g} s"
        )
    return ""
