"""What happens over the dimming range: the worst step, how the light is dimmed, where that changes."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from flicker.limits import OUTCOMES, Outcome

STEADY = 1.0  # percent flicker below which a light counts as dimmed without modulation [%]
_NEARLY_ALL = 0.8  # share of a change of level that makes the mode one or the other
_SAME_FREQUENCY = 0.01  # relative change that counts as a step of the frequency


@dataclass(frozen=True, slots=True)
class Point:
    """One channel of one capture of a sweep; None for what is not known."""

    capture: str
    channel: str
    unit: str  # which specimen
    level: float | None  # [%]
    mean: float | None  # above dark, in the unit of the capture
    frequency: float | None  # [Hz]
    depth: float | None  # percent flicker [%]
    duty: float | None
    region: str | None
    verdict: Outcome
    margin: float | None  # smallest over the limits, of those that decide the verdict [%]
    limit: str  # the limit of that margin
    reason: str = ""  # why its verdict is not plain

    @property
    def peak(self) -> float | None:
        """Brightest level of the cycle, from mean, depth and duty cycle; None where one is missing."""
        if self.mean is None or self.depth is None:
            return None
        if self.depth < STEADY:
            return self.mean
        if self.duty is None:
            return None
        floor = (100.0 - self.depth) / (100.0 + self.depth)
        return self.mean / (self.duty + floor * (1.0 - self.duty))

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form."""
        return {
            "capture": self.capture,
            "channel": self.channel,
            "unit": self.unit or None,
            "level_percent": self.level,
            "mean": self.mean,
            "frequency_hz": self.frequency,
            "percent_flicker": self.depth,
            "duty_cycle": self.duty,
            "region": self.region,
            "verdict": self.verdict,
            "margin_percent": self.margin,
            "limit": self.limit or None,
            "reason": self.reason,
        }


def points_of(capture: Mapping[str, Any]) -> tuple[Point, ...]:
    """Take from the JSON form of one capture what a sweep needs of each channel; nothing of an unreadable one."""
    conditions = capture.get("conditions", {})
    unit, level = str(conditions.get("unit", "")), conditions.get("level_percent")
    path = str(capture["capture"]["path"])
    return tuple(_point(path, unit, level, channel) for channel in capture.get("channels", ()))


def _point(path: str, unit: str, level: float | None, channel: Mapping[str, Any]) -> Point:
    measures, region = channel["measures"], channel["risk_region"]
    families = channel["families"]
    verdict, margin, limit, reason = _deciding(channel["verdicts"])
    return Point(
        path,
        channel["name"],
        unit,
        level,
        channel["level"]["mean"],
        families[0]["fundamental_hz"] if families else None,
        measures.get("percent_flicker", {}).get("value"),
        measures.get("duty_cycle", {}).get("value"),
        region["region"] if region else None,
        verdict,
        margin,
        limit,
        reason,
    )


def _deciding(verdicts: Sequence[Mapping[str, Any]]) -> tuple[Outcome, float | None, str, str]:
    """Outcome, margin, limit and reason of the verdict that decides: the worst outcome, then the smallest margin."""
    if not verdicts:
        return "not-applicable", None, "", ""

    def weight(verdict: Mapping[str, Any]) -> tuple[int, float]:
        margin = verdict["margin_percent"]
        return OUTCOMES.index(verdict["verdict"]), math.inf if margin is None else margin

    worst = min(verdicts, key=weight)
    return worst["verdict"], worst["margin_percent"], worst["limit"], worst["reason"]


@dataclass(frozen=True, slots=True)
class Span:
    """Neighbouring levels, from the higher to the lower, over which the light is dimmed in one way."""

    high: float  # [%]
    low: float  # [%]
    mode: str  # amplitude, pwm, hybrid or unknown


