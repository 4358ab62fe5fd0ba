"""The light read back from the stripes that a rolling shutter makes of it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.light import ChannelLight, ComplexArray, Light
from flicker.results import Component, Measure, Note
from flicker.signal.stripes_figures import Samples, figures_of
from flicker.signal.stripes_fit import STANDING, Rows, StripeFit, fit_stripes, fit_wave, standing_of
from flicker.signal.stripes_search import Deviation, search_frequency, search_turns
from flicker.signal.stripes_shape import (
    CHROMA_FLOOR,
    FLOOR,
    FreeShape,
    Harmonics,
    PulseShape,
    fit_decay,
    fit_exposure,
    fit_pulse,
    is_rectangle,
    undo_exposure,
)
from flicker.trace import FloatArray

_FAINTEST = 5e-3  # share of the variation that a tone must explain
_LOWEST_BAND = 2e-3  # amplitude over the mean below which compression makes bands of its own
_FRAMES_USED = 64
_STAMPS = 2e-7  # relative standard uncertainty of a frequency that rests on rounded time stamps
_RATES = (24.0, 25.0, 30.0, 48.0, 50.0, 60.0)
_LUMA = (0.2126, 0.7152, 0.0722)  # ITU-R BT.709
_HUNTING = 0.03  # standard deviation of the level from frame to frame
_LISTED = 60  # lines of the spectrum that a channel lists


@dataclass(frozen=True, slots=True, eq=False)
class ChannelStripes:
    """One channel: its bands, the light behind them and every measure of it."""

    name: str
    mean: float  # light above black, nominal white is 1
    bands: StripeFit
    measures: dict[str, Measure]
    components: tuple[Component, ...]
    light: ChannelLight | None  # None where the exposure is unknown and cannot be found


@dataclass(frozen=True, slots=True, eq=False)
class Stripes:
    """The light of a rolling-shutter video."""

    footage: Footage
    line_time: float | None  # as told [s]
    exposure: float | None  # as told, or as fitted [s]
    exposure_told: bool
    frequency: Measure
    fitted_line_time: Measure
    alternatives: tuple[dict[str, Any], ...]
    channels: tuple[ChannelStripes, ...]
    notes: tuple[Note, ...]

    @property
    def light(self) -> Light:
        """The light of all channels, for prediction; `NotMeasurable` where it is not known."""
        known = tuple(channel.light for channel in self.channels if channel.light is not None)
        if not known:
            raise NotMeasurable("the depth of the light is not known: state --line-time and --exposure")
        return Light(known)


def read_stripes(
    footage: Footage, *, line_time: float | None = None, exposure: float | None = None, clock: float = 0.0
) -> Stripes:
    """
    Read the light back, every line a sample at its true time.

    Parameters
    ----------
    footage : Footage
        Lines of a video; channels `red`, `green`, `blue` and `all`, or `all` alone.
    line_time : float, optional
        Seconds between the starts of two lines. Without it the frequency is ambiguous. [s]
    exposure : float, optional
        Seconds that a line collects light. Without it it is fitted where three harmonics show. [s]
    clock : float
        Relative standard uncertainty of the camera's clock.

    Returns
    -------
    Stripes
        Frequency, waveform figures of each channel with their 95 % intervals, and the doubts.

    Raises
    ------
    NotMeasurable
        If no light shows between lines and frames, or its bands stand still.
    """
    bands = find_bands(footage, line_time)
    seen = {name: fit_wave(_rows(footage, name), bands) for name in footage.channels}
    strongest = max(float(np.abs(fit.amplitudes).max()) for fit in seen.values())
    floors = {"red": CHROMA_FLOOR, "blue": CHROMA_FLOOR}
    harmonics = {name: Harmonics.of(fit, strongest, floors.get(name, FLOOR)) for name, fit in seen.items()}
    frequency, fitted, alternatives, notes = _clocked(footage, bands, line_time, clock)
    told = exposure is not None
    others: list[PulseShape] = []
    if exposure is None and line_time is not None:
        exposure, others = _fitted_exposure(harmonics, 1.0 / footage.frame_rate)
    notes += _doubts(footage, bands, line_time, exposure, told)
    shapes: dict[str, PulseShape | FreeShape] = {}
    if exposure is not None and line_time is not None:
        shapes = _shapes(harmonics, exposure)
    draws = {name: Samples.of(shape, harmonics[name], seed=7) for name, shape in shapes.items()}
    means = {name: float(footage.lines_of(name).mean()) for name in footage.channels}
    if {"red", "green", "blue", "all"} <= set(draws):
        shares = [w * means[n] for n, w in zip(("red", "green", "blue"), _LUMA, strict=True)]
        draws["all"] = Samples.mixed([draws[n] for n in ("red", "green", "blue")], shares)
    channels = []
    for name in footage.channels:
        fit = seen[name]
        measures: dict[str, Measure] = {"fundamental_frequency": frequency}
        if name in draws:
            alike = [Samples.of(other, harmonics[name], seed=11, count=0) for other in others]
            step = _dark_step(footage, means[name])
            measures |= figures_of(draws[name], bands.frequency, fit.noise, step, _loose(footage), alike)
            measures["decay_time"] = _decay(shapes[name])
        else:
            measures |= _unknown(line_time, exposure)
        components, light = _lines(name, draws.get(name), bands, footage, exposure, means[name])
        channels.append(ChannelStripes(name, means[name], fit, measures, components, light))
    return Stripes(
        footage, line_time, exposure, told, frequency, fitted, alternatives, tuple(channels), footage.notes + notes
    )


def find_bands(footage: Footage, line_time: float | None) -> StripeFit:
    """Find the bands and fit them in the channel that holds all light; `NotMeasurable` if there are none."""
    lines = footage.lines_of("all")
    deviation = Deviation.of(lines, footage.times)
    if line_time is not None:
        tones = [(t.frequency, t.turns_per_line, t.power) for t in search_frequency(deviation, line_time)]
    else:
        rate = footage.frame_rate
        tones = [(turns * rate, per_line, power) for per_line, turns, power in search_turns(deviation, rate)]
    tones = [tone for tone in tones if _moving(tone[0], footage)]
    least = max(100.0 / (deviation.lines * len(deviation.times)), _FAINTEST)
    tones.sort(key=lambda tone: -tone[2])
    if not tones or tones[0][2] < least:
        raise NotMeasurable(_no_bands(lines, footage, line_time))
    fit = fit_stripes(_rows(footage, "all", first=True), tones[0][0], tones[0][1])
    fit = _lowest(footage, fit)
    if footage.frames > _FRAMES_USED:
        longer = fit_stripes(_rows(footage, "all"), fit.frequency, fit.turns_per_line)
        if longer.noise < 1.5 * fit.noise:
            fit = longer
    if not (np.abs(fit.amplitudes) > np.maximum(8 * fit.errors, _LOWEST_BAND)).any():
        raise NotMeasurable(_no_bands(lines, footage, line_time))
    return fit


def _rows(footage: Footage, channel: str, *, first: bool = False) -> Rows:
    chosen = np.arange(footage.frames)
    if footage.frames > _FRAMES_USED:
        chosen = chosen[:_FRAMES_USED] if first else np.linspace(0, footage.frames - 1, _FRAMES_USED).astype(int)
    return Rows.of(footage.lines_of(channel)[chosen], footage.times[chosen], float(footage.times.mean()))


def _moving(frequency: float, footage: Footage) -> bool:
    return bool(standing_of(np.ones(1), frequency, footage.times)[0] < STANDING)


def _lowest(footage: Footage, fit: StripeFit) -> StripeFit:
    """The same light at a half, a third or a fifth of the frequency, where lines between the harmonics show it."""
    for divisor in (2, 3, 5):
        frequency = fit.frequency / divisor
        if not _moving(frequency, footage) or fit.turns_per_line * footage.lines / divisor < 0.5:
            continue
        slower = fit_stripes(_rows(footage, "all", first=True), frequency, fit.turns_per_line / divisor, rounds=3)
        between = slower.harmonics % divisor != 0
        heights = np.abs(slower.amplitudes)
        clear = heights > np.maximum(8 * slower.errors, 0.03 * heights.max())
        if (clear & between).any() and slower.noise < 0.97 * fit.noise:
            return fit_stripes(_rows(footage, "all", first=True), frequency, fit.turns_per_line / divisor)
    return fit


def _no_bands(lines: FloatArray, footage: Footage, line_time: float | None) -> str:
    other = [rate for rate in _RATES if abs(rate / footage.frame_rate - 1) > 0.02]
    cure = (
        f"film at a frame rate other than {footage.frame_rate:.5g} Hz, such as {other[0]:g} or "
        f"{other[1]:g}, with a short "
        "exposure; or measure a plain white surface"
    )
    profile = lines.mean(axis=0)
    level = np.convolve(profile, np.ones(31) / 31, "same")[31:-31] if profile.size > 100 else profile
    rest = (profile[31:-31] if profile.size > 100 else profile) / np.where(level > 0, level, 1.0) - 1
    power = np.abs(np.fft.rfft(rest * np.hanning(rest.size))) ** 2
    power[:2] = 0
    peak = int(power.argmax())
    if power[max(peak - 2, 0) : peak + 3].sum() > 0.5 * power.sum() and rest.std() > 0.002:
        place = ""
        if line_time is not None:
            about = peak / rest.size / line_time
            multiple = max(round(about / footage.frame_rate), 1)
            place = (
                f" (about {about:.0f} Hz, perhaps {multiple} times the frame rate = "
                f"{multiple * footage.frame_rate:.6g} Hz)"
            )
        return (
            f"no band moves; a pattern of lines stands still{place}: bands that keep step with the "
            f"frames, or the scene; {cure}"
        )
    return (
        "no light was found that changes from line to line and from frame to frame: it is steady, its "
        "bands stand still, "
        f"the exposure blurs them away, or the lines run the other way (--read-direction); {cure}"
    )


def _clocked(
    footage: Footage, bands: StripeFit, line_time: float | None, clock: float
) -> tuple[Measure, Measure, tuple[dict[str, Any], ...], tuple[Note, ...]]:
    """Frequency, line time that fits, other pairs of the two, and doubts about them."""
    rate = footage.frame_rate
    low, high = 0.15 / rate / footage.lines_of_frame, 1.05 / rate / footage.lines_of_frame
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


def _fitted_exposure(harmonics: dict[str, Harmonics], longest: float) -> tuple[float | None, list[PulseShape]]:
    """Exposure from the shape of the bands, and the pulses that fit as well with another; None if it cannot be had."""
    best = max(harmonics.values(), key=lambda one: float(np.abs(one.amplitudes[0])))
    if int((np.abs(best.amplitudes) > 3 * np.sqrt(best.variances)).sum()) < 3:
        return None, []
    pulse, others = fit_exposure(best, longest)
    return (pulse.exposure, others) if is_rectangle(pulse) else (None, [])


def _shapes(harmonics: dict[str, Harmonics], exposure: float) -> dict[str, PulseShape | FreeShape]:
    """The light of each channel: a pulse, the fastest one's pulse behind a slow emitter, or free harmonics."""
    own = {name: fit_pulse(one, exposure) for name, one in harmonics.items()}
    colours: list[str] = [name for name in ("green", "blue", "red") if name in own] or ["all"]
    fastest = max(colours, key=lambda name: float(np.abs(harmonics[name].amplitudes[0])))
    shapes: dict[str, PulseShape | FreeShape] = {}
    for name, one in harmonics.items():
        shape = own[name]
        if name not in (fastest, "all") and is_rectangle(own[fastest]):
            slow = fit_decay(one, own[fastest])
            lag = 2 * math.pi * one.frequency * slow.decay
            if (
                lag > 0.2
                and slow.decay > 3 * slow.decay_error
                and slow.chi_square < max(1.5 * own[name].chi_square, 2.5)
            ):
                shape = slow
        if not shape.decay and not (np.abs(one.amplitudes) > 3 * np.sqrt(one.variances)).any():
            continue
        if is_rectangle(shape):
            shapes[name] = shape
        elif (free := undo_exposure(one, exposure)).numbers.size:
            shapes[name] = free
    return shapes


