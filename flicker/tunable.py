"""A light that can be made faster and shallower, with every figure that limits are held against."""

from __future__ import annotations

import functools
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from flicker.errors import InputError
from flicker.light import ChannelLight, ComplexArray, Pulse
from flicker.limits.limit import MODULATION, UNITS, Curve, Limit
from flicker.results import Component, Family, Measure
from flicker.signal.stroboscopic import BAND, stroboscopic_visibility
from flicker.trace import FloatArray
from flicker.waveforms import pwm

if TYPE_CHECKING:
    from flicker.reports import ChannelReport

_MATTERS = 5e-3  # share of the strongest line below which a line crosses an edge unnoticed
_SLOW = 200.0  # up to which lines count for the short-term severity [Hz]
_BY_SHAPE = ("flicker_index", "rms_modulation")
_CUT = "percent_flicker_below_"
_LEAST_POINTS = 12  # of a cycle of filtered light, as a power of two
_RECORD = (20_000.0, 1.0)  # sample rate [Hz] and duration [s] for filtered light of several families, those of JA10.5


@dataclass(frozen=True, slots=True)
class Shape:
    """One family: its fundamental [Hz], and how far its light rises above and falls below the mean, over the mean."""

    fundamental: float
    above: float
    below: float

    def percent_flicker(self, scale: float) -> float:
        """Depth when every deviation from the mean is scaled. [%]"""
        return _depth(scale * self.above, scale * self.below)


def _depth(above: float, below: float) -> float:
    return min(100.0 * (above + below) / (2.0 + above - below), 100.0)


