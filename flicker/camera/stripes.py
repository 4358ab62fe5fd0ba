"""The light read back from the stripes that a rolling shutter makes of it."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.camera.stripes_apart import tell_apart
from flicker.camera.stripes_doubts import clocked, doubts, moving
from flicker.camera.stripes_found import find_bands, frames_of, need_fit, need_renewed, rows_of, without_held
from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.light import ChannelLight, ComplexArray, Light
from flicker.results import Component, Measure, Note
from flicker.signal.stripes_coding import Coding
from flicker.signal.stripes_drive import Drive, Lag, common_drive
from flicker.signal.stripes_figures import Samples, figures_of, together
from flicker.signal.stripes_fit import StripeFit, fit_wave
from flicker.signal.stripes_free import FreeShape, shape_of
from flicker.signal.stripes_shape import Harmonics, PulseShape, fit_exposure, is_rectangle
from flicker.trace import FloatArray

_LUMA = (0.2126, 0.7152, 0.0722)  # ITU-R BT.709
_COLOURS = ("red", "green", "blue")
_FIGURES = {"percent_flicker": "%", "flicker_index": "1", "rms_modulation": "%", "duty_cycle": "1", "svm": "1"}
_WIDEST = 35.0  # interval of percent flicker that is still an answer [%]
_LOOSEST = 0.5  # interval of a decay over the decay that is still an answer
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
    own: dict[str, Measure] | None = None  # of the first light alone, where there are two


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
    others: tuple[Stripes, ...] = ()  # a second light, read by itself

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
    renewed, held = without_held(footage)
    bands = find_bands(renewed, line_time)
    need_renewed(footage, bands)
    apart = tell_apart(renewed, bands, line_time)
    if apart is None:
        found, _ = _read(footage, renewed, bands, line_time, exposure, clock)
        return dataclasses.replace(found, notes=found.notes + held)
    first, draws = _read(footage, apart[0], find_bands(apart[0], line_time), line_time, exposure, clock)
    second, others = _read(footage, apart[1], find_bands(apart[1], line_time), line_time, exposure, clock)
    channels = tuple(_together(*pair, draws, others) for pair in zip(first.channels, second.channels, strict=True))
    message = (
        f"two lights show, of {first.frequency.value:.6g} Hz and {second.frequency.value:.6g} Hz: each was read with "
        "the other taken off, about the mean of both; film one alone for its own depth"
    )
    notes = (*first.notes, *held, Note("several-lights", "info", message))
    return dataclasses.replace(first, channels=channels, notes=notes, others=(second,))


def _read(
    footage: Footage,
    renewed: Footage,
    bands: StripeFit,
    line_time: float | None,
    exposure: float | None,
    clock: float,
) -> tuple[Stripes, dict[str, Samples]]:
    """Read one light whose bands were found in the part of the footage that may be used; give its draws as well."""
    waves = _waves(renewed, bands)
    need_fit(waves)
    drive, others_seen = _drive(renewed, waves)
    frequency, fitted, alternatives, notes = clocked(footage, bands, line_time, clock)
    told = exposure is not None
    alike: list[PulseShape] = []
    if exposure is None and line_time is not None:
        exposure, alike = _fitted_exposure(drive.seen, 1.0 / footage.frame_rate)
    notes += doubts(footage, bands, line_time, exposure, told) + moving(renewed, bands)
    shapes: dict[str, PulseShape | FreeShape] = {}
    if exposure is not None and line_time is not None:
        shapes = _shapes(drive, others_seen, exposure)
    draws = {name: Samples.of(shape, bands.frequency, seed=7) for name, shape in shapes.items()}
    means = {name: float(footage.lines_of(name).mean()) for name in footage.channels}
    if {*_COLOURS, "all"} <= set(draws):
        shares = [w * means[n] for n, w in zip(_COLOURS, _LUMA, strict=True)]
        draws["all"] = Samples.mixed([draws[n] for n in _COLOURS], shares)
    channels = []
    for name in footage.channels:
        measures: dict[str, Measure] = {"fundamental_frequency": frequency}
        lag = drive.lags.get(name, Lag())
        if name in draws:
            beside = [Samples.of(_lagging(one, lag), bands.frequency, seed=11, count=0) for one in alike]
            step = _dark_step(footage, means[name])
            measures |= figures_of(draws[name], bands.frequency, step, _loose(footage), beside)
            measures["decay_time"] = _decay(lag)
            if (reason := _too_open(measures["percent_flicker"], told)) is not None:
                measures |= {figure: Measure.missing(unit, reason) for figure, unit in _FIGURES.items()}
                del draws[name]
        else:
            measures |= _unknown(line_time, exposure, lag)
        components, light = _lines(name, draws.get(name), bands, footage, exposure, means[name])
        channels.append(ChannelStripes(name, means[name], waves[name], measures, components, light))
    stripes = Stripes(
        footage, line_time, exposure, told, frequency, fitted, alternatives, tuple(channels), footage.notes + notes
    )
    return stripes, draws


def _together(
    one: ChannelStripes, other: ChannelStripes, draws: dict[str, Samples], others: dict[str, Samples]
) -> ChannelStripes:
    """Figures of a channel in which two lights meet in every phase."""
    if one.name not in draws or one.name not in others:
        return one
    measures = one.measures | together(draws[one.name], others[one.name], one.measures, other.measures)
    lines = tuple(sorted((*one.components, *other.components), key=lambda line: -abs(line.amplitude)))
    light = one.light
    if light is not None and other.light is not None:
        light = ChannelLight(
            one.name,
            np.concatenate([light.frequencies, other.light.frequencies]),
            np.concatenate([light.amplitudes, other.light.amplitudes]),
            (*light.fundamentals, *other.light.fundamentals),
            None,
            light.mean,
        )
    return dataclasses.replace(one, measures=measures, components=lines, light=light, own=one.measures)


def _waves(footage: Footage, bands: StripeFit) -> dict[str, StripeFit]:
    """Fit the wave of each channel; frames coded without others count alone where they show deeper bands."""
    chosen = frames_of(footage)
    alone = None if footage.alone is None else footage.alone[chosen]
    waves = {"all": fit_wave(rows_of(footage, "all", chosen), bands, alone=alone)}
    if not waves["all"].changed:
        alone = None
    for name in footage.channels:
        if name != "all":
            waves[name] = fit_wave(rows_of(footage, name, chosen), bands, alone=alone, always=True)
    return waves


def _drive(footage: Footage, waves: dict[str, StripeFit]) -> tuple[Drive, dict[str, Harmonics]]:
    """Harmonics of the drive that channels share, and those of each channel by itself."""
    names = [name for name in _COLOURS if name in waves] or ["all"]
    count = min(wave.harmonics.size for wave in waves.values())
    numbers, whole = waves["all"].harmonics[:count], waves["all"]
    means = np.array([footage.lines_of(name).mean() for name in names])
    levels = Coding.levels_of(means, footage.transfer, full_range=footage.full_range)
    coding = Coding(
        footage.matrix,
        footage.full_range,
        footage.lossless,
        levels,
        float(whole.noise * levels.mean() * np.sqrt(footage.pixels)),
        footage.alone is not None and not footage.alone.any(),
    )
    amplitudes = np.array([waves[name].amplitudes[:count] for name in names])
    covariances = coding.covariances(amplitudes, 1 / np.abs(numbers * whole.turns_per_line), whole.changed)
    for place, name in enumerate(names):
        covariances[:, place, place] += waves[name].errors[:count] ** 2
    common = coding.common(float(np.abs(whole.amplitudes).max()), whole.changed)

    def harmonics(name: str, variances: FloatArray) -> Harmonics:
        return Harmonics(numbers, waves[name].amplitudes[:count], variances, whole.frequency, common)

    by_itself = {name: harmonics(name, covariances[:, k, k]) for k, name in enumerate(names)}
    if "all" not in names:
        shares = np.array([w * footage.lines_of(n).mean() for n, w in zip(_COLOURS, _LUMA, strict=True)])
        shares /= shares.sum()
        by_itself["all"] = harmonics("all", np.einsum("c,kcd,d->k", shares, covariances, shares))
    return common_drive(names, amplitudes, covariances, numbers, whole.frequency, common), by_itself


def _fitted_exposure(seen: Harmonics, longest: float) -> tuple[float | None, list[PulseShape]]:
    """Exposure from the shape of the bands, and the pulses that fit as well with another; None if it cannot be had."""
    if int(seen.clear.sum()) < 3:
        return None, []
    pulse, others = fit_exposure(seen, longest)
    return (pulse.exposure, others) if is_rectangle(pulse) else (None, [])


def _shapes(drive: Drive, by_itself: dict[str, Harmonics], exposure: float) -> dict[str, PulseShape | FreeShape]:
    """The light of each channel: the drive behind its emitter, or a shape of its own."""
    shapes: dict[str, PulseShape | FreeShape] = {}
    shared = shape_of(drive.seen, exposure)
    for name, seen in by_itself.items():
        lag = drive.lags.get(name)
        if lag is None:
            shape = shape_of(seen, exposure) if seen.clear.any() else None
        else:
            shape = None if shared is None or not lag.known else _lagging(shared, lag)
        if shape is not None:
            shapes[name] = shape
    return shapes


def _lagging(shape: PulseShape | FreeShape, lag: Lag) -> PulseShape | FreeShape:
    if not lag.decay:
        return shape
    if isinstance(shape, PulseShape):
        return dataclasses.replace(shape, decay=lag.decay, decay_errors=(lag.down, lag.up))
    return shape.behind(lag.decay, max(lag.down, lag.up))


def _dark_step(footage: Footage, mean: float) -> float:
    """What half a code value at black is of the mean light."""
    slope = {"bt709": 1 / 4.5, "srgb": 1 / 12.92, "linear": 1.0}.get(footage.transfer, 0.05)
    return 0.5 * footage.code_step * slope / max(mean, 1e-9)


def _loose(footage: Footage) -> float:
    """How far the exponent of the transfer may be off."""
    return 0.18 if any(note.code == "transfer-assumed" for note in footage.notes) else 0.0


def _decay(lag: Lag) -> Measure:
    if not lag.decay:
        return Measure.missing("s", "the channel does not lag the fastest one measurably")
    low, high = max(lag.decay - 1.96 * lag.down, 0.0), lag.decay + 1.96 * lag.up
    if high - low > _LOOSEST * lag.decay:
        reason = (
            f"its bands are too faint for its decay, anywhere from {1e3 * low:.3g} to {1e3 * high:.3g} ms: "
            "film with less compression, or a light of lower frequency"
        )
        return Measure.missing("s", reason)
    return Measure(lag.decay, "s", low, high, "one pole against the fastest channel")


def _unknown(line_time: float | None, exposure: float | None, lag: Lag) -> dict[str, Measure]:
    """Say what keeps the depth from being known."""
    reason = (
        "the line time is not known, and with it neither the frequency nor what the exposure takes: state --line-time"
        if line_time is None
        else "the exposure is not known and the bands show too few harmonics to find it: state --exposure"
        if exposure is None
        else "the channel lags so far that its own bands are lost in the coding: film with less compression"
        if not lag.known
        else "no band of this channel stands out of the noise and of what compression does: film with a shorter "
        "exposure or less compression"
    )
    return {name: Measure.missing(unit, reason) for name, unit in {**_FIGURES, "decay_time": "s"}.items()}


def _too_open(depth: Measure, told: bool) -> str | None:
    """Reason not to give a depth whose interval tells next to nothing."""
    low, high = depth.low or 0.0, depth.high or 0.0
    if high - low <= _WIDEST:
        return None
    cure = "film with a shorter exposure, brighter or with less compression"
    if not told:
        cure = f"state --exposure, or {cure}"
    return f"the bands are too faint for the depth of the light, anywhere from {low:.0f} to {high:.0f} %: {cure}"


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