def _dark_step(footage: Footage, mean: float) -> float:
    """What half a code value at black is of the mean light."""
    slope = {"bt709": 1 / 4.5, "srgb": 1 / 12.92, "linear": 1.0}.get(footage.transfer, 0.05)
    return 0.5 * footage.code_step * slope / max(mean, 1e-9)


def _loose(footage: Footage) -> float:
    """How far the exponent of the transfer may be off."""
    return 0.18 if any(note.code == "transfer-assumed" for note in footage.notes) else 0.0


def _decay(shape: PulseShape | FreeShape) -> Measure:
    if isinstance(shape, PulseShape) and shape.decay:
        half = 1.96 * shape.decay_error
        low = max(shape.decay - half, 0.0)
        return Measure(shape.decay, "s", low, shape.decay + half, "one pole against the fastest channel")
    return Measure.missing("s", "the channel does not lag the fastest one measurably")


def _unknown(line_time: float | None, exposure: float | None) -> dict[str, Measure]:
    """Say what keeps the depth from being known."""
    reason = (
        "the line time is not known, and with it neither the frequency nor what the exposure takes: state --line-time"
        if line_time is None
        else "no harmonic of this channel stands out of the noise and of what compression does"
        if exposure is not None
        else "the exposure is not known and the bands show too few harmonics to find it: state --exposure"
    )
    units = {"percent_flicker": "%", "flicker_index": "1", "rms_modulation": "%", "duty_cycle": "1", "svm": "1"}
    return {name: Measure.missing(unit, reason) for name, unit in units.items()} | {
        "decay_time": Measure.missing("s", reason)
    }