@dataclass(frozen=True, eq=False)
class TunableLight:
    """
    One channel of light as a function of speed and scale (see `flicker.limits.margin.Tunable`).

    A typed-in pulse keeps its emitter's decay time when it is made faster, and so becomes shallower; of a measured
    light nothing is known but its waveform, which is kept.
    """

    channel: ChannelLight
    shapes: tuple[Shape, ...]  # deepest first
    known: Mapping[str, float]  # figures of the light as it is, that no line spectrum gives

    @classmethod
    def typed(cls, channel: ChannelLight) -> TunableLight:
        """Take a light that was typed in, exactly; `InputError` if it is not a pulse."""
        if channel.pulse is None:
            raise InputError(f"the waveform of channel {channel.name} is not known exactly")
        return cls(channel, _shapes_of(channel.pulse), {})

    @classmethod
    def measured(cls, report: ChannelReport) -> TunableLight:
        """Take the light of a measured channel; `NotMeasurable` if the capture lost its mean level."""
        observation = report.observation
        light, mean = observation.light, observation.level
        pairs = zip(observation.search.families, observation.family_extremes, strict=True)
        shapes = [Shape(fit.frequency, ends.high / mean - 1.0, 1.0 - ends.low / mean) for fit, ends in pairs]
        shapes.sort(key=lambda shape: -(shape.above + shape.below))
        known = {name: measure.value for name, measure in report.measures.items() if measure.value is not None}
        return cls(light, tuple(shapes), known)

    @property
    def frequency(self) -> float | None:
        """Fundamental of the deepest family; None for steady light. [Hz]"""
        return self.shapes[0].fundamental if self.shapes else None

    @property
    def largest_scale(self) -> float:
        """Scale at which the darkest moment is dark, or the drive of a pulse goes down to nothing."""
        pulse = self.channel.pulse
        if pulse is not None and self.shapes:
            mean = pulse.low_level + (1.0 - pulse.low_level) * pulse.duty
            return mean / (mean - pulse.low_level)
        below = sum(shape.below for shape in self.shapes)
        return 1.0 / below if below > 0 else math.inf

    def at(self, speed: float, scale: float) -> TunableLight:
        """Give the light made faster and shallower; a pulse stays a pulse."""
        pulse = self.channel.pulse
        if pulse is not None:
            return TunableLight.typed(_pulse_channel(self.channel, _changed(pulse, speed, scale)))
        channel = replace(
            self.channel,
            frequencies=self.channel.frequencies * speed,
            amplitudes=self.channel.amplitudes * scale,
            fundamentals=tuple(one * speed for one in self.channel.fundamentals),
        )
        shapes = tuple(Shape(one.fundamental * speed, one.above * scale, one.below * scale) for one in self.shapes)
        known = {name: scale * self.known[name] for name in _BY_SHAPE if name in self.known}
        return TunableLight(channel, shapes, known)

    def percent_flicker(self, scale: float) -> float:
        """Depth of the whole light, its families meeting in every phase. [%]"""
        above, below = (sum(getattr(shape, side) for shape in self.shapes) for side in ("above", "below"))
        return _depth(scale * above, scale * below)

    def modulations(self, measure: str, speed: float, scale: float) -> tuple[FloatArray, FloatArray]:
        """Frequencies [Hz] and depths [%] that a curve is held against, shape (k,) each."""
        faster = self._faster(speed)
        frequencies = [shape.fundamental for shape in faster.shapes]
        depths = [shape.percent_flicker(scale) for shape in faster.shapes]
        if measure != MODULATION:
            return np.array(frequencies), np.array(depths)
        lines, amplitudes = faster.channel.frequencies, faster.channel.amplitudes
        return np.append(frequencies, lines), np.append(depths, 100.0 * scale * np.abs(amplitudes))

    def critical_speeds(self, limit: Limit) -> Sequence[float]:
        """Speeds at which a family or a line that matters crosses an edge of the rule."""
        if isinstance(limit.bound, Curve):
            edges: tuple[float, ...] = limit.bound.edges
        elif limit.measure.startswith(_CUT):
            edges = (cut_of(limit.measure),)
        else:
            edges = {"svm": BAND, "pst_lm": (_SLOW,)}.get(limit.measure, ())
        frequencies = [shape.fundamental for shape in self.shapes]
        if limit.measure != "pst_lm" and self.channel.frequencies.size:  # pst_lm goes smoothly with the frequency
            heights = np.abs(self.channel.amplitudes)
            frequencies += self.channel.frequencies[heights >= _MATTERS * heights.max()].tolist()
        return [edge / frequency for edge in edges for frequency in frequencies]

    def figure(self, measure: str, speed: float, scale: float) -> float | None:
        """Give a measure of the changed light; None if it cannot be had."""
        if measure == MODULATION:
            return self.percent_flicker(scale)
        faster = self._faster(speed)
        if measure == "percent_flicker":
            return faster.percent_flicker(scale)
        if measure.startswith(_CUT):
            above, below = (scale * end for end in faster.filtered(cut_of(measure)))
            total = 2.0 + above - below  # nothing or less where the cut makes the light swing far below zero
            return 100.0 * (above + below) / total if total > 0 else math.inf
        base = _linear_figure(faster, measure)
        return None if base is None else scale * base

    def linear_figure(self, measure: str) -> float | None:
        """Give one of the measures that are proportional to the modulation."""
        pulse = self.channel.pulse
        if measure == "svm":
            return stroboscopic_visibility(*self.lines_below(BAND[1]))
        if measure == "pst_lm":
            from flicker.signal.severity_lines import severity_of_lines

            only = self.shapes[0].fundamental if len(self.shapes) == 1 else None
            return severity_of_lines(*self.lines_below(_SLOW), only)
        if measure not in _BY_SHAPE:
            return None
        if pulse is None:
            return self.known.get(measure)
        if not self.shapes:
            return 0.0
        waveform = pwm(pulse.frequency, pulse.duty, pulse.low_level, pulse.decay)
        return waveform.flicker_index if measure == "flicker_index" else waveform.rms_modulation

    def lines_below(self, highest: float) -> tuple[FloatArray, ComplexArray]:
        """Lines up to a frequency [Hz], all of them for a pulse."""
        pulse = self.channel.pulse
        if pulse is not None and self.shapes:
            harmonics = np.arange(1.0, min(math.floor(highest / pulse.frequency * (1 + 1e-12)), 1 << 14) + 1)
            return np.asarray(harmonics * pulse.frequency), pulse.amplitudes(harmonics)
        keep = self.channel.frequencies <= highest
        return self.channel.frequencies[keep], self.channel.amplitudes[keep]

    def filtered(self, cut: float) -> tuple[float, float]:
        """How far the light with all lines above `cut` [Hz] taken out rises above and falls below the mean."""
        frequencies, amplitudes = self.lines_below(cut)
        if not frequencies.size:
            return 0.0, 0.0
        if len(self.shapes) == 1:
            return _cycle_swing(tuple(np.rint(frequencies / self.shapes[0].fundamental)), tuple(amplitudes))
        return _record_swing(tuple(frequencies), tuple(amplitudes))

    def findings(
        self, names: Iterable[str] = UNITS
    ) -> tuple[dict[str, Measure], tuple[Component, ...], tuple[Family, ...]]:
        """Give measures, lines and families as a report holds them, without intervals: this light is exact."""
        figures = {name: self.figure(name, 1.0, 1.0) for name in names if name != MODULATION}
        measures = {
            name: Measure.missing(UNITS[name], "it cannot be computed from a line spectrum")
            if value is None or math.isinf(value)
            else Measure(value, UNITS[name])
            for name, value in figures.items()
        }
        lines = zip(self.channel.frequencies.tolist(), self.channel.amplitudes.tolist(), strict=True)
        families = tuple(
            Family(Measure(one.fundamental, "Hz"), Measure(one.percent_flicker(1.0), "%"), 0, "") for one in self.shapes
        )
        return measures, tuple(Component(frequency, amplitude) for frequency, amplitude in lines), families

    def _faster(self, speed: float) -> TunableLight:
        return _faster(self, speed)


