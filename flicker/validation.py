"""The program's own check values: closed forms, tables and worked values, each with its source."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.camera import Camera, predict_bands
from flicker.light import pwm_light
from flicker.limits.region import risk_curves
from flicker.metrics import METRICS, Observation
from flicker.signal.harmonics import Series, fit_harmonics
from flicker.signal.severity import light_of_lamp, severity_of, weighted_sensation
from flicker.signal.stroboscopic import power_law_threshold, sine_threshold, stroboscopic_visibility
from flicker.trace import FloatArray, Trace
from flicker.waveforms import Waveform, pwm, rectified_sine, sampled, sine, triangle

_RATE, _DURATION = 20_000.0, 1.3  # of captures made for the checks [Hz], [s]
_NOISE = 1e-4  # of each sample over the mean; less than a converter of 12 bits leaves
_METER_RATE, _METER_DURATION = 2000.0, 240.0  # of light for the severity [Hz], [s]
_BY_HAND = "closed form, by hand"
_SVM = "formula of IEC TR 63158:2018 (threshold from memory), exact lines"
_LIGHT_TABLE = "chain of IEC TR 61547-1 (from memory), periodic steady state computed in the frequency domain"
_VOLTAGE_TABLE = "IEC 61000-4-15:2010, Table 5, 230 V 50 Hz (from memory), through the two-pole lamp"
_BANDS = "exact integration of the light over the exposure, by hand"
_RUNS = 200  # of the Cramér-Rao check


@dataclass(frozen=True, slots=True)
class Check:
    """One check value; `tolerance` is the largest deviation allowed, in the unit of the value."""

    group: str
    what: str
    source: str
    unit: str
    expected: float
    got: float | None  # None: not measurable
    tolerance: float

    @property
    def deviation(self) -> float | None:
        """Got less expected, in the unit of the value."""
        return None if self.got is None else self.got - self.expected

    @property
    def ok(self) -> bool:
        """Whether the deviation keeps the tolerance."""
        return self.deviation is not None and abs(self.deviation) <= self.tolerance

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "group": self.group,
            "what": self.what,
            "source": self.source,
            "unit": self.unit,
            "expected": self.expected,
            "got": self.got,
            "deviation": self.deviation,
            "tolerance": self.tolerance,
            "ok": self.ok,
        }


def run_checks() -> Iterator[Check]:
    """
    Work out every check value, one after the other.

    Yields
    ------
    Check
        In groups: waveforms, decays, risk curves, stroboscopic visibility, severity, filtered depth, frequency, bands.

    Notes
    -----
    Values that go through the whole measurement are taken from captures made of the known waveform, with noise of
    0.01 %. Frequencies are such that the samples meet the light in many phases, as they do in practice.
    """
    for group in (
        _waveforms,
        _decays,
        _risk_curves,
        _visibility_tables,
        _visibility_measured,
        _severity_of_light,
        _severity_of_voltage,
        _severity_measured,
        _filtered,
        _frequency_bound,
        _bands,
    ):
        yield from group()


def _measured(light: Callable[[FloatArray], FloatArray], duration: float = _DURATION) -> Observation:
    return Observation(sampled(light, sample_rate=_RATE, duration=duration, start=1.3e-6, noise=_NOISE, seed=1))


def _take(name: str, observation: Observation) -> float | None:
    return METRICS[name].of(observation).value


def _waveforms() -> Iterator[Check]:
    crossing = math.asin(2 / math.pi)
    rows: Iterable[tuple[str, Waveform, float, float, float]] = (
        # name, waveform, percent flicker [%], flicker index, RMS modulation [%]
        ("sine, depth 30 %", sine(120.137, 0.3), 30.0, 0.3 / math.pi, 30 / math.sqrt(2)),
        ("symmetric triangle, depth 50 %", triangle(97.31, 0.5), 50.0, 0.125, 50 / math.sqrt(3)),
        ("|sin| of the 50 Hz mains", rectified_sine(50.013), 100.0, math.cos(crossing) - 1 + 2 * crossing / math.pi,
         100 * math.sqrt(math.pi**2 / 8 - 1)),
        ("square, full depth", pwm(241.37, 0.5), 100.0, 0.5, 100.0),
        ("PWM, duty 25 %, full depth", pwm(241.37, 0.25), 100.0, 0.75, 100 * math.sqrt(3)),
        ("PWM, duty 30 %, depth 50 %", pwm(241.37, 0.3, 1 / 3), 50.0, 0.2625, 125 * math.sqrt(0.21)),
    )  # fmt: skip
    for name, waveform, depth, index, rms in rows:
        seen = _measured(waveform.at)
        yield Check("waveforms", f"percent flicker, {name}", _BY_HAND, "%", depth, _take("percent_flicker", seen), 0.3)
        yield Check("waveforms", f"flicker index, {name}", _BY_HAND, "1", index, _take("flicker_index", seen), 1e-3)
        yield Check("waveforms", f"RMS modulation, {name}", _BY_HAND, "%", rms, _take("rms_modulation", seen), 0.2)


def _decays() -> Iterator[Check]:
    rows = (
        # duty, frequency [Hz], decay [s], percent flicker, flicker index, relative amplitude of the fundamental
        (0.5, 100.0, 8.5e-3, 0.285920, 0.072493, 0.234330),
        (0.5, 240.0, 8.5e-3, 0.121939, 0.030561, 0.099034),
        (0.2, 240.0, 8.5e-3, 0.193604, 0.048883, 0.145526),
        (0.5, 960.0, 8.5e-3, 0.030628, 0.007658, 0.024829),
        (0.5, 240.0, 1e-3, 0.778545, 0.223618, 0.703677),
        (0.1, 120.0, 1e-3, 0.998894, 0.578636, 1.570803),
    )
    source = "PWM behind one pole: tanh((1 - D) T / 2 tau) and the times of crossing the mean, by hand"
    for duty, frequency, decay, depth, index, line in rows:
        name = f"PWM {frequency:g} Hz, duty {100 * duty:g} %, decay {1e3 * decay:g} ms"
        waveform = pwm(frequency, duty, decay=decay)
        for what, expected, got in (
            ("percent flicker / 100", depth, waveform.percent_flicker / 100),
            ("flicker index", index, waveform.flicker_index),
            ("fundamental", line, float(abs(waveform.amplitudes(1)[0]))),
        ):
            yield Check("decays", f"{what}, {name}", source, "1", expected, got, 1e-6)
    seen = _measured(pwm(121.37, 0.3, decay=1e-3).at)
    source = "decay time of the waveform that was sampled"
    yield Check("decays", "decay time, measured", source, "s", 1e-3, _take("decay_time", seen), 5e-6)


def _risk_curves() -> Iterator[Check]:
    rows = (
        (8.0, 0.2, 0.08), (30.0, 0.75, 0.30), (60.0, 1.50, 0.60), (90.0, 7.2, 2.997), (100.0, 8.0, 3.33),
        (120.0, 9.6, 4.0), (240.0, 19.2, 7.99), (480.0, 38.4, 15.98), (1000.0, 80.0, 33.3), (2000.0, math.inf, 66.6),
    )  # fmt: skip
    source = "IEEE Std 1789-2015 (from memory)"
    low_risk, no_effect = risk_curves()
    for frequency, low, none in rows:
        for name, curve, expected in (("low risk", low_risk, low), ("no observable effect", no_effect, none)):
            if math.isfinite(expected):
                what = f"{name} at {frequency:g} Hz"
                yield Check("risk curves", what, source, "%", expected, curve.at(frequency), 0.002 * expected)


def _visibility_tables() -> Iterator[Check]:
    sines = {80.0: 4.1173, 100.0: 3.9021, 120.0: 3.6273, 200.0: 2.7370, 306.6: 2.0, 1000.0: 1.0275, 2000.0: 1.0002}
    pulses = {  # frequency [Hz]: duty 0.5, 0.25, 0.1
        100.0: (4.9704, 7.1673, 8.2373), 120.0: (4.6200, 6.6396, 7.5655), 240.0: (3.0720, 4.3883, 4.9589),
        480.0: (1.7942, 2.5960, 3.1140), 1000.0: (1.3083, 1.9657, 2.3521), 2000.0: (1.2734, 1.8009, 1.9676),
    }  # fmt: skip
    for frequency, expected in sines.items():
        got = stroboscopic_visibility(np.array([frequency]), np.ones(1))
        yield Check("SVM of exact lines", f"sine of full depth, {frequency:g} Hz", _SVM, "1", expected, got, 1e-4)
    for frequency, row in pulses.items():
        for duty, expected in zip((0.5, 0.25, 0.1), row, strict=True):
            harmonics = np.arange(1, int(2000 / frequency) + 1)
            got = stroboscopic_visibility(harmonics * frequency, pwm(frequency, duty).amplitudes(harmonics.size))
            what = f"PWM {frequency:g} Hz, duty {100 * duty:g} %"
            yield Check("SVM of exact lines", what, _SVM, "1", expected, got, 1e-4)
    later = "power law of Perz et al., J. Opt. Soc. Am. A 35 (2018) 309 (from a public summary)"
    got = stroboscopic_visibility(np.array([240.0]), np.ones(1), power_law_threshold)
    yield Check("SVM of exact lines", "sine of full depth, 240 Hz, the later threshold", later, "1", 2.7791, got, 1e-4)


def _visibility_measured() -> Iterator[Check]:
    for frequency in (100.0, 100.25, 100.5, 411.77):
        seen = _measured(sine(frequency).at, 1.0)
        expected = 1.0 / float(sine_threshold(frequency))
        what = f"sine of full depth, {frequency:g} Hz, 1 s"
        yield Check("SVM, measured", what, _SVM, "1", expected, _take("svm", seen), 0.005 + 0.002 * expected)
    for name, waveform in (
        ("PWM, duty 25 %", pwm(99.97, 0.25)),
        ("PWM, duty 10 %", pwm(479.3, 0.1)),
        ("symmetric triangle", triangle(240.3)),
    ):
        seen = _measured(waveform.at, 1.0)
        harmonics = np.arange(1, int(2000 / waveform.frequency) + 1)
        expected = stroboscopic_visibility(harmonics * waveform.frequency, waveform.amplitudes(harmonics.size))
        what = f"{name}, {waveform.frequency:g} Hz, 1 s"
        yield Check("SVM, measured", what, _SVM, "1", expected, _take("svm", seen), 0.005 + 0.002 * expected)


def _rectangular(changes: float, swing: float) -> FloatArray:
    """Rectangular light of so many changes a minute, each of so much of its mean [%]."""
    times = np.arange(int(_METER_RATE * _METER_DURATION)) / _METER_RATE
    return 1.0 + swing / 200.0 * np.where((times * changes / 120.0 + 0.25) % 1.0 < 0.5, 1.0, -1.0)


def _meter(light: FloatArray) -> float:
    felt = weighted_sensation(light / light.mean(), _METER_RATE)
    return severity_of(felt[-int(180 * _METER_RATE) :])


def _severity_of_light() -> Iterator[Check]:
    rows = {1: 7.2605, 2: 5.8912, 7: 3.8739, 39: 2.3938, 110: 1.9309, 1056: 0.6444, 1620: 0.7334, 2400: 1.0063,
            4000: 1.8833, 4800: 4.2730}  # fmt: skip
    for changes, swing in rows.items():
        what = f"rectangular light, {changes} changes a minute, {swing:g} % of the mean"
        yield Check("Pst LM of light", what, _LIGHT_TABLE, "1", 1.0, _meter(_rectangular(changes, swing)), 0.01)
    times = np.arange(int(_METER_RATE * _METER_DURATION)) / _METER_RATE
    for frequency, depth in {0.5: 6.002, 2.0: 2.1556, 8.8: 0.4175, 20.0: 0.6406, 33.33: 1.1989, 40.0: 2.7203}.items():
        got = _meter(1.0 + depth / 100.0 * np.sin(2 * np.pi * frequency * times))
        what = f"sine, {frequency:g} Hz, depth {depth:g} %"
        yield Check("Pst LM of light", what, _LIGHT_TABLE, "1", 1.0, got, 0.01)


def _severity_of_voltage() -> Iterator[Check]:
    rows = {1: 2.715, 2: 2.191, 7: 1.450, 39: 0.894, 110: 0.722, 1620: 0.407, 4000: 2.343}
    for changes, swing in rows.items():
        got = _meter(light_of_lamp(_rectangular(changes, swing), _METER_RATE))
        what = f"rectangular voltage, {changes} changes a minute, {swing:g} %"
        yield Check("Pst LM through the lamp", what, _VOLTAGE_TABLE, "1", 1.0, got, 0.01)


def _severity_measured() -> Iterator[Check]:
    trace = Trace(_rectangular(1056, 0.6444), _METER_RATE, dark_level=0.0)
    got = _take("pst_lm", Observation(trace))
    yield Check("Pst LM of light", "1056 changes a minute, the whole measurement", _LIGHT_TABLE, "1", 1.0, got, 0.01)


def _filtered() -> Iterator[Check]:
    seen = _measured(pwm(120.137, 0.1).at)
    source = "one line of relative amplitude 2 sin(0.1 pi) / (0.1 pi) is left, by hand"
    expected = 200 * math.sin(0.1 * math.pi) / (0.1 * math.pi)
    got = _take("percent_flicker_below_200hz", seen)
    yield Check("filtered depth", "PWM 120 Hz, duty 10 %, below 200 Hz", source, "%", expected, got, 0.2)
    got = _take("percent_flicker_below_90hz", seen)
    yield Check("filtered depth", "PWM 120 Hz, duty 10 %, below 90 Hz", "no line is left, by hand", "%", 0.0, got, 0.01)
    seen = _measured(rectified_sine(50.013).at)
    source = "two lines are left: 4 / 3 over 26 / 15, by hand"
    got = _take("percent_flicker_below_400hz", _measured(rectified_sine(75.013).at))
    yield Check("filtered depth", "|sin| of 75 Hz, below 400 Hz", source, "%", 100 * 4 / 3 / (26 / 15), got, 0.1)
    got = _take("percent_flicker_below_200hz", seen)
    yield Check(
        "filtered depth", "|sin| of 50 Hz, below 200 Hz", "one line of 2/3 is left, by hand", "%", 200 / 3, got, 0.1
    )


def _frequency_bound() -> Iterator[Check]:
    rate, samples, frequency, ratio = 20_000.0, 2000, 120.37, 10.0
    bound = math.sqrt(6) / math.pi / (ratio * samples / rate * math.sqrt(samples))
    random = np.random.default_rng(1789)
    times = np.arange(samples) / rate
    errors = []
    for _ in range(_RUNS):
        light = 1 + np.cos(2 * np.pi * frequency * times + random.uniform(0, 2 * np.pi))
        series = Series.of(light + random.normal(0, 1 / ratio, samples), rate)
        errors.append(fit_harmonics(series, frequency + 0.8, harmonics=1).frequency - frequency)
    got = float(np.sqrt(np.mean(np.square(errors)))) / bound
    what = f"deviation of {_RUNS} fitted frequencies over the least possible"
    source = "Cramér-Rao bound, Rife and Boorstyn, IEEE Trans. Inf. Theory 20 (1974) 591 (from memory)"
    yield Check("frequency", what, source, "1", 1.0, got, 0.2)


def _bands() -> Iterator[Check]:
    rows = (
        # frequency [Hz], duty, exposure [s], contrast [%], half a printed digit
        (1000.0, 0.05, 5.005e-3, 0.990, 0.0005), (1000.0, 0.02, 5.005e-3, 2.44, 0.005),
        (1000.0, 0.10, 5.025e-3, 2.44, 0.005),
        (240.0, 0.05, 1 / 50, 11.11, 0.005), (240.0, 0.30, 1 / 50, 7.14, 0.005), (240.0, 0.05, 1 / 250, 66.67, 0.005),
        (1000.0, 0.05, 1 / 48, 2.44, 0.005), (1000.0, 0.30, 1 / 48, 1.34, 0.005),
    )  # fmt: skip
    many = Camera(lines=2000, line_time=8e-6, frame_rate=25.0)
    for frequency, duty, exposure, expected, digit in rows:
        got = predict_bands(pwm_light(frequency, duty), many, exposure).contrast_percent["all"]
        what = f"contrast, PWM {frequency:g} Hz, duty {100 * duty:g} %, exposure {1e3 * exposure:.5g} ms"
        yield Check("bands", what, _BANDS, "%", expected, got, digit)
    yield from _band_movement()


def _band_movement() -> Iterator[Check]:
    camera = Camera(lines=1080, line_time=15e-6, frame_rate=25.0)
    seen = predict_bands(pwm_light(1003.0, 0.3), camera, exposure=1 / 5000)
    source = "period 1 / (f t), drift by the phase that is left over a frame, by hand"
    for what, unit, expected, got, digit in (
        ("band period, 1003 Hz, 15 µs a line", "lines", 66.467, seen.band_period_lines, 0.0005),
        ("band drift, 1003 Hz, 25 frames/s", "lines", -7.976, seen.drift_lines_per_frame, 0.0005),
        ("beat, 1003 Hz, 25 frames/s", "Hz", 3.0, seen.beat_frequency_hz, 1e-9),
    ):
        yield Check("bands", what, source, unit, expected, got, digit)
