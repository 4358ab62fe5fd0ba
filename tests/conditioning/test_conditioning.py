"""Conditioning: light of known truth, spoilt as instruments spoil it, comes back or is doubted by name."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.conditioning import condition
from flicker.errors import InputError
from flicker.results import DEPTH_MEASURES
from flicker.trace import Capture, Segment, Trace
from flicker.waveforms import pwm, rectified_sine, sampled, sine, triangle

RATE = 48_000.0


def capture_of(*traces, kind="csv"):
    return Capture(tuple(traces), kind=kind)


def display(duty=0.3, low_level=0.2, **options):
    """A display's light without a stated dark level, mean 1."""
    options = {"sample_rate": RATE, "duration": 0.4, "noise": 0.002, "seed": 1, "unit": "V", **options}
    return dataclasses.replace(sampled(pwm(239.7, duty, low_level).at, **options), dark_level=None)


def conditioned(trace, kind="csv", **options):
    return condition(capture_of(trace, kind=kind), **options).traces[0]


def codes(trace):
    return [note.code for note in trace.notes]


def high_passed(light, corner, rate=RATE):
    """First-order AC coupling by its difference equation, with the capacitor charged to the mean."""
    from scipy.signal import lfilter

    decay = np.exp(-2 * np.pi * corner / rate)
    gain = 0.5 * (1 + decay)
    return lfilter([gain, -gain], [1, -decay], light - light.mean())


# dark level and sign


def test_without_a_dark_level_zero_is_taken_and_said():
    trace = conditioned(display())
    assert trace.dark_level is None
    (note,) = trace.notes
    assert (note.code, note.severity, note.voids) == ("dark-assumed", "info", ())
    assert "--dark-level" in note.message


@given(depth=st.floats(0.05, 0.9))
@settings(max_examples=20)
def test_the_note_on_the_dark_level_tells_what_one_percent_changes(depth):
    light = dataclasses.replace(sampled(sine(100, depth).at, sample_rate=RATE, duration=0.2), dark_level=None)
    (note,) = (note for note in conditioned(light).notes if note.code == "dark-assumed")
    points = float(note.message.split("would be ")[1].split()[0])
    # percent flicker m of a sine over a mean of 0.99 (definition, by hand)
    assert points == pytest.approx(100 * depth / 0.99 - 100 * depth, rel=0.06)


def test_a_stated_dark_level_is_kept_beside_the_readings():
    recorded = display(dark_level=0.25)
    trace = conditioned(recorded, dark_level=0.25)
    assert trace.dark_level == 0.25
    assert trace.light is not recorded.light or np.array_equal(trace.light, recorded.light)
    assert trace.above_dark.mean() == pytest.approx(1.0, abs=0.01)
    assert not trace.notes
    assert trace.history[-1] == "dark level 0.25 V"


def test_a_dark_capture_gives_the_dark_level_channel_by_channel():
    red, blue = (dataclasses.replace(display(), name=name) for name in ("red", "blue"))
    covered = [Trace(np.full(500, level), RATE, name=name, unit="V") for name, level in (("blue", 0.3), ("red", 0.1))]
    got = condition(capture_of(red, blue), dark_capture=capture_of(*covered)).traces
    assert [trace.dark_level for trace in got] == pytest.approx([0.1, 0.3])


def test_a_dark_capture_of_one_channel_serves_all():
    covered = capture_of(Trace(np.full(500, 0.1), RATE, name="sensor", unit="V"))
    assert conditioned(display(), dark_capture=covered).dark_level == pytest.approx(0.1)


def test_a_dark_capture_that_does_not_fit_is_refused():
    other = [Trace(np.ones(9), RATE, name=name) for name in ("one", "two")]
    with pytest.raises(InputError, match="no channel 'light', only one, two"):
        conditioned(display(), dark_capture=capture_of(*other))
    with pytest.raises(InputError, match="in mV, the capture in V"):
        conditioned(display(), dark_capture=capture_of(Trace(np.ones(9), RATE, unit="mV")))