def _doubts(
    footage: Footage, bands: StripeFit, line_time: float | None, exposure: float | None, told: bool
) -> tuple[Note, ...]:
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


def _lines(
    name: str,
    draw: Samples | None,
    bands: StripeFit,
    footage: Footage,
    exposure: float | None,
    mean: float,
) -> tuple[tuple[Component, ...], ChannelLight | None]:
    """Spectral lines of the light with phases from the first line of the first frame."""
    if draw is None or exposure is None:
        return (), None
    numbers, amplitudes, errors = draw.lines(_LISTED)
    turned: ComplexArray = amplitudes * np.exp(2j * np.pi * numbers * _origin(footage, bands, exposure))
    components = [
        Component(float(h * bands.frequency), complex(a), float(e), float(h * bands.frequency_error))
        for h, a, e in zip(numbers, turned, errors, strict=True)
        if abs(a) > max(3 * e, 1e-5)
    ]
    components.sort(key=lambda line: -abs(line.amplitude))
    known = ChannelLight(name, numbers * bands.frequency, turned, (bands.frequency,), draw.pulse, mean)
    return tuple(components), known


def _origin(footage: Footage, bands: StripeFit, exposure: float) -> float:
    """Phase of the start of the first line of the first frame, where the fit counts from the middle of all. [cycles]"""
    lines = (footage.lines - 1) / 2 * bands.turns_per_line
    frames = (float(footage.times[0]) - float(footage.times.mean())) * bands.frequency
    return frames - lines - 0.5 * bands.frequency * exposure
