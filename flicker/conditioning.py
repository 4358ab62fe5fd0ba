"""What stands between a recording and its light: dark level, sign, coupling, a part of it, and the doubts."""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass

import numpy as np

from flicker.errors import InputError
from flicker.results import DEPTH_MEASURES, Note
from flicker.trace import Capture, FloatArray, Segment, Trace

_ENOUGH = 1 << 17  # samples that settle a statistic


def condition(
    capture: Capture,
    *,
    dark_level: float | None = None,
    dark_capture: Capture | None = None,
    mean: float | None = None,
    dc_coupled: bool = False,
    inverted: bool = False,
    start: float | None = None,
    duration: float | None = None,
    coupling_corner: float | None = None,
) -> Capture:
    """
    Turn what was recorded into light above dark, and say every doubt about it.

    Parameters
    ----------
    capture : Capture
        What was recorded.
    dark_level : float, optional
        Reading with the light blocked, in the capture's unit and sense. Without it and without
        `dark_capture` zero is taken, and the note `dark-assumed` says so.
    dark_capture : Capture, optional
        Recording with the light blocked; the mean of the channel of the same name (or of its only channel)
        is the dark level.
    mean : float, optional
        True mean light level above dark, for a capture that lost it. [capture's unit]
    dc_coupled : bool
        The sound file really holds the mean level.
    inverted : bool
        More light reads lower.
    start, duration : float, optional
        Part to use, on the capture's own time axis; all of it if not given. [s]
    coupling_corner : float, optional
        First-order corner of the AC coupling, whose droop is to be undone. [Hz]

    Returns
    -------
    Capture
        The traces with `dark_level` and `mean_known` set, notes and history added. Readings are changed only by
        `inverted` (negated), `mean` (shifted) and `coupling_corner` (droop undone).

    Raises
    ------
    InputError
        If options contradict each other or the capture.
    """
    if dark_level is not None and dark_capture is not None:
        raise InputError("the dark level is stated twice; give --dark-level or --dark-capture")
    if dark_level is not None and not math.isfinite(dark_level):
        raise InputError(f"the dark level must be a number, not {dark_level}")
    if mean is not None and not (math.isfinite(mean) and mean > 0):
        raise InputError(f"the mean light level must be above 0, not {mean}")
    if coupling_corner is not None and not (math.isfinite(coupling_corner) and coupling_corner > 0):
        raise InputError(f"the corner of the coupling must be above 0 Hz, not {coupling_corner}")
    traces = []
    for trace in capture.traces:
        trace = _part(trace, start, duration)
        dark = _dark_of(dark_capture, trace, capture) if dark_capture else dark_level
        if dark is not None:
            trace = trace.replace(dark_level=dark, done=f"dark level {dark:.6g} {trace.unit}".rstrip())
        if inverted:
            trace = _negated(trace)
        if coupling_corner is not None:
            trace = _without_droop(trace, coupling_corner)
        trace = _with_flat_tops(trace, full_scale=1.0 if capture.kind == "wav" else None)
        trace = _judged(trace, capture.kind, mean, dc_coupled, inverted)
        traces.append(_with_drift(_with_resolution(trace)))
    return dataclasses.replace(capture, traces=tuple(traces))


def _with_unit(value: float, trace: Trace) -> str:
    return f"{value:.4g} {trace.unit}".rstrip()


# a part of the capture