@pytest.mark.parametrize("dark", [None, -0.05])
def test_an_inverted_capture_asks_for_the_option_and_comes_back_with_it(dark):
    upright = display(dark_level=0.05)
    recorded = dataclasses.replace(upright, light=-upright.light, dark_level=None)
    (note, *_) = conditioned(recorded).notes
    assert (note.code, note.severity, note.voids) == ("negative-light", "error", DEPTH_MEASURES)
    assert "--inverted" in note.message
    trace = conditioned(recorded, inverted=True, dark_level=dark)
    assert "negative-light" not in codes(trace)
    assert np.array_equal(trace.light, upright.light)
    if dark is not None:
        assert trace.above_dark.mean() == pytest.approx(1.0, abs=0.01)


def test_inverted_where_it_is_not_is_said():
    (note, *_) = conditioned(display(), inverted=True).notes
    assert note.code == "negative-light"
    assert "leave --inverted out" in note.message


def test_a_dark_level_above_the_light_is_said():
    (note, *_) = conditioned(display(), dark_level=5.0).notes
    assert note.code == "negative-light"
    assert "check --dark-level" in note.message


def test_readings_below_dark_void_every_depth():
    (note, *_) = conditioned(display(low_level=0.2), dark_level=0.6).notes
    assert (note.code, note.severity) == ("negative-light", "error")
    assert set(note.voids) == set(DEPTH_MEASURES)


def test_noise_about_a_dark_floor_is_no_negative_light():
    trace = conditioned(display(duty=0.05, low_level=0.0, noise=0.02))
    assert codes(trace) == ["dark-assumed"]


# coupling


@pytest.mark.parametrize("duty", [0.05, 0.5, 0.95])
@pytest.mark.parametrize("kind", ["csv", "wav"])
def test_ac_coupling_is_recognised_and_voids_depths(duty, kind):
    light = display(duty, 0.0).light
    trace = conditioned(Trace(light - light.mean() + 0.002, RATE), kind)
    assert not trace.mean_known
    (note, *_) = (note for note in trace.notes if note.code == "ac-coupled")
    assert set(note.voids) == set(DEPTH_MEASURES)
    assert "fundamental_frequency" not in note.voids
    assert "duty_cycle" not in note.voids
    assert ("--dc-coupled" in note.message) == (kind == "wav")


def test_a_sound_file_that_never_crosses_zero_is_believed_with_a_note():
    trace = conditioned(display(), "wav", dark_level=0.0)
    assert trace.mean_known
    assert codes(trace) == ["coupling-assumed"]
    assert not conditioned(display(), "wav", dark_level=0.0, dc_coupled=True).notes


def test_a_sound_file_that_crosses_zero_is_taken_as_coupled_unless_stated():
    light = Trace(display(0.3, 0.0).light - 0.1, RATE)
    assert codes(conditioned(light, "wav")) == ["ac-coupled"]
    assert codes(conditioned(light, "wav", dc_coupled=True)) == ["negative-light"]
    assert codes(conditioned(light, "wav", dc_coupled=True, dark_level=-0.1)) == []


@given(duty=st.floats(0.05, 0.95), mean=st.floats(0.1, 10), whole=st.floats(20, 90))
@settings(max_examples=25, deadline=None)
def test_a_stated_mean_restores_the_light(duty, mean, whole):
    light = sampled(pwm(239.7, duty).at, sample_rate=RATE, duration=whole / 239.7, mean=mean).light
    cycle = round(RATE / 239.7)
    trace = conditioned(Trace(light - light[: cycle * 10].mean(), RATE), mean=mean)
    assert trace.mean_known
    assert trace.dark_level == 0.0
    assert trace.light == pytest.approx(light, abs=0.02 * mean / duty)


