"""One light seen at several sample rates: which true frequency shows as what was seen in all of them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from flicker.errors import InputError

HIGHEST = 100e3  # lights are switched more slowly than this (common practice, no source) [Hz]
CLOCK = 100e-6  # relative error of a sample clock that is assumed where none is stated (common practice, no source)
_FIT = 3.0  # standard errors by which a fit may miss
_LISTED = 5  # that fit less well


@dataclass(frozen=True, slots=True)
class Seen:
    """What one capture shows: the fundamental that it reads, its standard error, and its sample or frame rate. [Hz]"""

    name: str
    frequency: float
    error: float
    rate: float

    def folded(self, frequency: float) -> float:
        """Where a light of some frequency shows in this capture. [Hz]"""
        return abs(frequency - self.rate * round(frequency / self.rate))

    def deviation(self, frequency: float, clock: float) -> float:
        """How far that is from what was seen, in standard errors, the error of the clock included."""
        return abs(self.folded(frequency) - self.frequency) / math.hypot(self.error, clock * frequency)


@dataclass(frozen=True, slots=True)
class SameLight:
    """The frequencies that fit all captures, and others with the most standard errors by which they miss one."""

    fits: tuple[float, ...]  # lowest first [Hz]
    error: float  # standard error of the first [Hz]
    others: tuple[tuple[float, float], ...]  # (frequency [Hz], deviation), best first
    clock: float  # relative error of each clock that was allowed for

    @property
    def frequency(self) -> float | None:
        """The one frequency that fits; None where none or several do. [Hz]"""
        return self.fits[0] if len(self.fits) == 1 else None

    @property
    def reason(self) -> str:
        """Why there is no single frequency; empty where there is one."""
        if len(self.fits) > 1:
            listed = ", ".join(f"{one:.6g}" for one in self.fits[:_LISTED])
            more = f" and {len(self.fits) - _LISTED} more" if len(self.fits) > _LISTED else ""
            return (
                f"{listed}{more} Hz all fit: add a capture at another rate, one that is no simple ratio of the others"
            )
        if not self.fits:
            return (
                f"no frequency up to {HIGHEST / 1e3:g} kHz fits all captures: is it one light at one setting, and are "
                f"the clocks within {self.clock * 1e6:g} ppm (--clock-ppm)?"
            )
        return ""

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "frequency_hz": self.frequency,
            "low_hz": None if self.frequency is None else self.frequency - 1.96 * self.error,
            "high_hz": None if self.frequency is None else self.frequency + 1.96 * self.error,
            **({"reason": self.reason} if self.reason else {}),
            "fits_hz": list(self.fits),
            "others": [{"frequency_hz": one, "standard_errors": off} for one, off in self.others],
            "clock_ppm": self.clock * 1e6,
        }


def settle(seen: Sequence[Seen], clock: float | None = None, highest: float = HIGHEST) -> SameLight:
    """
    Find the frequencies that show as what was seen in every capture.

    Parameters
    ----------
    seen : sequence of Seen
        Two captures or more of one light, at different rates.
    clock : float, optional
        Relative standard error of each sample clock; `CLOCK` where it is not stated.
    highest : float
        Up to where frequencies are tried. [Hz]

    Returns
    -------
    SameLight

    Raises
    ------
    InputError
        If there are fewer than two captures, or all have one rate.

    Notes
    -----
    A capture at the rate `r` shows light of every frequency `|k r +- f|` at `f`, below half the rate (sampling
    theorem). The frequencies that the fastest capture leaves are held against all others. The error of a clock grows
    with the frequency, so that few captures decide less and less the higher it may be.
    """
    if len(seen) < 2:
        raise InputError("--same-light needs two captures or more of one light, at different sample rates")
    if max(one.rate for one in seen) / min(one.rate for one in seen) - 1 < 1e-3:
        raise InputError(
            f"all captures have the rate {seen[0].rate:.6g} Hz and so show every frequency alike: record one at "
            "another rate, such as 0.8 of it"
        )
    allowed = CLOCK if clock is None else clock
    first = max(seen, key=lambda one: one.rate)
    tried = []
    for turn in range(int(highest / first.rate) + 1):
        tried += [turn * first.rate + sign * first.frequency for sign in (-1, 1)]
    rated = []
    for start in {one for one in tried if 0 < one <= highest}:
        better, error = _together(seen, start, allowed)
        rated.append((max(one.deviation(better, allowed) for one in seen), better, error))
    rated.sort()
    fits = sorted((frequency, error) for off, frequency, error in rated if off <= _FIT)
    others = [(frequency, off) for off, frequency, _ in rated if off > _FIT][:_LISTED]
    return SameLight(tuple(one for one, _ in fits), fits[0][1] if fits else math.nan, tuple(others), allowed)


def _together(seen: Sequence[Seen], start: float, clock: float) -> tuple[float, float]:
    """Weighted mean of what the captures say of a frequency near a start, and its standard error. [Hz]"""
    total, weights = 0.0, 0.0
    for one in seen:
        turn = round(start / one.rate)
        side = 1.0 if start >= turn * one.rate else -1.0
        said = turn * one.rate + side * one.frequency
        weight = 1.0 / (one.error**2 + (clock * start) ** 2)
        if abs(said - start) <= 2 * _FIT * weight**-0.5:
            total, weights = total + weight * said, weights + weight
    return (total / weights, weights**-0.5) if weights else (start, seen[0].error)
