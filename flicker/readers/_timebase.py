"""From a column of times to evenly sampled segments: order, step, gaps, rounding."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from flicker.errors import InputError
from flicker.results import Note
from flicker.trace import FloatArray, Segment

_BLOCK = 1 << 19
_SHORTEST = 16  # rows of a part that is worth measuring on its own
_SAME_RATE = 1e-3  # up to which a stated rate and the times may disagree and still mean the same
_ROUNDED_RATE = 0.02  # up to which rounding of the step is believed to explain a disagreement


@dataclass(slots=True)
class Evenly:
    """Readings at an even rate in segments, with what was found on the way."""

    readings: list[FloatArray]  # one a channel, each shape (n,)
    sample_rate: float  # [Hz]
    segments: tuple[Segment, ...]
    notes: list[Note] = field(default_factory=list)
    history: list[str] = field(default_factory=list)


def evenly(
    times: FloatArray, readings: list[FloatArray], stated_rate: float | None, *, trusted: bool = False
) -> Evenly:
    """
    Find the sample rate and the segments of readings taken at the given times.

    Parameters
    ----------
    times : ndarray
        As the file states them, shape (n,). [s]
    readings : list of ndarray
        Each of shape (n,).
    stated_rate : float, optional
        Sample rate stated apart from the times. [Hz]
    trusted : bool
        The stated rate was given by the user and stretches the times where they disagree.

    Returns
    -------
    Evenly
        Rows in order of time. Uneven times are interpolated; of parts whose times start anew only the longest is kept.

    Raises
    ------
    InputError
        If no order of the rows makes sense.
    """
    notes: list[Note] = []
    history: list[str] = []
    times, readings = _without_pairs(times, readings, notes)
    times, readings = _in_order(times, readings, notes)
    if len(times) < 2 or times[-1] <= times[0]:
        if stated_rate is None:
            raise InputError("the times of the rows do not advance; state --sample-rate")
        return Evenly(readings, stated_rate, (Segment(0, float(times[0])),), notes, history)
    resolution = _resolution(times)
    times, readings, step, first = _parts(times, readings, resolution, notes)
    if step <= 0:
        raise InputError("most rows share their time with others; export the times with more digits")
    deviation = max(_deviation(times[a:b], step) for a, b in _ranges(first, len(times)))
    if deviation > max(0.1 * step, 1.05 * resolution):
        return _resampled(times, readings, step, first, deviation, notes, history)
    spread = resolution / (2 * step)  # of steps that were rounded once and added up
    if deviation > 1e-6 * step:
        step = _fitted_step(times, first)
        spread = resolution / (times[-1] - times[0])
    if deviation > 0.05 * step:
        notes.append(_rounded(resolution, step))
    rate = tidy(1.0 / step)
    used = _chosen_rate(rate, stated_rate, spread, trusted, notes, history)
    stretch = rate / used
    origin = times[0]
    starts = [origin + (_start(times[a:b], step) - origin) * stretch for a, b in _ranges(first, len(times))]
    segments = tuple(Segment(int(a), float(start)) for a, start in zip(first, starts, strict=True))
    return Evenly(readings, used, segments, notes, history)


def _ranges(first: list[int], total: int) -> list[tuple[int, int]]:
    return list(zip(first, [*first[1:], total], strict=True))


# order


def _without_pairs(
    times: FloatArray, readings: list[FloatArray], notes: list[Note]
) -> tuple[FloatArray, list[FloatArray]]:
    """Take the mean of the smallest and the largest reading where each time stands twice."""
    even = len(times) // 2 * 2
    if even < 8 or times[0] != times[1] or times[1] == times[2]:
        return times, readings
    if not np.array_equal(times[0:even:2], times[1:even:2]) or not (np.diff(times[0:even:2]) > 0).all():
        return times, readings
    ordered = [(column[0:even:2] <= column[1:even:2]) for column in readings]
    if not all(
        flags.all() or not (flags & (column[0:even:2] != column[1:even:2])).any()
        for flags, column in zip(ordered, readings, strict=True)
    ):
        return times, readings
    notes.append(
        Note(
            "min-max-pairs",
            "warning",
            "each time stands twice, with the smallest and the largest reading (peak detection): their mean is "
            "measured, which flattens pulses shorter than the interval; record in sample mode",
        )
    )
    return times[0:even:2], [0.5 * (column[0:even:2] + column[1:even:2]) for column in readings]


def _in_order(times: FloatArray, readings: list[FloatArray], notes: list[Note]) -> tuple[FloatArray, list[FloatArray]]:
    """Bring the rows into the order of time, or keep the longest part where the times start anew."""
    steps = np.diff(times)
    if steps.size == 0 or steps.min() >= 0:
        return times, readings
    if np.count_nonzero(steps < 0) < 0.02 * steps.size + 1:
        times = _mended(times, steps, float(np.quantile(np.abs(steps), 0.5)))
    back = np.flatnonzero(np.diff(times) < 0)
    if not back.size:
        notes.append(
            Note("mended-times", "info", "single times that fall out of their row were put between their neighbours")
        )
        return times, readings
    order = np.argsort(times, kind="stable")
    sorted_steps = np.diff(times[order])
    reversed_order = sorted_steps.min() >= 0 and len(back) == len(times) - 1
    if sorted_steps.min() > 0.3 * np.quantile(sorted_steps, 0.5) or reversed_order:
        notes.append(Note("reordered", "info", "the rows were not in order of time and have been sorted by it"))
        return times[order], [column[order] for column in readings]
    bounds = [0, *(back + 1).tolist(), len(times)]
    lengths = np.diff(bounds)
    if len(lengths) > 4 and np.quantile(lengths, 0.5) < _SHORTEST:
        raise InputError(
            "the rows are in no order of time, and times repeat: several channels seem to be interleaved; "
            "export each channel as a column of its own"
        )
    return _longest(times, readings, bounds, "whose times start anew", notes)


def _mended(times: FloatArray, steps: FloatArray, typical: float) -> FloatArray:
    """Put single times that are out of line with two neighbours in line between them."""
    across = times[2:] - times[:-2]
    wrong = (np.abs(across - 2 * typical) < 0.6 * typical) & ((steps[:-1] < 0) | (steps[1:] < 0))
    index = np.flatnonzero(wrong) + 1
    if not index.size or index.size > len(times) // 20 + 1:
        return times
    times = times.copy()
    times[index] = 0.5 * (times[index - 1] + times[index + 1])
    return times


def longest_part(readings: list[FloatArray], breaks: list[int], notes: list[Note]) -> list[FloatArray]:
    """Keep the longest of several parts of which nobody knows when they were taken."""
    total = len(readings[0])
    _, readings = _longest(np.arange(float(total)), readings, [0, *breaks, total], "without times", notes)
    return readings


def _longest(
    times: FloatArray, readings: list[FloatArray], bounds: list[int], which: str, notes: list[Note]
) -> tuple[FloatArray, list[FloatArray]]:
    lengths = np.diff(bounds)
    part = int(np.argmax(lengths))
    rows = slice(bounds[part], bounds[part + 1])
    notes.append(
        Note(
            "segments",
            "warning",
            f"the file holds {len(lengths)} records {which}, so nobody knows how far apart they are: only record "
            f"{part + 1}, the longest ({lengths[part]} rows), is measured; export the records one by one for the "
            "others",
        )
    )
    return times[rows], [column[rows] for column in readings]


# step and gaps


def _resolution(times: FloatArray) -> float:
    """Place of the last decimal that the times use where they are large, 0 if there is none. [s]"""
    largest = max(abs(times[0]), abs(times[-1]))
    some = times[:: max(1, len(times) // 10_000)]
    some = np.append(some[np.abs(some) >= 10.0 ** np.floor(np.log10(largest))], times[-1])
    for decimals in range(16):
        scaled = some * 10.0**decimals
        doubt = np.abs(scaled).max() * 1e-15
        if doubt > 1e-2:
            break
        if np.abs(scaled - np.round(scaled)).max() <= doubt:
            return float(10.0**-decimals)
    return 0.0


def _parts(
    times: FloatArray, readings: list[FloatArray], resolution: float, notes: list[Note]
) -> tuple[FloatArray, list[FloatArray], float, list[int]]:
    """Find the step and split at gaps; parts of a single row are left out."""
    steps = np.diff(times)
    step = float(np.quantile(steps[:: max(1, steps.size // 100_000)], 0.5))
    if resolution > 0.3 * step:
        step = float((times[-1] - times[0]) / steps.size)
    gaps = np.zeros(0, dtype=int)
    for _ in range(4):
        found = np.flatnonzero(steps > 1.5 * step + 1.01 * resolution * (resolution > 0.1 * step))
        if found.size > steps.size // 50 + 1:  # not gaps but uneven times; those are interpolated
            found = np.flatnonzero(steps > 10 * step)
        inside = (steps.sum() - steps[found].sum()) / max(1, steps.size - found.size)
        if np.array_equal(found, gaps) and abs(inside - step) < 1e-9 * step:
            break
        gaps, step = found, float(inside)
    if not gaps.size:
        return times, readings, step, [0]
    return _split(times, readings, step, gaps, notes)


def _split(
    times: FloatArray, readings: list[FloatArray], step: float, gaps: np.ndarray, notes: list[Note]
) -> tuple[FloatArray, list[FloatArray], float, list[int]]:
    bounds = np.concatenate(([0], gaps + 1, [len(times)]))
    lengths = np.diff(bounds)
    widths = times[gaps + 1] - times[gaps] - step
    worth = lengths >= min(_SHORTEST, int(lengths.max()))
    kept = np.repeat(worth, lengths)
    first = np.concatenate(([0], np.cumsum(lengths[worth])[:-1])).tolist()
    lost = int(lengths[~worth].sum())
    left_out = f"; {lost} rows in parts of fewer than {_SHORTEST} were left out" if lost else ""
    if len(lengths) > 2 and (lengths[:-1] == lengths[0]).all() and lengths[0] >= _SHORTEST:
        notes.append(
            Note(
                "segments",
                "info",
                f"the file holds {len(lengths)} segments of {lengths[0]} rows; each is used at its own time, none is "
                f"joined{left_out}",
            )
        )
    else:
        notes.append(
            Note(
                "gap",
                "warning",
                f"{len(gaps)} gap{'s' * (len(gaps) > 1)} in the times, the longest {widths.max():.4g} s, the first "
                f"at {times[gaps[0]]:.6g} s: the parts are used at their own times, never joined{left_out}; record "
                "without interruption",
            )
        )
    if kept.all():
        return times, readings, step, first
    return times[kept], [column[kept] for column in readings], step, first


def _start(times: FloatArray, step: float) -> float:
    """Time of the first row, from all rows of a part. [s]"""
    some = slice(None, None, max(1, len(times) // 10_000))
    offsets = times[some] - step * np.arange(len(times))[some]
    spread = float(offsets.max() - offsets.min())
    return float(offsets.mean()) if spread > 1e-6 * step else float(times[0])


def _deviation(times: FloatArray, step: float) -> float:
    """Largest distance of the times from even ones. [s]"""
    lowest, highest = 0.0, 0.0
    for begin in range(0, len(times), _BLOCK):
        part = times[begin : begin + _BLOCK]
        off = part - times[0] - step * np.arange(begin, begin + len(part))
        lowest, highest = min(lowest, float(off.min())), max(highest, float(off.max()))
    return 0.5 * (highest - lowest)


def _fitted_step(times: FloatArray, first: list[int]) -> float:
    """Step by least squares over all parts. [s]"""
    moment = area = 0.0
    for begin, end in _ranges(first, len(times)):
        number = np.arange(end - begin) - 0.5 * (end - begin - 1)
        moment += float(np.dot(number, times[begin:end]))
        area += float(np.dot(number, number))
    return moment / area


def _rounded(resolution: float, step: float) -> Note:
    return Note(
        "rounded-time",
        "info",
        f"the times are rounded to {resolution:.3g} s, the samples are {step:.4g} s apart: they are taken as evenly "
        "spaced",
    )


def _resampled(
    times: FloatArray,
    readings: list[FloatArray],
    step: float,
    first: list[int],
    deviation: float,
    notes: list[Note],
    history: list[str],
) -> Evenly:
    """Interpolate readings of uneven times to even ones."""
    columns: list[list[FloatArray]] = [[] for _ in readings]
    segments, total = [], 0
    for begin, end in _ranges(first, len(times)):
        part = times[begin:end]
        count = int((part[-1] - part[0]) / step * (1 + 1e-9)) + 1
        even = part[0] + step * np.arange(count)
        segments.append(Segment(total, float(part[0])))
        total += count
        for column, values in zip(columns, readings, strict=True):
            column.append(np.interp(even, part, values[begin:end]))
    notes.append(
        Note(
            "uneven-time",
            "warning",
            f"the times are uneven, up to {deviation / step:.2g} sample intervals off even ones: readings were "
            "interpolated, which weakens fast flicker; record with a steady clock",
        )
    )
    history.append(f"interpolated to even times, {1 / step:.6g} Hz")
    return Evenly([np.concatenate(column) for column in columns], tidy(1 / step), tuple(segments), notes, history)


# rate


def tidy(rate: float) -> float:
    """Take off what binary fractions leave behind the twelfth digit. [Hz]"""
    return float(f"{rate:.12g}")


def _chosen_rate(
    rate: float, stated: float | None, spread: float, trusted: bool, notes: list[Note], history: list[str]
) -> float:
    """Choose between the rate of the times and a stated one; `spread` is what rounding may change of the former."""
    if stated is None:
        history.append(f"sample rate {rate:.8g} Hz from the time column")
        return rate
    off = abs(stated / rate - 1)
    if trusted:
        history.append(f"sample rate {stated:.8g} Hz as stated by --sample-rate")
        if off > _SAME_RATE:
            notes.append(_disagreeing(rate, stated, "--sample-rate"))
        return stated
    if off <= 1e-9:
        history.append(f"sample rate {stated:.8g} Hz from the head, and the time column agrees")
        return stated
    if off <= min(1.02 * spread, _ROUNDED_RATE):
        history.append(f"sample rate {stated:.8g} Hz from the head; the time column is rounded and gives {rate:.8g} Hz")
        if off > _SAME_RATE:
            notes.append(_disagreeing(rate, stated, "the head"))
        return stated
    if off <= _SAME_RATE:
        history.append(f"sample rate {rate:.8g} Hz from the time column; the head rounds it to {stated:.8g} Hz")
        return rate
    notes.append(_disagreeing(rate, stated, "the time column"))
    history.append(f"sample rate {rate:.8g} Hz from the time column, against {stated:.8g} Hz in the head")
    return rate


def _disagreeing(rate: float, stated: float, used: str) -> Note:
    where = "the head" if used == "the time column" else used
    return Note(
        "rate-disagrees",
        "warning",
        f"{where} states {stated:.6g} Hz, the time column {rate:.6g} Hz; {used} was believed: check which is right, "
        "for every frequency depends on it",
    )
