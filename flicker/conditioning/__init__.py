"""What stands between a recording and its light: sign, dark level, coupling, a part of it, and every doubt."""

from __future__ import annotations

import dataclasses
import math

import numpy as np

from flicker.conditioning._coupling import fitted_corner, with_mean, without_droop
from flicker.conditioning._doubts import with_coupling_judged, with_level_judged
from flicker.conditioning._excerpt import with_excerpt_judged
from flicker.conditioning._instrument import with_drift, with_flat_tops, with_resolution
from flicker.errors import InputError
from flicker.trace import Capture, Segment, Trace, sample_at

__all__ = ["condition"]


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
        First-order corner of the AC coupling, whose droop is to be undone; fitted to the plateaus of a pulsed
        light if not given. [Hz]

    Returns
    -------
    Capture
        The traces with `dark_level` and `mean_known` set, notes and history added. Readings are changed only by
        `inverted` (negated), `mean` (shifted) and the droop of an AC coupling (undone).

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
    sound = capture.kind == "wav"
    traces = []
    for number, recorded in enumerate(capture.traces):
        trace = _part(recorded, start, duration)
        dark = _dark_of(dark_capture, number, capture) if dark_capture else dark_level
        if dark is not None:
            trace = trace.replace(dark_level=dark, done=f"dark level {dark:.6g} {trace.unit}".rstrip())
        if inverted:
            trace = _negated(trace)
        trace = with_flat_tops(trace, full_scale=1.0 if sound else None)
        if not dc_coupled:
            trace = with_coupling_judged(trace, sound=sound)
        corner = coupling_corner or (None if trace.mean_known else fitted_corner(trace))
        if corner is not None:
            trace = without_droop(trace, corner, fitted=coupling_corner is None)
        trace = with_level_judged(trace, sound, dc_coupled, inverted) if mean is None else with_mean(trace, mean)
        traces.append(with_drift(with_resolution(with_excerpt_judged(trace))))
    return dataclasses.replace(capture, traces=tuple(traces))


def _part(trace: Trace, start: float | None, duration: float | None) -> Trace:
    """Keep the samples from `start` on for `duration`, by their true times."""
    if start is None and duration is None:
        return trace
    if duration is not None and not duration > 0:
        raise InputError(f"the duration must be above 0 s, not {duration}")
    begin = trace.start if start is None else start
    end = math.inf if duration is None else begin + duration
    pieces, segments, kept = [], [], 0
    for here, after in zip(trace.segments, (*trace.segments[1:], None), strict=True):
        light = trace.light[here.first : after.first if after else None]
        first, last = (sample_at(moment - here.start, trace.sample_rate, len(light)) for moment in (begin, end))
        if first < last:
            pieces.append(light[first:last])
            segments.append(Segment(kept, here.start + first / trace.sample_rate))
            kept += last - first
    if not pieces:
        last_part = trace.segments[-1]
        finish = last_part.start + (trace.samples - last_part.first) / trace.sample_rate
        raise InputError(
            f"no sample lies in the part asked for, the capture runs from {trace.start:.6g} s to {finish:.6g} s: "
            "check --start and --duration"
        )
    if kept == trace.samples:
        return trace
    light = pieces[0] if len(pieces) == 1 else np.concatenate(pieces)
    gone = {"gap", "segments"} if len(segments) == 1 else set()
    if light.max() < trace.light.max() and light.min() > trace.light.min():
        gone.add("clipped")
    notes = tuple(note for note in trace.notes if note.code not in gone)
    done = f"used {kept} of {trace.samples} samples, from {segments[0].start:.6g} s on"
    return trace.replace(light=light, segments=tuple(segments), notes=notes, done=done)


def _dark_of(dark: Capture, number: int, capture: Capture) -> float:
    """Mean reading of the dark capture's channel that belongs to a channel of the capture."""
    trace = capture.traces[number]
    same = [one for one in dark.traces if one.name == trace.name]
    if not same and len(dark.traces) in (1, len(capture.traces)):
        same = [dark.traces[min(number, len(dark.traces) - 1)]]
    if not same:
        names = ", ".join(one.name for one in dark.traces)
        raise InputError(
            f"the dark capture has no channel '{trace.name}', only {names}: record it like the capture, or state "
            "--dark-level"
        )
    if same[0].unit and trace.unit and same[0].unit != trace.unit:
        raise InputError(
            f"the dark capture is in {same[0].unit}, the capture in {trace.unit}: record both with the same setting"
        )
    return float(same[0].light.mean())


def _negated(trace: Trace) -> Trace:
    dark = None if trace.dark_level is None else -trace.dark_level
    whole = trace.whole.negated() if trace.whole else None
    return trace.replace(
        light=-trace.light, whole=whole, dark_level=dark, done="negated, as more light reads lower (--inverted)"
    )
