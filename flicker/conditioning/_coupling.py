"""AC coupling: the droop that it leaves on plateaus, and the mean level that it takes away."""

from __future__ import annotations

import numpy as np

from flicker.conditioning._shape import ENOUGH, Shape, smooth_mean, with_unit
from flicker.results import Note
from flicker.trace import FloatArray, Trace

_SPOTS = 24  # short windows a cycle in which the slope is looked at
_AGREEING = 0.6  # share of the windows that must agree on a corner
_LEAST_DROOP = 0.02  # in a cycle; less is not worth undoing
_MOST_DROOP = 2.0  # in a cycle; more leaves no plateau


def with_mean(trace: Trace, mean: float) -> Trace:
    """Shift the readings so that their mean above dark is the stated one."""
    shape = Shape.of(trace)
    by = mean - smooth_mean(trace.light)
    light, whole = trace.light + by, trace.whole.shifted(by) if trace.whole else None
    note = None
    if not shape.about_zero:
        note = Note(
            "mean-replaced",
            "warning",
            f"the capture seems to hold its mean level ({with_unit(shape.mean, trace)} above dark), but --mean "
            f"{mean:g} was put in its place: leave --mean out unless the coupling lost the mean",
        )
    notes = tuple(one for one in trace.notes if one.code != "ac-coupled") + ((note,) if note else ())
    done = f"mean level above dark set to {with_unit(mean, trace)}, as stated by --mean"
    return trace.replace(light=light, whole=whole, dark_level=0.0, mean_known=True, notes=notes, done=done)


def without_droop(trace: Trace, corner: float, *, fitted: bool) -> Trace:
    r"""
    Undo a first-order AC coupling with the given corner [Hz].

    Notes
    -----
    The coupling makes :math:`y' = x' - \omega y` of the light :math:`x`; hence :math:`x = y + \omega \int y`, up to
    the lost mean (by hand). What offset the recorder adds would grow into a slope, so that the straight line of the
    result is taken off: a steady flicker has none.
    """
    light = np.empty(trace.samples)
    for here, after in zip(trace.segments, (*trace.segments[1:], None), strict=True):
        part = slice(here.first, after.first if after else None)
        coupled = trace.light[part] - smooth_mean(trace.light[part])
        restored = coupled + 2 * np.pi * corner / trace.sample_rate * (np.cumsum(coupled) - 0.5 * coupled)
        light[part] = _without_line(restored)
    source = "fitted to the plateaus" if fitted else "as stated"
    return trace.replace(
        light=light, whole=None, done=f"droop of a first-order AC coupling at {corner:.3g} Hz undone ({source})"
    )


def _without_line(light: FloatArray) -> FloatArray:
    """Take off the straight line that fits under a Hann window."""
    weights = np.hanning(light.size + 2)[1:-1]
    place = np.linspace(-1.0, 1.0, light.size)
    level = np.dot(weights, light) / weights.sum()
    spread = np.dot(weights, place * place)
    slope = np.dot(weights, place * (light - level)) / spread if light.size > 16 and spread > 0 else 0.0
    return np.asarray(light - level - slope * place)


def fitted_corner(trace: Trace) -> float | None:
    r"""
    Find the corner of an AC coupling from the plateaus of a pulsed light; None where they do not tell. [Hz]

    Notes
    -----
    On a plateau :math:`x' = 0`, so that slope over reading is :math:`-\omega` wherever the plateau lies. In short
    windows along the capture the ratio is taken, and its median (weighted by the reading) counts if most windows agree
    with it up to noise, of the readings above zero as of those below. A sine, a ramp or a decaying emitter has no such
    common ratio.
    """
    light = trace.light[: min(ENOUGH, trace.segments[1].first if len(trace.segments) > 1 else ENOUGH)]
    light = light - smooth_mean(light)
    power = np.abs(np.fft.rfft(light * np.hanning(light.size)))
    period = light.size / max(1, int(np.argmax(power)))
    length = int(period / _SPOTS)
    if length < 4 or light.size < 3 * period:
        return None
    windows = light[: light.size // length * length].reshape(-1, length)
    place = np.arange(length) - 0.5 * (length - 1)
    slopes = windows @ place / np.dot(place, place) * trace.sample_rate
    levels = windows.mean(axis=1)
    noise = np.sqrt(12 / length**3) * trace.sample_rate * Shape.of(trace).noise
    rates = [_common_rate(slopes[side], levels[side], noise) for side in (levels > 0, levels < 0)]
    if None in rates:
        return None
    above, below = (float(rate) for rate in rates if rate is not None)
    rate = 0.5 * (above + below)
    droop = rate * period / trace.sample_rate
    if abs(above - below) > 0.3 * rate or not _LEAST_DROOP <= droop <= _MOST_DROOP:
        return None
    return rate / (2 * np.pi)


def _common_rate(slopes: FloatArray, levels: FloatArray, noise: float) -> float | None:
    """Ratio of slope to reading, negated, on which most windows of one sign agree; None if there is none. [1/s]"""
    clear = np.abs(levels) > 0.3 * np.abs(levels).max(initial=0.0)
    if not clear.any():
        return None
    slopes, levels = slopes[clear], levels[clear]
    rates, weights = -slopes / levels, np.abs(levels)
    order = np.argsort(rates)
    share = np.cumsum(weights[order]) / weights.sum()
    middle = float(rates[order][np.searchsorted(share, 0.5)])
    near = np.abs(rates - middle) < 0.25 * abs(middle) + 3 * noise / weights
    rate = -float(np.dot(slopes[near], levels[near]) / np.dot(levels[near], levels[near])) if near.any() else 0.0
    if weights[near].sum() < _AGREEING * weights.sum() or rate < 5 * noise / np.sqrt(
        np.dot(levels[near], levels[near])
    ):
        return None
    return rate