@pytest.mark.parametrize("corner", [2.0, 10.0, 20.0])
@pytest.mark.parametrize("duty", [0.2, 0.5, 0.7])
def test_droop_is_undone_with_a_stated_and_with_a_fitted_corner(corner, duty):
    light = sampled(pwm(97.3, duty).at, sample_rate=RATE, duration=0.7, noise=0.001, seed=3).light
    coupled = Trace(high_passed(light, corner), RATE)
    wanted = light - light.mean()
    swing = 1 / duty
    droop = np.abs(coupled.light - wanted).max()
    for options in ({"coupling_corner": corner}, {}):
        trace = conditioned(coupled, "wav", **options)
        off = trace.light - wanted
        assert np.abs(off - off.mean()).max() < 0.02 * swing < droop, options
        assert not trace.mean_known
    assert "fitted to the plateaus" in trace.history[-1]
    found = float(trace.history[-1].split(" at ")[1].split()[0])
    assert found == pytest.approx(corner, rel=0.1)


@pytest.mark.parametrize("frequency", [47.3, 100.0, 239.7])
@pytest.mark.parametrize(
    "make",
    [
        lambda frequency: sine(frequency, 0.5),
        triangle,
        lambda frequency: rectified_sine(frequency / 2),
        *(
            lambda frequency, d=duty, k=decay: pwm(frequency, d, decay=k / frequency)
            for duty in (0.05, 0.3, 0.8)
            for decay in (0, 0.1, 0.5)
        ),
    ],
)
def test_no_droop_is_found_where_there_is_none(make, frequency):
    readings = sampled(make(frequency).at, sample_rate=RATE, duration=0.7, noise=0.001, seed=3).light
    trace = conditioned(Trace(readings - readings.mean(), RATE), "wav")
    assert not any("droop" in line for line in trace.history)


def test_a_mean_for_a_capture_that_has_one_is_doubted():
    trace = conditioned(display(), mean=2.0)
    assert codes(trace) == ["mean-replaced"]
    assert trace.above_dark.mean() == pytest.approx(2.0, abs=0.01)


# a part


def test_a_part_is_cut_by_true_times():
    trace = Trace(np.arange(100.0) + 1, 10.0, segments=(Segment(0, -2.0), Segment(50, 10.0)))
    got = conditioned(trace, start=0.0, duration=11.0)
    assert got.light[0] == 21
    assert got.light[-1] == 60
    assert got.segments == (Segment(0, 0.0), Segment(30, 10.0))
    assert got.times()[-1] == pytest.approx(10.9)


@given(start=st.floats(-1, 3), duration=st.floats(0.01, 3), first=st.floats(-1, 1))
@settings(max_examples=50)
def test_a_part_holds_exactly_the_samples_between_its_ends(start, duration, first):
    trace = Trace(np.arange(1000.0) + 1, 500.0, segments=(Segment(0, first),))
    inside = (trace.times() >= start - 1e-8) & (trace.times() < start + duration - 1e-8)
    if not inside.any():
        with pytest.raises(InputError, match=r"runs from .* s to .* s: check --start and --duration"):
            conditioned(trace, start=start, duration=duration)
    else:
        assert np.array_equal(conditioned(trace, start=start, duration=duration).light, trace.light[inside])


def test_a_part_leaves_doubts_about_the_rest_behind():
    from flicker.results import Note

    light = np.concatenate([np.linspace(1, 2, 500), np.full(20, 5.0), np.linspace(2, 1, 480)])
    trace = Trace(light, 1000.0, notes=(Note("clipped", "error", "20 readings", DEPTH_MEASURES),))
    assert "clipped" in codes(conditioned(trace, start=0.3))
    assert "clipped" in codes(conditioned(trace, start=0.51))
    assert "clipped" not in codes(conditioned(dataclasses.replace(trace, light=np.r_[0.5, light[1:]]), start=0.6))


# the instrument


def test_full_scale_of_a_sound_file_is_clipped():
    light = np.clip(display().light * 0.6, -1, 1 - 2**-15)
    (note, *_) = conditioned(Trace(light, RATE), "wav").notes
    assert (note.code, note.severity, note.voids) == ("clipped", "error", DEPTH_MEASURES)