def _part(trace: Trace, start: float | None, duration: float | None) -> Trace:
    """Keep the samples from `start` on for `duration`, by their true times."""
    if start is None and duration is None:
        return trace
    if duration is not None and not duration > 0:
        raise InputError(f"the duration must be above 0 s, not {duration}")
    begin = trace.start if start is None else start
    end = math.inf if duration is None else begin + duration
    half = 0.5 / trace.sample_rate
    pieces, segments, kept = [], [], 0
    for here, after in zip(trace.segments, (*trace.segments[1:], None), strict=True):
        light = trace.light[here.first : after.first if after else None]
        first = max(0, math.ceil((begin - here.start - half) * trace.sample_rate))
        last = len(light)
        if math.isfinite(end):
            last = min(last, math.ceil((end - here.start - half) * trace.sample_rate))
        if first < last:
            pieces.append(light[first:last])
            segments.append(Segment(kept, here.start + first / trace.sample_rate))
            kept += last - first
    if not pieces:
        last_start = trace.segments[-1]
        finish = last_start.start + (trace.samples - last_start.first) / trace.sample_rate
        raise InputError(
            f"no sample lies in the part asked for; the capture runs from {trace.start:.6g} s to {finish:.6g} s: "
            "check --start and --duration"
        )
    light = pieces[0] if len(pieces) == 1 else np.concatenate(pieces)
    done = f"used {kept} of {trace.samples} samples, from {segments[0].start:.6g} s on"
    return trace.replace(light=light, segments=tuple(segments), done=done)


# dark level and sign


def _dark_of(dark: Capture, trace: Trace, capture: Capture) -> float:
    """Mean reading of the dark capture's channel that belongs to this trace."""
    same = [one for one in dark.traces if one.name == trace.name]
    if not same and len(dark.traces) == 1:
        same = list(dark.traces)
    if not same and len(dark.traces) == len(capture.traces):
        same = [dark.traces[capture.traces.index(trace)]] if trace in capture.traces else []
    if not same:
        names = ", ".join(one.name for one in dark.traces)
        raise InputError(f"the dark capture has no channel '{trace.name}', only {names}; record it the same way")
    if same[0].unit and trace.unit and same[0].unit != trace.unit:
        raise InputError(
            f"the dark capture is in {same[0].unit}, the capture in {trace.unit}; record both the same way"
        )
    return float(same[0].light.mean())


def _negated(trace: Trace) -> Trace:
    dark = None if trace.dark_level is None else -trace.dark_level
    return trace.replace(light=-trace.light, dark_level=dark, done="negated, as more light reads lower")


# coupling


def _smooth_mean(light: FloatArray) -> float:
    """Mean under a Hann window, which hardly depends on where in its cycle the record begins and ends."""
    weights = np.hanning(light.size + 2)[1:-1]
    return float(np.dot(light, weights) / weights.sum())


def _without_droop(trace: Trace, corner: float) -> Trace:
    r"""
    Undo a first-order AC coupling.

    Notes
    -----
    The coupling makes :math:`y' = x' - \omega y` of the light :math:`x`; hence :math:`x = y + \omega \int y`, up to the
    lost mean. What offset the recorder adds would grow into a slope, so the mean of y is taken off first.
    """
    light = np.empty(trace.samples)
    for here, after in zip(trace.segments, (*trace.segments[1:], None), strict=True):
        part = slice(here.first, after.first if after else None)
        coupled = trace.light[part] - _smooth_mean(trace.light[part])
        area = np.cumsum(coupled)
        area -= 0.5 * coupled
        restored = coupled + 2 * np.pi * corner / trace.sample_rate * area
        light[part] = restored - _smooth_mean(restored)
    return trace.replace(light=light, done=f"droop of a first-order AC coupling at {corner:g} Hz undone")


# what the readings look like


