"""A limit: which measure must stay within which bound, and on what authority."""

from __future__ import annotations

import datetime
import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.trace import FloatArray

MODULATION = "modulation"  # worst of each family's depth and each line's modulation, at its own frequency
FAMILY_DEPTH = "percent_flicker"  # with bands: each family's depth at its fundamental

UNITS = {
    MODULATION: "%",
    "percent_flicker": "%",
    "flicker_index": "1",
    "rms_modulation": "%",
    "display_flicker_level": "dB",
    "display_flicker_contrast": "%",
    "svm": "1",
    "pst_lm": "1",
    "percent_flicker_below_40hz": "%",
    "percent_flicker_below_90hz": "%",
    "percent_flicker_below_200hz": "%",
    "percent_flicker_below_400hz": "%",
    "percent_flicker_below_1000hz": "%",
}


@dataclass(frozen=True, slots=True)
class Band:
    """
    Allowance from the frequency `start` up to, not including, `end`: `level`, or `slope` times the frequency.

    Frequencies are in Hz, the allowance is in the unit of the limit; exactly one of `level` and `slope` is given.
    """

    start: float
    end: float
    level: float | None = None
    slope: float | None = None
    note: str = ""

    def at(self, frequency: float) -> float:
        """Allowance at a frequency inside the band."""
        if self.level is not None:
            return self.level
        assert self.slope is not None
        return self.slope * frequency


@dataclass(frozen=True, slots=True)
class Curve:
    """Allowance over the frequency: bands in ascending order; where no band lies there is no limit (infinity)."""

    bands: tuple[Band, ...]

    def at(self, frequency: float) -> float:
        """Allowance at one frequency [Hz]; infinite where there is no limit."""
        return next((band.at(frequency) for band in self.bands if band.start <= frequency < band.end), math.inf)

    def at_each(self, frequencies: FloatArray) -> FloatArray:
        """Allowances at frequencies of shape (k,) [Hz]; infinite where there is no limit."""
        allowed = np.full(frequencies.shape, math.inf)
        for band in self.bands:
            inside = (band.start <= frequencies) & (frequencies < band.end)
            allowed[inside] = band.level if band.slope is None else band.slope * frequencies[inside]
        return allowed

    def between(self, low: float, high: float) -> tuple[float, float]:
        """Smallest and largest allowance over the frequencies from `low` to `high` [Hz], steps included."""
        found = [self.at(frequency) for frequency in (low, high, *self.edges) if low <= frequency <= high]
        found += [band.at(band.end) for band in self.bands if low < band.end <= high]
        return min(found), max(found)

    @property
    def edges(self) -> tuple[float, ...]:
        """Frequencies at which the rule changes, ascending. [Hz]"""
        ends = {edge for band in self.bands for edge in (band.start, band.end)}
        return tuple(sorted(edge for edge in ends if 0 < edge < math.inf))

    def step_between(self, low: float, high: float) -> float | None:
        """
        Frequency from `low` to `high` at which the allowance jumps [Hz]; None if it does not.

        Allowances above 100 % count as 100: no depth exceeds it, so the end of a ramp at 100 % is no step.
        """
        for edge in self.edges:
            before = min(next((band.at(edge) for band in self.bands if band.start < edge <= band.end), 100.0), 100.0)
            if low <= edge <= high and not math.isclose(before, min(self.at(edge), 100.0), rel_tol=1e-6):
                return edge
        return None

    @property
    def highest(self) -> float:
        """Frequency above which there is no limit; infinite if there is none. [Hz]"""
        return max(band.end for band in self.bands)

    @property
    def lowest(self) -> float:
        """Frequency below which there is no limit. [Hz]"""
        return self.bands[0].start


@dataclass(frozen=True, slots=True)
class Limit:
    """
    One row of a sheet: which measure must stay within which bound, and on what authority.

    `bound` is a number in the unit of the measure, or a curve over the frequency. `strict` means that the
    bound itself already breaks the limit. `until` is the last day; None while it is in force.
    """

    id: str
    name: str
    measure: str
    bound: float | Curve
    clause: str
    applies: str
    title: str
    source: str
    basis: str
    strict: bool = False
    begins: datetime.date | None = None
    until: datetime.date | None = None
    levels: tuple[float, ...] = ()  # dimming levels at which it holds; empty: at every one [%]
    mains_only: bool = False  # holds for light sources on the mains only

    @property
    def unit(self) -> str:
        """Unit of the measure and of the bound."""
        return UNITS[self.measure]

    def in_force(self, day: datetime.date | None) -> bool:
        """Tell whether the limit applied on that day; without a day, whether nothing has replaced it."""
        if day is None:
            return self.until is None
        return (self.begins is None or self.begins <= day) and (self.until is None or day <= self.until)

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form: one entry of `flicker limits --json`."""
        bands = self.bound.bands if isinstance(self.bound, Curve) else ()
        return {
            "limit": self.id,
            "name": self.name,
            "measure": self.measure,
            "unit": self.unit,
            "at_most" if not self.strict else "below": None if bands else self.bound,
            "bands": [_band_to_dict(band) for band in bands],
            "clause": self.clause,
            "applies": self.applies,
            "from": self.begins.isoformat() if self.begins else None,
            "until": self.until.isoformat() if self.until else None,
            "levels_percent": list(self.levels),
            "mains_only": self.mains_only,
            "title": self.title,
            "source": self.source,
            "basis": self.basis,
        }


def _band_to_dict(band: Band) -> dict[str, Any]:
    return {
        "from_hz": band.start,
        "to_hz": None if math.isinf(band.end) else band.end,
        "at_most": band.level,
        "at_most_per_hz": band.slope,
        **({"note": band.note} if band.note else {}),
    }
