"""What may be wrong with a light read from stripes: its frequency's clock and ambiguity, and notes on the video."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from flicker.camera.stripes_found import frames_of, rows_of
from flicker.footage import Footage
from flicker.results import Measure, Note
from flicker.signal.stripes_fit import STANDING, StripeFit, taken_off
from flicker.trace import FloatArray

_STAMPS = 7e-7  # relative standard uncertainty of a stated rate: 29.97 may stand for 30000/1001, a millionth off
_MOVED = 0.015  # change of the level over some lines beyond the bands
_SMOOTHED = 16  # lines
_FAINT = 0.012  # contrast of bands of which compression may erase one or the other
_HUNTING = 0.03  # standard deviation of the level from frame to frame


def clocked(
    footage: Footage, bands: StripeFit, line_time: float | None, clock: float
) -> tuple[Measure, Measure, tuple[dict[str, Any], ...], tuple[Note, ...]]:
    """Frequency, line time that fits, other pairs of the two, and doubts about them."""
    rate = footage.frame_rate
    low, high = 0.15 / rate / footage.lines_of_frame, 1.05 / rate / footage.lines_of_frame
    if line_time is not None:
        low, high = min(low, 0.5 * line_time), max(high, 2.0 * line_time)
    sign = 1.0 if bands.turns_per_line > 0 else -1.0
    pairs = []
    for shift in range(-2000, 2001) if line_time is None else range(-3, 4):
        candidate = sign * bands.frequency + shift * rate if line_time is None else bands.frequency + shift * rate
        if candidate <= 0 or (shift == 0 and line_time is not None):
            continue
        implied = abs(bands.turns_per_line) / candidate
        off = None if line_time is None else 100 * abs(implied / line_time - 1)
        if low <= implied <= high:
            pairs.append({"frequency_hz": candidate, "line_time_s": implied, "line_time_off_percent": off})
    if line_time is None:
        reason = (
            f"the line time is not known, and {len(pairs)} pairs of frequency and line time fit alike "
            "(see the alternatives): "
            "state --line-time, or measure it with flicker line-time"
        )
        unknown = Measure.missing("Hz", reason)
        return unknown, Measure.missing("s", reason), tuple(pairs), ()
    error = math.hypot(bands.frequency_error, clock * bands.frequency, _STAMPS * bands.frequency)
    half = 1.96 * error
    method = f"phase of {len(bands.harmonics)} harmonics over {footage.frames} frames"
    method += "" if clock else "; the camera's clock taken as exact"
    frequency = Measure(bands.frequency, "Hz", bands.frequency - half, bands.frequency + half, method)
    fitted = abs(bands.turns_per_line) / bands.frequency
    half = 1.96 * fitted * math.hypot(bands.turns_error / bands.turns_per_line, error / bands.frequency)
    time = Measure(fitted, "s", fitted - half, fitted + half, "cycles a line over the frequency")
    notes: list[Note] = []
    off = abs(fitted / line_time - 1)
    pairs.sort(key=lambda pair: float(pair["line_time_off_percent"] or 0))
    if off > max(2e-3, 3 * half / fitted):
        message = (
            f"the bands fit a line time of {fitted:.6g} s, {100 * off:.2g} % from the one that was told; "
            "if that one is right, "
            "the frequency is another: see the alternatives"
        )
        notes.append(Note("line-time-off", "warning", message))
    if pairs and float(pairs[0]["line_time_off_percent"] or 0) < 0.3:
        step = f"{pairs[0]['frequency_hz']:.6g} Hz"
        message = f"a line time only {pairs[0]['line_time_off_percent']:.2g} % off would make the frequency {step}"
        notes.append(Note("frequency-ambiguous", "warning", message))
    return frequency, time, tuple(pairs[:4]), tuple(notes)


def doubts(
    footage: Footage, bands: StripeFit, line_time: float | None, exposure: float | None, told: bool
) -> tuple[Note, ...]:
    """Give notes on what is unknown, blind, standing or contaminated."""
    notes = []
    if line_time is None:
        notes.append(
            Note("line-time-unknown", "warning", "without --line-time the frequency is one of the alternatives")
        )
    if exposure is None:
        message = (
            "without --exposure only the bands are known: contrast "
            f"{100 * min(bands.contrast, 1.0):.3g} %, the light is deeper"
        )
        notes.append(Note("exposure-unknown", "warning", message))
    elif not told:
        message = f"the exposure was not stated; the shape of the bands speaks for {exposure:.4g} s"
        notes.append(Note("exposure-fitted", "warning", message))
    if exposure is not None:
        left = np.abs(np.sinc(bands.harmonics * bands.frequency * exposure))
        blind = [f"{h:.0f}" for h in bands.harmonics[(left < 0.05) & (bands.harmonics <= 10)]]
        if blind:
            message = f"the exposure is blind to harmonics {', '.join(blind)}: another exposure would show them"
            notes.append(Note("blind-harmonics", "info", message))
    carried = np.arange(1.0, bands.standing.size + 1)
    still = [f"{h:.0f}" for h in carried[(bands.standing > STANDING) & (carried <= 10)]]
    if still:
        message = (
            f"harmonics {', '.join(still)} stand still in the picture and were left out: another frame rate shows them"
        )
        notes.append(Note("standing-harmonics", "info", message))
    if not footage.lossless and bands.contrast < _FAINT:
        message = (
            f"bands of {100 * bands.contrast:.2g} % are hardly above what compression erases: if it erased the slowest "
            "ones, the light has a half or a third of this frequency; film with a shorter exposure or less compression"
        )
        notes.append(Note("faint-bands", "warning", message))
    notes += _contamination(footage, bands)
    notes.append(
        Note("dark-assumed", "info", "the black of the video is taken as dark: light that is always there counts")
    )
    return tuple(notes)


def _frame_means(footage: Footage, bands: StripeFit) -> FloatArray:
    """Mean of the bands over each frame, shape (t,): frames do not hold whole bands."""
    numbers = np.arange(footage.lines) - (footage.lines - 1) / 2
    times = footage.times - footage.times.mean()
    kept = np.exp(2j * np.pi * np.outer(bands.harmonics * bands.turns_per_line, numbers)).mean(axis=1)
    turned = np.exp(2j * np.pi * np.outer(times, bands.harmonics * bands.frequency))
    return np.asarray(1.0 + (turned @ (bands.amplitudes * kept)).real)


def moving(footage: Footage, bands: StripeFit) -> tuple[Note, ...]:
    """Note a camera or a scene that moved: what the bands leave is then alike from line to line."""
    rows = rows_of(footage, "all", frames_of(footage))
    if bands.scene.size != rows.numbers.size or bands.gain.size != len(rows.times) or rows.numbers.size < 4 * _SMOOTHED:
        return ()
    rest = taken_off(rows, bands) / bands.scene - 1.0
    rest -= rest.mean(axis=1, keepdims=True)  # the gain of a frame is no movement
    count = rest.shape[1] // _SMOOTHED
    smooth = float(rest[:, : count * _SMOOTHED].reshape(len(rest), count, _SMOOTHED).mean(axis=2).std())
    noise = float(np.diff(rest, axis=1).std()) / np.sqrt(2 * _SMOOTHED)
    if smooth < max(_MOVED, 3 * noise):
        return ()
    message = (
        f"the camera or the scene moved: the level of the lines changes by {100 * smooth:.2g} % beyond what the bands "
        "explain; the frequency stands, the depth is less sure than its interval says: use a tripod and an even "
        "surface that keeps still, or choose such a --region"
    )
    return (Note("moving-scene", "warning", message),)


def _contamination(footage: Footage, bands: StripeFit) -> list[Note]:
    """Frames that stand twice, and an exposure that the camera changed on the way."""
    lines = footage.lines_of("all")
    notes = []
    twice = int((np.abs(np.diff(lines, axis=0)).mean(axis=1) < 1e-4 * lines.mean()).sum())
    if twice:
        message = (
            f"{twice} frames repeat the one before: the video was brought to another frame rate, and its "
            "times are wrong; use the file as the camera wrote it"
        )
        notes.append(Note("repeated-frames", "warning", message))
    level = lines.mean(axis=0)
    gain = (lines[:, level > 0] / level[level > 0]).mean(axis=1) / _frame_means(footage, bands)
    if abs(bands.turns_per_line) * footage.lines > 3 and gain.std() > _HUNTING:
        message = (
            f"the level changes by {100 * gain.std():.2g} % from frame to frame beyond what the bands explain: "
            "the camera changed its exposure or gain; depths are off by about as much: lock exposure and gain"
        )
        notes.append(Note("exposure-hunting", "warning", message))
    return notes