@dataclass(frozen=True, slots=True)
class _Shape:
    """Level, robust extremes and noise of the readings above dark."""

    mean: float
    low: float
    high: float
    noise: float

    @classmethod
    def of(cls, trace: Trace) -> _Shape:
        light = trace.above_dark
        some = light[:: max(1, light.size // _ENOUGH)]
        low, high = np.quantile(some, [0.005, 0.995])
        steps = np.diff(light[:_ENOUGH])
        noise = 0.0 if steps.size == 0 else float(np.median(np.abs(steps))) / (0.6745 * math.sqrt(2))
        return cls(_smooth_mean(light), float(low), float(high), noise)

    @property
    def about_zero(self) -> bool:
        """Whether the readings go both ways and their mean is near zero, as behind a capacitor."""
        return self.low < 0 < self.high and abs(self.mean) < 0.3 * min(-self.low, self.high)

    @property
    def below_dark(self) -> bool:
        """Whether readings lie below dark by more than noise and a small offset explain."""
        return self.low < -(5 * self.noise + 0.02 * max(abs(self.mean), 0.05 * self.high))


def _judged(trace: Trace, kind: str, mean: float | None, dc_coupled: bool, inverted: bool) -> Trace:
    """Decide whether the mean level is known, and what to say about level and sign."""
    shape = _Shape.of(trace)
    if mean is not None:
        return _with_mean(trace, shape, mean)
    if not dc_coupled and (shape.about_zero or (kind == "wav" and shape.mean > 0 and shape.below_dark)):
        return trace.replace(mean_known=False, note=_ac_coupled(trace, kind))
    if shape.mean <= 0 or (shape.below_dark and -shape.low > shape.high):
        return trace.replace(note=_not_above_dark(trace, shape, inverted))
    if shape.below_dark:
        return trace.replace(note=_partly_below_dark(trace, shape))
    if kind == "wav" and not dc_coupled:
        trace = trace.replace(note=_coupling_assumed())
    return trace if trace.dark_level is not None else trace.replace(note=_dark_assumed(trace, shape))


def _with_mean(trace: Trace, shape: _Shape, mean: float) -> Trace:
    light = trace.light - (_smooth_mean(trace.light) - mean)
    note = None
    if not shape.about_zero:
        note = Note(
            "mean-replaced",
            "warning",
            f"the capture seems to hold its mean level ({_with_unit(shape.mean, trace)} above dark), "
            f"but --mean {mean:g} was put in its place: leave --mean out unless the coupling lost the mean",
        )
    done = f"mean level above dark set to {_with_unit(mean, trace)}, as stated"
    return trace.replace(light=light, dark_level=0.0, mean_known=True, note=note, done=done)


def _ac_coupled(trace: Trace, kind: str) -> Note:
    cure = "record DC-coupled, or state the true mean level with --mean"
    if kind == "wav":
        cure += ", or --dc-coupled if zero in this file really is dark"
    return Note(
        "ac-coupled",
        "warning",
        "the readings swing both ways about zero, so AC coupling has lost the mean level: frequency, duty cycle and "
        f"shape can be told, no depth; {cure}",
        voids=DEPTH_MEASURES,
    )


def _coupling_assumed() -> Note:
    return Note(
        "coupling-assumed",
        "warning",
        "the sound file never crosses zero and is believed to hold the mean level; if its recorder is AC-coupled, every "
        "depth is wrong: state --dc-coupled to confirm, or --mean",
    )


def _not_above_dark(trace: Trace, shape: _Shape, inverted: bool) -> Note:
    level = f"the mean reading is {_with_unit(shape.mean, trace)}"
    if inverted:
        message = f"after --inverted {level}, not above dark: leave --inverted out, or check --dark-level"
    elif trace.dark_level:
        message = f"{level} from the dark level {_with_unit(trace.dark_level, trace)}, not above it: check --dark-level, or state --inverted"
    else:
        message = f"{level}, below zero: if more light reads lower, as behind an inverting amplifier, state --inverted; else state --dark-level"
    return Note("negative-light", "error", message, voids=DEPTH_MEASURES)


def _partly_below_dark(trace: Trace, shape: _Shape) -> Note:
    dark = _with_unit(trace.dark_level or 0.0, trace)
    return Note(
        "negative-light",
        "error",
        f"readings fall {_with_unit(-shape.low, trace)} below the dark level {dark}, which light cannot: measure the dark reading and "
        "state it with --dark-level, or --mean if the capture is AC-coupled",
        voids=DEPTH_MEASURES,
    )


def _dark_assumed(trace: Trace, shape: _Shape) -> Note:
    """Say what a dark level of 1 % of the mean would change."""
    one_percent = 0.01 * shape.mean
    low, high = max(shape.low, 0.0), shape.high
    swing = 100 * (high - low) / (high + low) if high > low else 0.0
    corrected = 100 * (high - low) / (high + low - 2 * one_percent) if high > low else 0.0
    return Note(
        "dark-assumed",
        "info",
        f"no dark level was stated, zero is taken as dark; a dark level of 1 % of the mean ({_with_unit(one_percent, trace)}) "
        f"would turn a depth of {swing:.1f} % into {min(corrected, 100.0):.1f} %: measure it with the light blocked and state --dark-level",
    )


# limits of the instrument


def _longest_run(flags: np.ndarray) -> int:
    edges = np.flatnonzero(np.diff(np.concatenate(([0], flags.astype(np.int8), [0]))))
    return int((edges[1::2] - edges[::2]).max()) if edges.size else 0


def _with_flat_tops(trace: Trace, full_scale: float | None) -> Trace:
    """Find readings that stand at a rail: at full scale, or in flat runs that the noise elsewhere does not explain."""
    light = trace.light
    if light.size < 16:
        return trace
    flat = 0
    for rail in (float(light.max()), float(light.min())):
        at_rail = light == rail
        count = int(np.count_nonzero(at_rail))
        if count < 3 or _longest_run(at_rail) < 3:
            continue
        if full_scale and abs(rail) >= 0.99 * full_scale:
            return trace.replace(note=_clipped_at_full_scale(count))
        if rail != (trace.dark_level or 0.0):
            still = np.diff(light[:_ENOUGH]) == 0
            inside = ~(at_rail[:_ENOUGH][1:] | at_rail[:_ENOUGH][:-1])
            moving = int(np.count_nonzero(inside))
            if (
                count < 0.9 * light.size
                and moving > 16
                and np.count_nonzero(still & inside) < 0.02 * moving
                and count > 0.001 * light.size
            ):
                flat += count
    return trace.replace(note=_perhaps_clipped(flat, light.size)) if flat else trace


def _clipped_at_full_scale(count: int) -> Note:
    return Note(
        "clipped",
        "error",
        f"{count} samples stand at full scale: the recorder was overdriven and every depth is cut; record again with less gain",
        voids=DEPTH_MEASURES,
    )


def _perhaps_clipped(count: int, samples: int) -> Note:
    return Note(
        "clipped",
        "warning",
        f"{count} of {samples} readings stand exactly at the largest or smallest value in flat runs, though all others move: the "
        "instrument was probably out of range and depths are cut; compare a recording with less gain",
    )


def _with_resolution(trace: Trace) -> Trace:
    """Say when the steps of the converter are coarse against the swing."""
    levels = np.unique(trace.light[:_ENOUGH])
    if not 4 <= levels.size <= 64:
        return trace
    step = float(np.diff(levels).min())
    swing = float(levels[-1] - levels[0])
    on_ladder = (levels - levels[0]) / step
    if swing / step > 64 or np.abs(on_ladder - np.round(on_ladder)).max() > 0.05:
        return trace
    mean = abs(float(trace.above_dark.mean()))
    share = f", {100 * step / mean:.2g} % of the mean" if trace.mean_known and mean > step else ""
    return trace.replace(
        note=Note(
            "low-resolution",
            "warning",
            f"the whole swing spans {round(swing / step)} steps of the converter ({_with_unit(step, trace)} each{share}): "
            "a small depth may be steps rather than light; raise the gain",
        )
    )


def _with_drift(trace: Trace) -> Trace:
    """Say how far the mean level moved, where that can be told from flicker."""
    blocks = 256
    length = trace.samples // blocks
    if length < 4 or len(trace.segments) > 1 or not trace.mean_known:
        return trace
    coarse = trace.above_dark[: blocks * length].reshape(blocks, length).mean(axis=1)
    level = float(coarse.mean())
    if level <= 0:
        return trace
    place = np.linspace(-1.0, 1.0, blocks)
    trend = np.polynomial.polynomial.polyval(place, np.polynomial.polynomial.polyfit(place, coarse, 2))
    moved = float(trend.max() - trend.min())
    if moved < 0.01 * level or float(np.var(coarse - trend)) > 0.1 * float(np.var(trend)):
        return trace
    way = "rose" if trend[-1] > trend[0] else "fell"
    return trace.replace(
        note=Note(
            "drift",
            "warning",
            f"the mean level {way} by {100 * moved / level:.1f} % over the capture, reported apart from flicker: let the lamp warm up and "
            "check the supply",
        )
    )