def test_flat_tops_without_a_mark_are_doubted():
    smooth = sampled(sine(100, 0.6).at, sample_rate=RATE, duration=0.2, noise=0.001, seed=2).light
    trace = conditioned(Trace(np.minimum(smooth, 1.4), RATE))
    (note,) = (note for note in trace.notes if note.code == "clipped")
    assert note.severity == "warning"
    assert "clipped" not in codes(conditioned(Trace(smooth, RATE)))


@pytest.mark.parametrize(
    "light",
    [
        display(noise=0.0, seed=None).light,
        display(bits=8).light,
        sampled(sine(100, 0.6).at, sample_rate=RATE, duration=0.2, bits=8).light,
        sampled(pwm(100, 0.3, decay=1e-3).at, sample_rate=RATE, duration=0.2).light,
    ],
)
def test_plateaus_that_are_light_are_not_taken_for_rails(light):
    assert "clipped" not in codes(conditioned(Trace(light, RATE)))


def test_coarse_steps_are_said():
    coarse = sampled(sine(100, 0.1).at, sample_rate=RATE, duration=0.2, bits=6).light
    (note,) = (note for note in conditioned(Trace(coarse, RATE)).notes if note.code == "low-resolution")
    assert "steps of the converter" in note.message
    fine = sampled(sine(100, 0.5).at, sample_rate=RATE, duration=0.2, bits=8).light
    assert "low-resolution" not in codes(conditioned(Trace(fine, RATE)))


@pytest.mark.parametrize("change", [0.05, -0.12])
def test_drift_is_told_apart_from_flicker(change):
    flicker = display(duration=1.0)
    ramp = 1 + change * np.linspace(0, 1, flicker.samples)
    (note,) = (note for note in conditioned(Trace(flicker.light * ramp, RATE)).notes if note.code == "drift")
    assert ("rose" if change > 0 else "fell") in note.message
    said = float(note.message.split(" by ")[1].split()[0])
    assert said == pytest.approx(100 * abs(change), rel=0.15)
    assert "drift" not in codes(conditioned(flicker))


@pytest.mark.parametrize("frequency", [1.7, 2.0, 3.3, 7.9, 30.0])
def test_slow_flicker_is_no_drift(frequency):
    light = sampled(sine(frequency, 0.3).at, sample_rate=2000, duration=1.0)
    assert "drift" not in codes(conditioned(light))


# words


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"dark_level": 1.0, "dark_capture": capture_of(display())}, "stated twice"),
        ({"dark_level": float("nan")}, "must be a number"),
        ({"mean": -1.0}, "above 0"),
        ({"coupling_corner": 0.0}, "above 0 Hz"),
        ({"duration": 0.0}, "above 0 s"),
    ],
)
def test_options_that_cannot_be_right_are_refused(options, words):
    with pytest.raises(InputError, match=words):
        conditioned(display(), **options)


def test_history_tells_what_was_done_in_order():
    trace = conditioned(display(), start=0.1, dark_level=-0.2, inverted=True)
    assert [line.split()[0] for line in trace.history] == ["used", "dark", "negated,"]


def test_a_pulse_cut_flat_beside_a_noisy_dark_plateau_is_noted():
    """An 8-bit oscilloscope that was driven beyond its range: the tops are one value, the dark ones are not."""
    times = np.arange(5000) / 20_000.0
    rng = np.random.default_rng(8)
    light = 0.2 + 0.8 * (times * 239.7 % 1 < 0.45) + rng.normal(0, 0.01, times.size)
    coarse = np.round(light / 0.004) * 0.004
    assert "clipped" not in codes(conditioned(Trace(coarse, 20_000.0)))
    assert "clipped" in codes(conditioned(Trace(np.minimum(coarse, 0.6), 20_000.0)))
    quiet = np.round((0.2 + 0.8 * (times * 239.7 % 1 < 0.45) + rng.normal(0, 0.0005, times.size)) / 0.004) * 0.004
    assert "clipped" not in codes(conditioned(Trace(quiet, 20_000.0))), "steps wider than the noise are no clipping"