@dataclass(frozen=True, slots=True)
class Course:
    """One specimen over its dimming range."""

    unit: str
    channel: str
    points: tuple[Point, ...]  # from the highest level to the lowest
    worst: Point
    spans: tuple[Span, ...]  # from the highest level to the lowest
    frequency_steps: tuple[tuple[Point, Point], ...]
    breaks: tuple[tuple[Point, Point], ...]  # neighbours of which the lower level is the brighter one

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form."""
        return {
            "unit": self.unit or None,
            "channel": self.channel,
            "points": [point.to_dict() for point in self.points],
            "worst": self.worst.to_dict(),
            "modes": [{"from_percent": one.high, "to_percent": one.low, "mode": one.mode} for one in self.spans],
            "mode_changes_percent": [after.high for after in self.spans[1:]],
            "frequency_steps": [
                {
                    "from_percent": before.level,
                    "to_percent": after.level,
                    "from_hz": before.frequency,
                    "to_hz": after.frequency,
                }
                for before, after in self.frequency_steps
            ],
            "mean_rises_with_level": not self.breaks,
            "breaks_percent": [[before.level, after.level] for before, after in self.breaks],
        }


def courses(points: Sequence[Point]) -> tuple[Course, ...]:
    """
    Follow every specimen and channel over the levels at which it was captured.

    Parameters
    ----------
    points : sequence of Point
        In any order; those without a level are left out.

    Returns
    -------
    tuple of Course
        One for each specimen and channel with at least two levels, in the order of their first appearance.

    Notes
    -----
    The change of the mean level from one step to the next is split, on a logarithmic scale, into that of the
    peak and that of the share of the cycle it fills. Where at least 80 % of it comes from the peak the light is
    dimmed by amplitude, where at least 80 % comes from the pulse width by PWM, else the mode is hybrid. What
    fools it: light that is neither steady nor rectangular has no pulse width, and its mode stays unknown.
    """
    groups: dict[tuple[str, str], list[Point]] = {}
    for point in points:
        if point.level is not None:
            groups.setdefault((point.unit, point.channel), []).append(point)
    return tuple(
        _course(unit, channel, group)
        for (unit, channel), group in groups.items()
        if len({point.level for point in group}) > 1
    )


def _course(unit: str, channel: str, group: Sequence[Point]) -> Course:
    ordered = sorted(group, key=lambda point: -(point.level or 0.0))
    pairs = [(before, after) for before, after in pairwise(ordered) if before.level != after.level]
    return Course(
        unit,
        channel,
        tuple(ordered),
        min(ordered, key=weight),
        _spans(pairs),
        tuple(pair for pair in pairs if _frequency_steps(*pair)),
        tuple(pair for pair in pairs if _rises(*pair)),
    )


def weight(point: Point) -> tuple[int, float, float]:
    """Order points, the worst first: by outcome, by margin, by depth."""
    margin = math.inf if point.margin is None else point.margin
    return OUTCOMES.index(point.verdict), margin, -(point.depth or 0.0)


def _spans(pairs: Sequence[tuple[Point, Point]]) -> tuple[Span, ...]:
    spans: list[Span] = []
    for before, after in pairs:
        assert before.level is not None
        assert after.level is not None
        mode = dimming_mode(before, after)
        if spans and spans[-1].mode == mode and spans[-1].low == before.level:
            spans[-1] = Span(spans[-1].high, after.level, mode)
        else:
            spans.append(Span(before.level, after.level, mode))
    return tuple(spans)


def dimming_mode(before: Point, after: Point) -> str:
    """Tell how the light gets from one level to the next: amplitude, pwm, hybrid or unknown."""
    peaks = before.peak, after.peak
    if not (before.mean and after.mean and peaks[0] and peaks[1]) or before.mean <= 0 or after.mean <= 0:
        return "unknown"
    whole = math.log(after.mean / before.mean)
    by_peak = math.log(peaks[1] / peaks[0])
    by_width = whole - by_peak
    total = abs(by_peak) + abs(by_width)
    if total == 0.0:
        return "unknown"
    share = abs(by_peak) / total
    return "amplitude" if share >= _NEARLY_ALL else "pwm" if share <= 1.0 - _NEARLY_ALL else "hybrid"


def _frequency_steps(before: Point, after: Point) -> bool:
    if not before.frequency or not after.frequency:
        return False
    return abs(after.frequency / before.frequency - 1.0) > _SAME_FREQUENCY


def _rises(before: Point, after: Point) -> bool:
    return before.mean is not None and after.mean is not None and after.mean >= before.mean


# ---- before and after --------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Change:
    """The same specimen, channel and level in two sweeps."""

    before: Point
    after: Point

    @property
    def kind(self) -> str:
        """What became of it: better, worse or same, by the outcome of the limits."""
        first, second = (OUTCOMES.index(point.verdict) for point in (self.before, self.after))
        return "same" if first == second else "better" if second > first else "worse"

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form."""
        return {"change": self.kind, "before": self.before.to_dict(), "after": self.after.to_dict()}


def changes(before: Sequence[Point], after: Sequence[Point]) -> tuple[Change, ...]:
    """
    Lay two sweeps side by side: points of the same specimen, channel and level.

    Where either sweep has one specimen only, its name does not matter: a driver that was swapped has another. Nor does
    the name of the channel where every capture has one only: another recorder gives it another name.
    """
    by_unit = min(len({point.unit for point in sweep}) for sweep in (before, after)) > 1
    by_channel = any(len({point.capture for point in sweep}) < len(sweep) for sweep in (before, after))

    def key(point: Point) -> tuple[str, str, float | None]:
        return (point.unit if by_unit else "", point.channel if by_channel else "", point.level)

    earlier = {key(point): point for point in reversed(before)}
    return tuple(Change(earlier[key(point)], point) for point in after if key(point) in earlier)
