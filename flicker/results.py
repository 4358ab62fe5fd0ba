"""What every floor hands upward: measures, notes, spectral components and families."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Literal

Severity = Literal["info", "warning", "error"]

# measures relative to the mean level: without a true zero and a true mean they have no meaning
DEPTH_MEASURES = (
    "percent_flicker",
    "flicker_index",
    "rms_modulation",
    "svm",
    "pst_lm",
    "percent_flicker_below_40hz",
    "percent_flicker_below_90hz",
    "percent_flicker_below_200hz",
    "percent_flicker_below_400hz",
    "percent_flicker_below_1000hz",
    "display_flicker_level",
    "display_flicker_contrast",
)


@dataclass(frozen=True, slots=True)
class Measure:
    """
    One figure with its unit, its 95 % interval and how it was obtained, or the reason that there is none.

    `value` is None exactly when `reason` says why; `low` and `high` are the ends of the 95 % interval.
    """

    value: float | None
    unit: str
    low: float | None = None
    high: float | None = None
    method: str = ""
    reason: str = ""
    series: tuple[tuple[float, float], ...] = ()  # start [s] and value of each window that the measure is taken in

    def __post_init__(self) -> None:
        for number in (self.value, self.low, self.high):
            if number is not None and not math.isfinite(number):
                raise ValueError(f"a measure must be finite or None, not {number}")
        if (self.value is None) != bool(self.reason):
            raise ValueError("a measure without a value needs a reason, one with a value has none")

    @classmethod
    def missing(cls, unit: str, reason: str) -> Measure:
        """Make a measure that could not be had."""
        return cls(None, unit, reason=reason)

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        if self.value is None:
            return {"value": None, "unit": self.unit, "reason": self.reason}
        data = {"value": self.value, "unit": self.unit, "low": self.low, "high": self.high, "method": self.method}
        if self.series:
            data["series"] = [{"start_s": start, "value": value} for start, value in self.series]
        return data


@dataclass(frozen=True, slots=True)
class Note:
    """
    A doubt about a capture: what it does to the result, and what to do.

    `voids` names the measures that the doubt makes meaningless; `"*"` stands for all of them.
    """

    code: str
    severity: Severity
    message: str
    voids: tuple[str, ...] = ()

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {"code": self.code, "severity": self.severity, "message": self.message}


@dataclass(frozen=True, slots=True)
class Component:
    """One spectral line: frequency [Hz], complex peak amplitude relative to the mean (1 at t = 0, cosine)."""

    frequency: float
    amplitude: complex
    standard_error: float = 0.0  # of the amplitude
    frequency_error: float = 0.0  # standard error of the frequency [Hz]

    @property
    def modulation(self) -> float:
        """100 times the peak amplitude over the mean. [%]"""
        return 100.0 * abs(self.amplitude)

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        phase = math.atan2(self.amplitude.imag, self.amplitude.real)
        return {"frequency_hz": self.frequency, "modulation_percent": self.modulation, "phase_rad": phase}


@dataclass(frozen=True, slots=True)
class Family:
    """A fundamental [Hz] with its harmonics, the depth of their common waveform [%] and a guess of the origin."""

    fundamental: Measure
    percent_flicker: Measure
    lines: int
    origin: str

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "fundamental_hz": self.fundamental.value,
            "fundamental_low_hz": self.fundamental.low,
            "fundamental_high_hz": self.fundamental.high,
            "percent_flicker": self.percent_flicker.value,
            "percent_flicker_low": self.percent_flicker.low,
            "percent_flicker_high": self.percent_flicker.high,
            "lines": self.lines,
            "origin": self.origin,
        }
