"""Follow the phase of a light whose frequency wanders: RC oscillators, spread spectrum, mains."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from flicker.signal.harmonics import HarmonicFit, Series
from flicker.signal.track import Track
from flicker.trace import FloatArray

_BLOCK = 2.0  # cycles in which the phase is taken as steady, at the least
_PER_CYCLE = 64.0  # samples that are enough to follow a phase
_SAMPLES = 100  # in a block, at the least
_STEP = 0.7  # of the distance of samples in phase over a block, by which edges seem to move
_FEWEST = 12  # blocks
_UNSURE = 0.06  # cycles of noise in a block, above which blocks are made longer
_MOVED = 0.004  # cycles: what moves less does not blur the mean cycle
UNSEEN = 2 * np.pi * 2**0.5 * _MOVED / (4 * _BLOCK)  # wander, over the frequency, that may stay unseen
_SMOOTH = 1.4  # times that the phase must move further than it jumps from block to block
_SWELLING = 0.2  # of the phase that moves: a line that swells more has another beside it
_TABLE = 1 << 13
_WINDOWS = (17, 9, 5, 3)  # blocks over which a track may be smoothed


@dataclass(frozen=True, slots=True, eq=False)
class _Blocks:
    """Sums over blocks of time that hold enough samples."""

    times: FloatArray  # mean time of the samples, shape (j,) [s]
    sums: tuple[FloatArray, ...]
    counts: FloatArray


def follow(series: Series, frequency: float) -> tuple[float, Track] | None:
    """
    Follow the phase of one line.

    Parameters
    ----------
    series : Series
        The signal.
    frequency : float
        Near the middle of where the line wanders, to within an eighth of it. [Hz]

    Returns
    -------
    (float, Track) or None
        The mean frequency [Hz] and the phase against it; None where the phase moves no further than its noise, or
        where the line swells and fades as far as it moves: then there are two lines.

    Notes
    -----
    Complex demodulation (Bingham, Godfrey and Tukey, IEEE Trans. Audio Electroacoust. 15 (1967) 56) in blocks of whole
    cycles, made longer until the noise in one is small. The noise of the phase is read from its fourth differences.
    """
    series = series.coarser(_PER_CYCLE * frequency)
    cycles = max(_BLOCK, _SAMPLES * frequency / series.sample_rate)
    while True:
        blocks = _line_by_block(series, frequency, cycles / frequency)
        if blocks.times.size < _FEWEST:
            return None
        line = (blocks.sums[0] - 1j * blocks.sums[1]) / blocks.counts
        phase = np.unwrap(np.angle(line)) / (2 * np.pi)
        noise = _noise(phase)
        if noise < _UNSURE:
            break
        cycles *= 2
    slope, start = np.polyfit(blocks.times - blocks.times[0], phase, 1)
    left = phase - slope * (blocks.times - blocks.times[0]) - start
    moved = float(np.std(left))
    if moved < max(_MOVED, _SMOOTH * noise, _STEP / float(np.quantile(blocks.counts, 0.5))):
        return None
    height = np.abs(line)
    swelling = float(np.std(height) / np.mean(height))
    if max(swelling**2 - (2 * np.pi * noise) ** 2, 0.0) > (_SWELLING * 2 * np.pi * moved) ** 2:
        return None
    return frequency + float(slope), _smoothed(Track(blocks.times, left, noise))


def refine(series: Series, fit: HarmonicFit, harmonics: int) -> Track | None:
    """
    Read a track once more, with several harmonics of the light as the ruler.

    Parameters
    ----------
    series : Series
        The signal, other families taken off.
    fit : HarmonicFit
        With the track that is to be refined.
    harmonics : int
        So many at the most: few reach far, many are sharp.

    Returns
    -------
    Track or None
        None where the fit has no track.

    Notes
    -----
    In each block one step of least squares on the phase: the deviations from the mean cycle against its slope.
    """
    if fit.track is None:
        return None
    table = replace(fit, amplitudes=fit.amplitudes[:harmonics]).table(_TABLE)
    slope = 0.5 * _TABLE * (np.roll(table, -1) - np.roll(table, 1))
    length = float(np.quantile(np.diff(fit.track.times), 0.5))

    def weigh(times: FloatArray, values: FloatArray) -> tuple[FloatArray, ...]:
        phase = (times - fit.centre) * fit.frequency + fit.track.at(times) if fit.track else times
        index = np.minimum(((phase - np.floor(phase)) * _TABLE).astype(np.intp), _TABLE - 1)
        along = slope[index]
        return along * (values - table[index]), along * along

    blocks = _by_block(series, length, weigh)
    if blocks.times.size < _FEWEST:
        return fit.track
    ahead = fit.track.at(blocks.times) + blocks.sums[0] / np.maximum(blocks.sums[1], 1e-300)
    ahead -= np.polyval(np.polyfit(blocks.times - blocks.times[0], ahead, 1), blocks.times - blocks.times[0])
    return _smoothed(Track(blocks.times, ahead, _noise(ahead)))


def _noise(phase: FloatArray) -> float:
    """Standard deviation of white noise that would make the fourth differences of a phase. [cycles]"""
    return float(np.sqrt(np.mean(np.diff(phase, 4) ** 2) / 70))


def _smoothed(track: Track) -> Track:
    """Average a track over as many blocks as leave nothing but noise between it and its blocks."""
    for window in _WINDOWS:
        if window * 4 > track.cycles.size:
            continue
        number = np.convolve(np.ones(track.cycles.size), np.ones(window), "same")
        smooth = np.convolve(track.cycles, np.ones(window), "same") / number
        inner = slice(window // 2, -(window // 2))
        if float(np.std((track.cycles - smooth)[inner])) < 1.05 * track.error:
            ends = np.r_[: window // 2, track.cycles.size - window // 2 : track.cycles.size]
            smooth[ends] = track.cycles[ends]
            return Track(track.times, smooth, track.error / np.sqrt(window))
    return track


def _line_by_block(series: Series, frequency: float, length: float) -> _Blocks:
    mean = float(series.values.mean())

    def weigh(times: FloatArray, values: FloatArray) -> tuple[FloatArray, ...]:
        turns = 2 * np.pi * ((times * frequency) % 1.0)
        return (values - mean) * np.cos(turns), (values - mean) * np.sin(turns)

    return _by_block(series, length, weigh)


_Weigh = Callable[[FloatArray, FloatArray], tuple[FloatArray, ...]]


def _by_block(series: Series, length: float, weigh: _Weigh) -> _Blocks:
    """Sum weights, which are made from times and values, block of time by block."""
    begin = series.segments[0].start
    total = int(series.span / length) + 1
    rows = np.zeros((4, total))
    for part, times in series.chunks():
        times = times + series.centre
        block = np.minimum(((times - begin) / length).astype(np.intp), total - 1)
        for row, weights in zip(rows, (None, times, *weigh(times, series.values[part])), strict=True):
            row += np.bincount(block, weights, minlength=total)
    counts, when, *sums = rows
    kept = counts > 0.5 * float(np.quantile(counts[counts > 0], 0.5))
    counts = counts[kept]
    return _Blocks(when[kept] / counts, tuple(row[kept] for row in sums), counts)
