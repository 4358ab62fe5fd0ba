"""Verdicts on captures with noise, through the public functions: inside, on and outside every limit."""

import math

import pytest

import flicker
from flicker.trace import Capture
from flicker.waveforms import sampled, sine

# depth [%] that a sine of this frequency [Hz] may have; curves of each document as its sheet states them (from memory)
ON_THE_LIMIT = [
    ("ieee1789-low-risk", 60.0, 1.5),
    ("ieee1789-low-risk", 120.0, 9.6),
    ("ieee1789-low-risk", 1003.7, 80.296),
    ("ieee1789-no-effect", 60.0, 0.6),
    ("ieee1789-no-effect", 240.0, 8.0),
    ("ieee1789-no-effect", 2003.7, 66.79),
    ("ieee1789-seizure", 40.0, 5.0),
    ("gb-40070-depth", 100.0, 3.2),
    ("gb-40070-depth", 3003.3, 96.1056),
    ("wcag-2-flash", 15.0, 100 / 17),
    ("itu-r-bt-1702-flash", 30.0, 100 / 17),
    # 0.4 and 1.6 times the threshold of a sine at 100 Hz, 0.25628 (IEC TR 63158:2018, from memory)
    ("eu-2019-2020-svm", 100.0, 10.251),
    ("nema-c82-77-6-svm-indoor", 100.0, 41.005),
    # a single line below the cut is a sine: its depth is its percent flicker (definition)
    ("california-ja8-below-200hz", 121.7, 30.0),
]


def verdict(name, frequency, depth, seed, *, duration=1.0, noise=0.003):
    light = sine(frequency, depth / 100)
    trace = sampled(light.at, sample_rate=20_000.0, duration=duration, start=0.00123, noise=noise, seed=seed)
    report = flicker.check(flicker.measure(Capture((trace,))), [name])
    return report.captures[0].channels[0].verdicts[0]


@pytest.mark.parametrize(("name", "frequency", "depth"), ON_THE_LIMIT)
def test_a_light_just_inside_passes_one_on_the_limit_hardly_one_just_outside_fails(name, frequency, depth):
    assert verdict(name, frequency, 0.97 * depth, 1).verdict == "pass"
    assert verdict(name, frequency, 1.03 * depth, 2).verdict == "fail"
    on = [verdict(name, frequency, depth, seed) for seed in range(10, 16)]
    assert [one.verdict for one in on].count("undecided") >= 4
    assert all(one.value == pytest.approx(one.bound, rel=0.02) for one in on)


# depth of a sine that reads Pst LM = 1, from the meter of IEC TR 61547-1 in its steady state (constants from memory)
@pytest.mark.parametrize("name", ["eu-2019-2020-pst-lm", "gb-40070-pst-lm", "nema-c82-77-6-pst"])
@pytest.mark.parametrize(("factor", "expected"), [(0.9, "pass"), (1.1, "fail")])
def test_the_severity_passes_below_one_and_fails_above(name, factor, expected):
    light = sine(8.8, factor * 0.4175 / 100)
    trace = sampled(light.at, sample_rate=1000.0, duration=200.0, noise=1e-4, seed=1)
    report = flicker.check(flicker.measure(Capture((trace,))), [name])
    assert report.captures[0].channels[0].verdicts[0].verdict == expected


def test_at_a_true_value_on_the_limit_a_pass_is_rare():
    verdicts = [verdict("ieee1789-low-risk", 121.7, 9.736, seed, duration=0.05).verdict for seed in range(500)]
    assert verdicts.count("pass") <= 20  # 4 % of 500


def test_a_slow_capture_is_no_pass_and_a_short_one_knows_no_flashes():
    trace = sampled(sine(100.0, 0.01).at, sample_rate=1000.0, duration=0.4, noise=0.001, seed=3)
    report = flicker.check(flicker.measure(Capture((trace,))), ["ieee1789-low-risk", "wcag-2-flash"])
    slow, short = report.captures[0].channels[0].verdicts
    assert (slow.verdict, short.verdict) == ("undecided", "undecided")
    assert "2500 Hz" in slow.reason
    assert "nothing slower than 3.75 Hz" in short.reason


def test_a_capture_without_its_mean_is_undecided_for_every_limit():
    trace = sampled(sine(100.0, 0.3).at, sample_rate=20_000.0, duration=0.2, noise=0.001, seed=3)
    trace = trace.replace(mean_known=False)
    report = flicker.check(flicker.measure(Capture((trace,))))
    assert {one.verdict for one in report.captures[0].channels[0].verdicts} == {"undecided"}


def test_the_step_at_90_hz_is_undecided_within_the_interval_of_the_frequency():
    light = sine(90.0, 0.05)
    trace = sampled(light.at, sample_rate=20_000.0, duration=0.3, noise=0.003, seed=1)
    report = flicker.check(flicker.measure(Capture((trace,)), clock_ppm=50.0), ["ieee1789-low-risk"])
    (found,) = report.captures[0].channels[0].verdicts
    assert found.verdict == "undecided"
    assert math.isclose(found.frequency, 90.0, rel_tol=1e-3)
