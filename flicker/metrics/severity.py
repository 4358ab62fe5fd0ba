"""Flicker that the eye sees: short-term severity of light."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from flicker.errors import NotMeasurable
from flicker.metrics import Observation, metric
from flicker.results import Measure
from flicker.signal import severity
from flicker.signal.intervals import student_quantile
from flicker.trace import FloatArray, Trace

_WINDOW = 180.0  # [s]
_ALMOST = 0.999  # a rate read from time stamps may miss the window by so much
_SETTLING = 20.0  # dropped where the capture is long enough [s]
_Floats = npt.NDArray[np.floating]
_SLOWEST = 1000.0  # [Hz]
_BLOCKS = 12  # of a window, for its spread
_QUIET = (45.0, 95.0)  # where the noise is read, beside the lines of the mains [Hz]
_NOISE_SHAPE = 1.175  # computed: severity of the sensation that noise gives, over that of a steady one with its mean


@metric(unit="1", source="IEC TR 61547-1 and IEC 61000-4-15:2010 (constants from memory)", order=90)
def pst_lm(trace: Trace, observation: Observation) -> Measure:
    r"""
    Short-term severity of the flicker, from light: Pst LM.

    Parameters
    ----------
    trace : Trace
        At least 180 s without a gap, sampled at 1 kHz or faster.
    observation : Observation
        Of that trace.

    Returns
    -------
    Measure
        1 where the average observer sees the flicker half of the time, with its 95 % interval; of a capture of
        several windows of 180 s the largest. [1]

    Raises
    ------
    NotMeasurable
        If the trace is too short or too slow, or its mean level is lost.

    Notes
    -----
    The chain of `flicker.signal.severity`: decimation behind a real filter, deviation from the mean, high-pass 0.05
    Hz, low-pass 35 Hz, weighting of eye and brain, squaring, smoothing, percentiles. Of a capture longer than 180 s
    up to 20 s are dropped at its start, where a lamp warms up.

    Everything that moves between 0.3 and 80 Hz counts: a hand before the sensor, a lamp that warms up, a voltage that
    sags. Noise of the sensor counts as well; what it alone would read stands in the method and is taken off the lower
    end of the interval (two lights together never read more than the sum of what each reads). Light that was sampled
    without a filter against aliases may show a beat that is not there.
    """
    light, begin, sampled = _one_run(trace)
    light, rate = severity.decimated(np.subtract(light, trace.dark_level or 0.0, dtype=light.dtype), sampled)
    mean = float(light.mean())
    if not mean > 0:
        level = f"{observation.level:g}"
        raise NotMeasurable(f"the mean level is not above dark over the longest stretch, but {level} over all of it")
    noise = _noise_of(light, mean, rate)
    windows = _windows(light.size, rate)
    series = [severity.severity_of(_sensation(light, mean, rate, *window)) for window in windows]
    value = max(series)
    first, last = windows[series.index(value)]
    worst = _half_width(_sensation(light, mean, rate, first, last))
    half = math.hypot(worst, 1.96 * value * observation.dark_uncertainty / mean)
    low = max(value - half - noise, 0.0)
    method = f"IEC TR 61547-1, {(last - first) / rate:.0f} s at {rate:.0f} Hz; noise alone would read {noise:.2g}"
    if len(series) > 1:
        method += f"; largest of {len(series)} windows: {', '.join(f'{one:.3g}' for one in series)}"
    along = tuple((begin + start / rate, one) for (start, _), one in zip(windows, series, strict=True))
    return Measure(value, "1", low, value + half, method, series=along if len(along) > 1 else ())


def _one_run(trace: Trace) -> tuple[_Floats, float, float]:
    """Give the longest stretch without a gap, its start [s] and its sample rate [Hz], if it can carry the measure."""
    if trace.whole is not None and trace.whole.duration >= _ALMOST * _WINDOW:
        return trace.whole.light, trace.whole.start, trace.whole.sample_rate
    if trace.sample_rate < _SLOWEST:
        raise NotMeasurable(
            f"light up to 80 Hz counts and nothing may fold back into it, and the rate is {trace.sample_rate:.6g} Hz: "
            "record at 1 kHz or faster, better at 20 kHz"
        )
    edges = [*(segment.first for segment in trace.segments), trace.samples]
    first, last = max(pairwise(edges), key=lambda pair: pair[1] - pair[0])
    seconds = (last - first) / trace.sample_rate
    if seconds < _ALMOST * _WINDOW:
        without = " without a gap" if len(trace.segments) > 1 else ""
        raise NotMeasurable(f"at least 180 s{without} are needed, and the capture has {seconds:.3g} s: record longer")
    begin = next(segment.start for segment in trace.segments if segment.first == first)
    return trace.light[first:last], begin, trace.sample_rate


def _noise_of(light: _Floats, mean: float, rate: float) -> float:
    """Severity that the noise alone would read."""
    heard = light[: round(_WINDOW * rate)] / mean - 1.0
    window = np.hanning(heard.size)
    power = np.abs(np.fft.rfft(heard * window)) ** 2 / float(np.sum(window**2))
    quiet = slice(*(int(edge * heard.size / rate) for edge in _QUIET))
    variance = float(np.median(power[quiet])) / math.log(2.0)
    return _NOISE_SHAPE * math.sqrt(0.5096 * variance * severity.noise_reading(rate))


def _sensation(light: _Floats, mean: float, rate: float, first: int, last: int) -> FloatArray:
    """Sensation in one window, with the light before it for the filters to settle on."""
    begin = max(first - round(_SETTLING * rate), 0)
    over_mean = np.divide(light[begin:last], mean, dtype=np.float64)
    return severity.weighted_sensation(over_mean, rate)[first - begin :]


def _windows(samples: int, rate: float) -> list[tuple[int, int]]:
    """Windows of 180 s, evenly spread over all that is left after settling."""
    size = min(round(_WINDOW * rate), samples)
    first = min(round(_SETTLING * rate), samples - size)
    count = max(1, math.ceil((samples - first - 0.01 * size) / size))
    starts = np.rint(np.linspace(first, samples - size, count) if count > 1 else [samples - size]).astype(int)
    return [(start, start + size) for start in starts.tolist()]


def _half_width(felt: FloatArray) -> float:
    """Half of the 95 % interval: each of twelve stretches is left out once (jackknife, Tukey 1958)."""
    edges = np.linspace(0, felt.size, _BLOCKS + 1).astype(int)
    left = [severity.severity_of(np.delete(felt, slice(a, b))) for a, b in pairwise(edges.tolist())]
    spread = (_BLOCKS - 1) / _BLOCKS * float(np.sum((np.array(left) - np.mean(left)) ** 2))
    return student_quantile(_BLOCKS - 1) * math.sqrt(spread)
