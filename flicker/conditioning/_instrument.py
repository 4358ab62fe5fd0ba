"""What the instrument did to the readings: rails, coarse steps, drift."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from flicker.conditioning._shape import ENOUGH, with_unit
from flicker.results import DEPTH_MEASURES, Note
from flicker.trace import FloatArray, Trace

_SPREAD = 6  # values that readings on a plateau take where the noise moves the converter
_BLOCKS = 32  # of time, for the drift


def with_flat_tops(trace: Trace, full_scale: float | None) -> Trace:
    """Find readings that stand at a rail: at full scale, or in flat runs while all others move."""
    light = trace.light
    if light.size < 16 or any(note.code == "clipped" for note in trace.notes):
        return trace
    flat = 0
    for rail in (float(light.max()), float(light.min())):
        at_rail = light == rail
        count = int(np.count_nonzero(at_rail))
        if count < 3 or _longest_run(at_rail) < 3:
            continue
        if full_scale and abs(rail) >= 0.99 * full_scale:
            return trace.replace(note=_clipped_at_full_scale(count))
        alone = _others_move(light, at_rail) or _cut_flat(light, rail)
        if rail != (trace.dark_level or 0.0) and count > 1e-3 * light.size and alone:
            flat += count
    return trace.replace(note=_perhaps_clipped(flat, light.size)) if flat else trace


def _longest_run(flags: npt.NDArray[np.bool_]) -> int:
    edges = np.flatnonzero(np.diff(np.concatenate(([0], flags.astype(np.int8), [0]))))
    return int((edges[1::2] - edges[::2]).max()) if edges.size else 0


def _others_move(light: FloatArray, at_rail: npt.NDArray[np.bool_]) -> bool:
    """Whether hardly any two neighbours away from the rail are equal."""
    light, at_rail = light[:ENOUGH], at_rail[:ENOUGH]
    away = ~(at_rail[1:] | at_rail[:-1])
    still = int(np.count_nonzero(away & (light[1:] == light[:-1])))
    total = int(np.count_nonzero(away))
    return total > 16 and still < 0.02 * total


def _cut_flat(light: FloatArray, rail: float) -> bool:
    """Whether the half of the readings near the top rail are one value while those near the bottom spread over many."""
    light = light[:ENOUGH]
    low, high = float(light.min()), float(light.max())
    if rail != high or high <= low:
        return False
    bright, dark = light[light > 0.5 * (low + high)], light[light <= 0.5 * (low + high)]
    equal = float(np.mean(bright == rail))
    return equal > 0.95 and dark.size > 16 and np.unique(dark).size >= _SPREAD and float(np.mean(dark == low)) < 0.5


def _clipped_at_full_scale(count: int) -> Note:
    return Note(
        "clipped",
        "error",
        f"{count} samples stand at full scale: the recorder was overdriven and every depth is cut; record with less "
        "gain",
        voids=DEPTH_MEASURES,
    )


def _perhaps_clipped(count: int, samples: int) -> Note:
    return Note(
        "clipped",
        "warning",
        f"{count} of {samples} readings stand exactly at the largest or smallest value while all others move: the "
        "instrument was probably out of range and depths are cut; compare with a recording at less gain",
    )


def with_resolution(trace: Trace) -> Trace:
    """Say when the steps of the converter are coarse against the swing."""
    levels = np.unique(trace.light[:ENOUGH])
    if not 4 <= levels.size <= 64:
        return trace
    step = float(np.diff(levels).min())
    swing = float(levels[-1] - levels[0])
    rungs = (levels - levels[0]) / step
    if swing > 64 * step or np.abs(rungs - np.round(rungs)).max() > 0.05:
        return trace
    mean = abs(float(trace.above_dark.mean()))
    share = f", {100 * step / mean:.2g} % of the mean" if trace.mean_known and mean > step else ""
    return trace.replace(
        note=Note(
            "low-resolution",
            "warning",
            f"the whole swing spans {round(swing / step)} steps of the converter ({with_unit(step, trace)} "
            f"each{share}): a small depth may be steps rather than light; raise the gain",
        )
    )


def with_drift(trace: Trace) -> Trace:
    """
    Say how far the mean level moved, where that can be told from flicker.

    A parabola through means of 32 parts, each under a Hann window, must explain nearly all that they change.
    """
    length = trace.samples // _BLOCKS
    if length < 16 or len(trace.segments) > 1 or not trace.mean_known:
        return trace
    blocks = trace.above_dark[: _BLOCKS * length].reshape(_BLOCKS, length)
    window = np.hanning(2 * length + 2)[1:-1] / (length + 0.5)
    coarse = blocks[:-1] @ window[:length] + blocks[1:] @ window[length:]
    level = float(coarse.mean())
    if level <= 0:
        return trace
    place = np.linspace(-1.0, 1.0, _BLOCKS - 1)
    trend = np.polyval(np.polyfit(place, coarse, 2), place)
    moved = float(trend.max() - trend.min())
    if moved < 0.01 * level or float(np.var(coarse - trend)) > 0.1 * float(np.var(trend)):
        return trace
    way = "rose" if trend[-1] > trend[0] else "fell"
    return trace.replace(
        note=Note(
            "drift",
            "warning",
            f"the mean level {way} by {100 * moved / level:.1f} % over the capture, which is no part of the flicker "
            "figures: let the lamp warm up, and check the supply",
        )
    )
