"""What one trace yields, worked out once, on first need."""

from __future__ import annotations

from dataclasses import replace
from functools import cached_property

import numpy as np

from flicker.errors import NotMeasurable
from flicker.light import ChannelLight
from flicker.results import Component, Family, Measure
from flicker.signal.cycle import Cycle, fold
from flicker.signal.extremes import Extremes, extremes
from flicker.signal.families import Search, find_families
from flicker.signal.harmonics import HarmonicFit, Series
from flicker.signal.intervals import power_threshold
from flicker.signal.sidebands import sideband_words
from flicker.trace import FloatArray, Trace

_MOST_COMPONENTS = 400
_BLOCKS = 32  # of time, for slow movement
_TOO_NOISY = 0.5  # of the mean: a floor that hides any flicker
_MOVED = 0.01  # of the mean: slower movement than this counts as drift of a steady light
_NO_MEAN = (
    "the capture has lost the mean level (AC coupling), so that no depth can be told: "
    "record with DC coupling, or give the mean light with --mean"
)


class Observation:
    """
    One trace and what follows from it: families of lines, mean cycles, extremes, spectral components.

    Parameters
    ----------
    trace : Trace
        Conditioned: sign right, dark level stated or taken as zero.
    clock : float
        Relative standard uncertainty of the sample clock, which no capture can show.
    dark_uncertainty : float
        Standard uncertainty of the dark level, in the unit of the trace.
    """

    def __init__(self, trace: Trace, *, clock: float = 0.0, dark_uncertainty: float = 0.0) -> None:
        self.trace = trace
        self.clock = clock
        self.dark_uncertainty = dark_uncertainty

    @property
    def observation(self) -> Observation:
        """The whole, for measures that need more than one property."""
        return self

    @cached_property
    def series(self) -> Series:
        """Light above dark at its true times."""
        return Series.of(self.trace.above_dark, self.trace.sample_rate, self.trace.segments)

    @cached_property
    def search(self) -> Search:
        """Families of lines in the light."""
        return find_families(self.series)

    @cached_property
    def cycles(self) -> tuple[Cycle, ...]:
        """Mean cycle of each family with the others taken off, in the order of `search.families`."""
        families, cycles = self.search.families, []
        for place, fit in enumerate(families):
            alone = self.search.without(self.series, families[:place] + families[place + 1 :])
            cycles.append(fold(alone, fit.frequency, track=fit.track))
        return tuple(cycles)

    @cached_property
    def family_extremes(self) -> tuple[Extremes, ...]:
        """Largest and smallest level of each family's cycle."""
        pairs = zip(self.cycles, self.search.families, strict=True)
        return tuple(extremes(cycle, fit) for cycle, fit in pairs)

    @cached_property
    def fit(self) -> HarmonicFit:
        """Harmonics of the deepest family; `NotMeasurable` for steady light."""
        if not self.search.families:
            raise NotMeasurable(self._steady_reason())
        return self.search.families[self._deepest]

    @cached_property
    def cycle(self) -> Cycle:
        """Mean cycle of the deepest family; `NotMeasurable` for steady light."""
        if not self.search.families:
            raise NotMeasurable(self._steady_reason())
        return self.cycles[self._deepest]

    @property
    def cycle_extremes(self) -> Extremes:
        """Largest and smallest level of the deepest family's cycle; `NotMeasurable` for steady light."""
        if not self.search.families:
            raise NotMeasurable(self._steady_reason())
        return self.family_extremes[self._deepest]

    @cached_property
    def _deepest(self) -> int:
        swings = [one.high - one.low for one in self.family_extremes]
        return int(np.argmax(swings))

    @cached_property
    def steady(self) -> bool:
        """
        Whether no periodic modulation rises above the noise.

        `NotMeasurable` where the level moves, but less than one and a half cycles of what moves it were recorded: that
        is neither steady nor a flicker that could be told.
        """
        if self.search.families:
            return False
        values = self.series.values
        size = max(values.size // _BLOCKS, 1)
        blocks = values[: values.size // size * size].reshape(-1, size).mean(axis=1)
        noise = float(np.std(np.diff(values))) / np.sqrt(2 * size) if values.size > 1 else 0.0
        moved = float(np.ptp(blocks))
        if moved > _MOVED * abs(self.mean) and moved > 8 * noise:
            share = _two_digits(100 * moved / abs(self.mean))
            raise NotMeasurable(
                f"the level moves by {share} % within {self.series.span:.3g} s without "
                "repeating: slow flicker and drift cannot be told apart, record at least two cycles, better ten"
            )
        if self.search.floor > _TOO_NOISY * abs(self.mean):
            raise NotMeasurable(self._steady_reason())
        return True

    def _steady_reason(self) -> str:
        floor = (
            f" of {_two_digits(100 * self.search.floor / self.mean)} %"
            if self.trace.mean_known and self.mean > 0
            else ""
        )
        return (
            f"no periodic modulation rises above the noise{floor} between {1.5 / self.series.span:.3g} Hz and "
            f"{self.trace.sample_rate / 2:.4g} Hz: the light is steady, or record longer or with more light"
        )

    @cached_property
    def mean(self) -> float:
        """Mean level above dark over whole cycles, in the unit of the trace."""
        if self.search.families:
            return float(np.mean([cycle.mean for cycle in self.cycles]))
        return float(self.series.values.mean())

    @cached_property
    def level(self) -> float:
        """Mean level where depth may be referred to it; `NotMeasurable` where it is lost or not above dark."""
        if not self.trace.mean_known:
            raise NotMeasurable(_NO_MEAN)
        if not self.mean > 0:
            brightest = float(self.trace.light.max())
            raise NotMeasurable(
                f"no light above the dark level {self.trace.dark_level or 0:g} (brightest reading: {brightest:.6g}, "
                f"mean above dark: {self.mean:.4g}): check --dark-level, or give --inverted if more light reads lower"
            )
        return self.mean

    @cached_property
    def extremes(self) -> Extremes:
        """
        Largest and smallest level of the whole light.

        Lights that are not locked to each other meet in every phase, so that their swings add; what the samples
        never reached is not claimed.
        """
        mean, parts = self.level, self.family_extremes
        if not parts:
            raise NotMeasurable(self._steady_reason())
        if len(parts) == 1:
            return parts[0]
        high = mean + sum(one.high - cycle.mean for one, cycle in zip(parts, self.cycles, strict=True))
        low = mean + sum(one.low - cycle.mean for one, cycle in zip(parts, self.cycles, strict=True))
        values = self.series.values
        covariance = np.sum([one.covariance for one in parts], axis=0)
        freedom = min(one.degrees_of_freedom for one in parts)
        return Extremes(min(high, float(values.max())), max(low, float(values.min())), covariance, freedom)

    @cached_property
    def fundamental(self) -> Measure:
        """Fundamental of the deepest family. [Hz]"""
        return self._frequency_of(self.fit)

    def _frequency_of(self, fit: HarmonicFit) -> Measure:
        cycles = self.series.span * fit.frequency
        error = float(np.hypot(fit.frequency_error, self.clock * fit.frequency))
        method = f"least squares, {fit.amplitudes.size} harmonics, {fit.samples} samples, {cycles:.4g} cycles"
        method += "" if self.clock else "; the sample clock taken as exact"
        half = 1.96 * error
        return Measure(fit.frequency, "Hz", max(fit.frequency - half, 0.0), fit.frequency + half, method)

    @cached_property
    def components(self) -> tuple[Component, ...]:
        """Significant spectral lines below the Nyquist frequency, relative to the mean, strongest first."""
        mean = self.level
        lines = []
        for fit in self.search.families:
            number = np.arange(1, fit.amplitudes.size + 1)
            turned = fit.amplitudes * np.exp(-2j * np.pi * number * fit.frequency * fit.centre) / mean
            error = float(np.hypot(fit.amplitude_error, 0.5 * fit.folded)) / mean
            threshold = fit.amplitude_error / mean * np.sqrt(power_threshold(fit.amplitudes.size, 1e-2))
            for k, amplitude in zip(number.tolist(), turned.tolist(), strict=True):
                frequency = k * fit.frequency
                if frequency < self.trace.sample_rate / 2 and abs(amplitude) > threshold:
                    lines.append(Component(frequency, amplitude, error, k * fit.frequency_error))
        lines.sort(key=lambda line: -abs(line.amplitude))
        return tuple(lines[:_MOST_COMPONENTS])

    @cached_property
    def families(self) -> tuple[Family, ...]:
        """Families with their own depth, deepest first."""
        found = []
        for fit, cycle, ends in zip(self.search.families, self.cycles, self.family_extremes, strict=True):
            below = int(np.ceil(self.trace.sample_rate / 2 / fit.frequency)) - 1
            heights = np.abs(fit.amplitudes[:below])
            lines = int(np.count_nonzero(heights > 4 * fit.amplitude_error))
            depth = self._depth_of(ends)
            origin = guess_origin(fit.frequency, _rectangular(cycle.levels))
            family = Family(self._frequency_of(fit), depth, max(lines, 1), origin)
            found.append((ends.high - ends.low, fit, family))
        found.sort(key=lambda row: -row[0])
        deeper = [(fit.frequency, fit.frequency_error) for _, fit, _ in found]
        families = []
        for place, (_, fit, family) in enumerate(found):
            parents, errors = zip(*deeper[:place], strict=True) if place else ((), ())
            sideband = sideband_words(fit.frequency, parents, fit.frequency_error, errors)
            families.append(replace(family, origin=sideband or family.origin))
        return tuple(families)

    def _depth_of(self, ends: Extremes) -> Measure:
        try:
            return percent_between(ends, self.level, self.dark_uncertainty)
        except NotMeasurable as error:
            return Measure.missing("%", str(error))

    @cached_property
    def light(self) -> ChannelLight:
        """The light for prediction: its lines relative to the mean; `NotMeasurable` where the mean is lost."""
        components = self.components
        fundamentals = tuple(f.fundamental.value for f in self.families if f.fundamental.value)
        return ChannelLight(
            self.trace.name,
            np.array([line.frequency for line in components]),
            np.array([line.amplitude for line in components], dtype=complex),
            fundamentals=fundamentals,
            mean=self.level,
            wander=self._wander,
        )

    @property
    def _wander(self) -> float:
        track = self.fit.track if self.search.families else None
        return track.deviation / self.fit.frequency if track else 0.0

    def spectrum(self) -> tuple[FloatArray, FloatArray]:
        """Frequencies [Hz] and peak amplitudes relative to the mean (in the trace's unit where the mean is lost)."""
        whole = self.search.spectrum
        scale = self.mean if self.trace.mean_known and self.mean > 0 else 1.0
        return whole.frequencies, whole.amplitudes / scale


def percent_between(ends: Extremes, mean: float, dark_uncertainty: float = 0.0) -> Measure:
    """Percent flicker between two levels about a mean, with its interval. [%]"""
    high, low = ends.high, ends.low
    total = high + low
    if not total > 0:
        raise NotMeasurable("the darkest and the brightest level together are not above dark: check --dark-level")
    value = 100 * (high - low) / total
    gradient = (200 * low / total**2, -200 * high / total**2)
    lowest, highest = ends.interval(value, gradient)
    by_dark = 1.96 * 2 * value * dark_uncertainty / total
    lowest, highest = value - np.hypot(value - lowest, by_dark), value + np.hypot(highest - value, by_dark)
    beyond = max(value - 100.0, 0.0)  # a darkest level below dark by its error
    value, lowest, highest = (float(np.clip(x - beyond, 0.0, 100.0)) for x in (value, lowest, highest))
    return Measure(value, "%", lowest, highest, "extremes of the mean cycle, read on the other half of the cycles")


def _two_digits(value: float) -> str:
    return f"{value:.2g}" if value < 99.5 else f"{value:.0f}"


def _rectangular(levels: FloatArray) -> bool:
    """Whether most of the cycle lies near one of its two ends."""
    low, high = np.quantile(levels, [0.02, 0.98])
    middle = (levels > low + 0.2 * (high - low)) & (levels < high - 0.2 * (high - low))
    return bool(np.mean(middle) < 0.2)


def guess_origin(frequency: float, rectangular: bool) -> str:
    """Say in plain words where a fundamental may come from; a guess from frequency and shape alone."""
    for mains in (50.0, 60.0):
        if abs(frequency / (2 * mains) - 1) < 0.005:
            return f"twice the mains frequency ({mains:.0f} Hz mains), perhaps"
        if abs(frequency / mains - 1) < 0.005:
            return f"the mains frequency, or a panel refreshed at {mains:.0f} Hz, perhaps"
    for refresh in (24.0, 48.0, 72.0, 75.0, 90.0, 144.0, 240.0):
        if abs(frequency / refresh - 1) < 0.002 and not rectangular:
            return f"a panel refreshed at {refresh:g} Hz, perhaps"
    if frequency < 40:
        return "slow pulsing"
    if rectangular:
        return "PWM: the light is switched"
    return "ripple of a driver, perhaps"