@functools.lru_cache(maxsize=64)
def _faster(light: TunableLight, speed: float) -> TunableLight:
    return light if speed == 1.0 else light.at(speed, 1.0)


@functools.lru_cache(maxsize=64)
def _linear_figure(light: TunableLight, measure: str) -> float | None:
    return light.linear_figure(measure)


def cut_of(measure: str) -> float:
    """Cut-off [Hz] in the name of a filtered measure: 200 for `percent_flicker_below_200hz`."""
    return float(measure.removeprefix(_CUT).removesuffix("hz"))


def _changed(pulse: Pulse, speed: float, scale: float) -> Pulse:
    """Make a pulse faster, and scale its deviation from the mean by moving its off level."""
    mean = pulse.low_level + (1.0 - pulse.low_level) * pulse.duty
    high, low = (1.0 + scale * (level / mean - 1.0) for level in (1.0, pulse.low_level))
    return replace(pulse, frequency=pulse.frequency * speed, low_level=max(low, 0.0) / high)


def _pulse_channel(channel: ChannelLight, pulse: Pulse) -> ChannelLight:
    harmonics = np.arange(1.0, channel.frequencies.size + 1)
    return replace(
        channel,
        frequencies=np.asarray(harmonics * pulse.frequency),
        amplitudes=pulse.amplitudes(harmonics),
        fundamentals=(pulse.frequency,) if channel.fundamentals else (),
        pulse=pulse,
    )


def _shapes_of(pulse: Pulse) -> tuple[Shape, ...]:
    if pulse.duty == 1.0 or pulse.low_level == 1.0:
        return ()
    ends = pulse.at(np.array([0.0, pulse.duty]))
    return (Shape(pulse.frequency, float(ends.max()) - 1.0, 1.0 - float(ends.min())),)


@functools.lru_cache(maxsize=256)
def _cycle_swing(harmonics: tuple[float, ...], amplitudes: tuple[complex, ...]) -> tuple[float, float]:
    """How far a sum of harmonics rises above and falls below its mean."""
    points = 1 << max(_LEAST_POINTS, math.ceil(math.log2(8.0 * max(harmonics))))
    spectrum = np.zeros(points // 2 + 1, dtype=complex)
    np.add.at(spectrum, np.array(harmonics, dtype=int), np.array(amplitudes) * (points / 2))
    light = np.fft.irfft(spectrum, points)
    return float(light.max()), float(-light.min())


@functools.lru_cache(maxsize=64)
def _record_swing(frequencies: tuple[float, ...], amplitudes: tuple[complex, ...]) -> tuple[float, float]:
    """How far a sum of lines rises above and falls below its mean within a record."""
    rate, duration = _RECORD
    times = np.arange(round(rate * duration)) / rate
    light = np.zeros(times.size)
    for frequency, amplitude in zip(frequencies, amplitudes, strict=True):
        light += (amplitude * np.exp(2j * np.pi * frequency * times)).real
    return float(light.max()), float(-light.min())
