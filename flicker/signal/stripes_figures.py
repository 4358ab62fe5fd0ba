"""Figures of a light read from stripes, with intervals from draws of what the fit leaves open."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.fft

from flicker.light import ComplexArray, Pulse
from flicker.results import Measure
from flicker.signal.stripes_free import FreeShape, extremes
from flicker.signal.stripes_shape import PulseShape, low_level_of
from flicker.signal.stroboscopic import stroboscopic_visibility
from flicker.trace import FloatArray

_GRID = 1024
_SVM = 3.7  # exponent of the sum over lines, IEC TR 63158:2018 (from memory)
_DRAWS = 120
_EXPOSURE = "the exposure blurs edges: use a photodiode"


@dataclass(frozen=True, slots=True, eq=False)
class Samples:
    """One cycle of the light about the middle of the exposure, mean 1: the best one first, then draws; shape (d, g)."""

    waves: FloatArray
    duties: FloatArray  # shape (d,); NaN where the wave itself must say
    method: str
    bound: float = 0.0  # what blind harmonics may add on either side
    pulse: Pulse | None = None  # with its own origin of phase

    @classmethod
    def of(cls, shape: PulseShape | FreeShape, frequency: float, *, seed: int, count: int = _DRAWS) -> Samples:
        """Draw waves from the covariance of a shape."""
        rng = np.random.default_rng(seed)
        if isinstance(shape, FreeShape):
            waves = []
            for number in range(count + 1):
                noise = rng.standard_normal((2, shape.numbers.size)) * (number > 0)
                drawn = shape.amplitudes + shape.errors * (noise[0] + 1j * noise[1])
                waves.append(extremes(shape.numbers, drawn)[2][:: 4096 // _GRID])
            method = f"{shape.numbers.size} harmonics with the exposure undone"
            return cls(np.array(waves), np.full(count + 1, np.nan), method, shape.blind_bound)
        chosen = rng.choice(shape.duties.size, count, p=shape.chances) if count else np.empty(0, dtype=int)
        duties = np.r_[shape.duty, shape.duties[chosen]]
        drawn = _between(shape.shares[chosen], shape.share_errors[chosen], rng.random(count))
        drawn = np.where(rng.random(count) < shape.out[chosen], 1.0, drawn)
        shares = np.clip(np.r_[shape.share, drawn], 1e-6, 1.0)
        noise = rng.standard_normal(count)
        down, up = shape.decay_errors
        decays = np.r_[shape.decay, np.maximum(shape.decay + np.where(noise > 0, up, down) * noise, 0.0)]
        edges = np.arange(_GRID + 1) / _GRID
        waves = [
            np.diff(_pulse(frequency, d, b, t).integral(edges - shape.middle + d / 2)) * _GRID
            for d, b, t in zip(duties, shares, decays, strict=True)
        ]
        method = "rectangular pulse" + (" behind a slow emitter" if shape.decay else "") + ", exposure undone"
        pulse = _pulse(frequency, shape.duty, shape.share, shape.decay)
        return cls(np.array(waves), duties if not shape.decay else np.full(count + 1, np.nan), method, 0.0, pulse)

    @classmethod
    def mixed(cls, parts: list[Samples], shares: list[float]) -> Samples:
        """Add lights in shares of the mean."""
        weights = np.array(shares) / np.sum(shares)
        waves = np.tensordot(weights, np.stack([part.waves for part in parts]), axes=1)
        alike = all(part.pulse is not None and part.pulse.decay == 0 for part in parts)
        duties = np.mean([part.duties for part in parts], axis=0) if alike else np.full(len(waves), np.nan)
        bound = float(weights @ np.array([part.bound for part in parts]))
        return cls(np.asarray(waves), duties, "red, green and blue added", bound)

    def lines(self, most: int) -> tuple[FloatArray, ComplexArray, FloatArray]:
        """Numbers, amplitudes and standard errors of the harmonics, each of shape (k,)."""
        numbers = np.arange(1.0, most + 1)
        spectrum = scipy.fft.rfft(self.waves, axis=1)[:, 1 : most + 1] * (2 / _GRID)
        spectrum *= np.exp(-1j * np.pi * numbers / _GRID) / np.sinc(numbers / _GRID)  # cells hold means
        return numbers, spectrum[0], np.asarray(np.abs(spectrum[1:] - spectrum[0]).std(axis=0))


def _pulse(frequency: float, duty: float, share: float, decay: float) -> Pulse:
    return Pulse(frequency, float(duty), float(np.clip(low_level_of(duty, share), 0.0, 1.0)), float(decay))


def _between(means: FloatArray, errors: FloatArray, ranks: FloatArray) -> FloatArray:
    """Draws from normal distributions cut off at 0 and 1, by their ranks, each of shape (d,)."""
    from scipy.special import ndtr, ndtri

    low, high = ndtr(-means / errors), ndtr((1 - means) / errors)
    found = means + errors * ndtri(low + ranks * (high - low))
    return np.clip(np.where(np.isfinite(found), found, means), 0.0, 1.0)


def _percent(waves: FloatArray) -> FloatArray:
    high, low = waves.max(axis=1), waves.min(axis=1)
    return np.asarray(100 * (high - low) / np.maximum(high + low, 1e-12))


def _deeper(wave: FloatArray, bound: float) -> float:
    """By how much percent flicker grows if crest and trough lie further apart by a bound each."""
    high, low = float(wave.max()), float(wave.min())
    low_end = max(low - bound, 0.0)
    return 100 * ((high + bound - low_end) / (high + bound + low_end) - (high - low) / max(high + low, 1e-12))


def _looser(percent: FloatArray, exponent: float) -> FloatArray:
    """Percent flicker if the light were its own power of that exponent."""
    ratio = ((100 + percent) / np.maximum(100 - percent, 1e-6)) ** exponent
    return np.asarray(100 * (ratio - 1) / (ratio + 1))


def figures_of(
    drawn: Samples, frequency: float, dark_step: float, loose: float, alike: list[Samples]
) -> dict[str, Measure]:
    """
    Take the figures of a light with their intervals.

    Parameters
    ----------
    drawn : Samples
        The light.
    frequency : float
        [Hz]
    dark_step : float
        Standard uncertainty of the dark level over the mean.
    loose : float
        Relative uncertainty of the exponent of the transfer.
    alike : list of Samples
        Other lights that fit as well; the intervals reach to them.

    Returns
    -------
    dict
        Measures by name.
    """
    rng = np.random.default_rng(5)
    off = np.r_[0.0, np.clip(rng.standard_normal(len(drawn.waves) - 1), -2, 2) * dark_step][:, None]
    waves = np.maximum(drawn.waves + off, 0.0)
    waves /= waves.mean(axis=1, keepdims=True)
    others = np.concatenate([one.waves[:1] for one in alike]) if alike else waves[:0]

    def measure(unit: str, values: FloatArray, beside: FloatArray, top: float, widen: float = 0.0) -> Measure:
        low, high = np.quantile(values[1:], [0.025, 0.975])
        # where it is open whether the light goes out, neither answer is the one to give
        best = values[0] if abs(values[0] - values[1:].mean()) < 0.25 * values[1:].std() else values[1:].mean()
        values = np.r_[best, values[1:]]
        low, high = (float(np.min([low, values[0], *beside])), float(np.max([high, values[0], *beside])))
        low, high = max(low * (1 - loose) - widen, 0.0), min(high * (1 + loose) + widen, top)
        return Measure(float(min(values[0], top)), unit, min(low, float(values[0])), high, drawn.method)

    depth, beside = _percent(waves), _percent(others)
    if loose:
        beside = np.r_[beside, _looser(depth[:1], 1 - loose), _looser(depth[:1], 1 + loose)]
    index = np.maximum(waves - 1, 0).mean(axis=1)
    rms = 100 * waves.std(axis=1)
    numbers = np.arange(1, _GRID // 2)

    def svm(some: FloatArray) -> FloatArray:
        lines = np.abs(scipy.fft.rfft(some, axis=1)[:, 1 : _GRID // 2]) * (2 / _GRID)
        return np.array([stroboscopic_visibility(numbers * frequency, row) for row in lines])

    half = waves > 0.5 * (waves.max(axis=1) + waves.min(axis=1))[:, None]
    duties = np.where(np.isfinite(drawn.duties), drawn.duties, half.mean(axis=1))
    other_duties = np.array([one.duties[0] for one in alike if np.isfinite(one.duties[0])])
    bound = drawn.bound
    measures = {
        "percent_flicker": measure("%", depth, beside, 100.0, _deeper(waves[0], bound)),
        "flicker_index": measure("1", index, np.maximum(others - 1, 0).mean(axis=1), 1.0, bound),
        "rms_modulation": measure("%", rms, 100 * others.std(axis=1), np.inf, 100 * bound),
        "duty_cycle": measure("1", duties, other_duties, 1.0, bound),
        "svm": measure("1", svm(waves), svm(others), np.inf),
    }
    return measures | {name: Measure.missing("s", _EXPOSURE) for name in ("rise_time", "fall_time")}


def together(
    one: Samples, other: Samples, measures: dict[str, Measure], others: dict[str, Measure]
) -> dict[str, Measure]:
    """Figures of two lights that are not locked: they meet in every phase, so that swings add and squares add."""
    high = one.waves.max(axis=1) + other.waves.max(axis=1) - 1.0
    low = np.maximum(one.waves.min(axis=1) + other.waves.min(axis=1) - 1.0, 0.0)
    method = "two lights that meet in every phase"
    found = {"percent_flicker": _spread("%", 100 * (high - low) / (high + low), method)}
    squares = one.waves.var(axis=1) + other.waves.var(axis=1)
    found["rms_modulation"] = _spread("%", 100 * np.sqrt(squares), method)
    parts = [part["svm"] for part in (measures, others)]
    if all(part.value is not None for part in parts):
        value, low_end, high_end = (
            float(sum((end or 0.0) ** _SVM for end in ends) ** (1 / _SVM))
            for ends in zip(*((part.value, part.low, part.high) for part in parts), strict=True)
        )
        found["svm"] = Measure(value, "1", low_end, high_end, method)
    reason = "two lights that are not locked to each other have no cycle in common: film each alone"
    return found | {name: Measure.missing("1", reason) for name in ("flicker_index", "duty_cycle")}


def _spread(unit: str, values: FloatArray, method: str) -> Measure:
    low, high = np.quantile(values[1:], [0.025, 0.975])
    return Measure(float(values[0]), unit, float(min(low, values[0])), float(max(high, values[0])), method)
