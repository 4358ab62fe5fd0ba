"""The light behind harmonics: pulses and what else fits, lags, what coding does. Truths: closed forms."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.light import Pulse
from flicker.signal.stripes_coding import Coding
from flicker.signal.stripes_drive import common_drive
from flicker.signal.stripes_figures import Samples, figures_of
from flicker.signal.stripes_shape import Harmonics, fit_pulse

NUMBERS = np.arange(1.0, 21.0)
FREQUENCY = 200.0


def seen(light, exposure, error, seed=0):
    rng = np.random.default_rng(seed)
    left = np.sinc(NUMBERS * light.frequency * exposure)
    noise = error * (rng.standard_normal(NUMBERS.size) + 1j * rng.standard_normal(NUMBERS.size))
    amplitudes = light.amplitudes(NUMBERS) * left + noise
    return Harmonics(NUMBERS, amplitudes, np.full(NUMBERS.size, error**2), light.frequency)


@given(duty=st.floats(0.1, 0.8), low=st.floats(0.0, 0.6), turns=st.floats(0.05, 0.4))
def test_a_pulse_comes_back_through_its_exposure(duty, low, turns):
    light = Pulse(FREQUENCY, duty, low)
    fit = fit_pulse(seen(light, turns / FREQUENCY, 5e-4), turns / FREQUENCY)
    assert fit.chi_square < 3
    found = Pulse(FREQUENCY, fit.duty, fit.low_level)
    assert found.percent_flicker == pytest.approx(light.percent_flicker, abs=3)
    assert fit.duty == pytest.approx(duty, abs=0.015)


def test_intervals_hold_the_truth_as_often_as_they_say():
    """Few harmonics leave duty and depth to trade places; the interval must reach all that fit."""
    rng = np.random.default_rng(1)
    inside = 0
    for number in range(60):
        low = float(rng.choice([0.0, rng.uniform(0.0, 0.95)]))
        light = Pulse(FREQUENCY, rng.uniform(0.08, 0.92), low)
        turns = rng.uniform(0.1, 1.6)
        shown = seen(light, turns / FREQUENCY, 3e-3, seed=number)
        shape = fit_pulse(shown, turns / FREQUENCY)
        depth = figures_of(Samples.of(shape, FREQUENCY, seed=2), FREQUENCY, 0.0, 0.0, [])["percent_flicker"]
        inside += depth.low - 0.01 <= light.percent_flicker <= depth.high + 0.01
    assert inside >= 54


def lagging(decay, error=1e-4, slow_error=1e-4):
    rng = np.random.default_rng(3)
    fast, slow = Pulse(FREQUENCY, 0.3), Pulse(FREQUENCY, 0.3, 0.0, decay)
    amplitudes = np.array([slow.amplitudes(NUMBERS), fast.amplitudes(NUMBERS), fast.amplitudes(NUMBERS)])
    errors = np.array([slow_error, error, error])
    noise = rng.standard_normal((3, NUMBERS.size)) + 1j * rng.standard_normal((3, NUMBERS.size))
    covariances = np.tile(np.diag(errors**2), (NUMBERS.size, 1, 1))
    return common_drive(
        ("red", "green", "blue"), amplitudes + errors[:, None] * noise, covariances, NUMBERS, FREQUENCY, 0
    )


@pytest.mark.parametrize("decay", [1e-3, 8.5e-3])
def test_a_slow_emitter_shares_the_drive_and_lags(decay):
    """One pole divides harmonic h by 1 + 2j pi h f tau (an ordinary RC section, by hand)."""
    drive = lagging(decay)
    assert set(drive.lags) == {"red", "green", "blue"}
    lag = drive.lags["red"]
    assert lag.decay == pytest.approx(decay, rel=0.02)
    assert lag.decay - 3 * lag.down <= decay <= lag.decay + 3 * lag.up
    assert drive.lags["green"].decay == drive.lags["blue"].decay == 0.0
    np.testing.assert_allclose(drive.seen.amplitudes, Pulse(FREQUENCY, 0.3).amplitudes(NUMBERS), atol=5e-4)


def test_a_channel_that_shows_nothing_is_given_no_lag():
    assert "red" not in lagging(8.5e-3, slow_error=3.0).lags


def test_another_drive_is_not_taken_for_the_same():
    amplitudes = np.array([Pulse(FREQUENCY, duty).amplitudes(NUMBERS) for duty in (0.5, 0.3, 0.3)])
    covariances = np.tile(np.eye(3) * 1e-8, (NUMBERS.size, 1, 1))
    drive = common_drive(("red", "green", "blue"), amplitudes, covariances, NUMBERS, FREQUENCY, 0)
    assert set(drive.lags) == {"green", "blue"}


def test_coding_spares_luma_and_opposes_the_errors_of_colours():
    """Luma is 0.2126 R + 0.7152 G + 0.0722 B of the code values, ITU-R BT.709-6."""
    levels = Coding.levels_of(np.full(3, 0.16), "bt709", full_range=False)
    coding = Coding("bt709", False, False, levels)
    covariance = coding.covariances(np.full((3, 1), 0.05 + 0j), np.array([100.0]))[0]
    luma = np.array([0.2126, 0.7152, 0.0722])
    assert luma @ covariance @ luma < 0.2 * covariance[1, 1]
    assert covariance[2, 2] > covariance[1, 1]
    short = coding.covariances(np.full((3, 1), 0.05 + 0j), np.array([6.0]))[0]
    assert (np.diag(short) > np.diag(covariance)).all()
    kept = Coding("bt709", False, True, levels).covariances(np.full((3, 1), 0.05 + 0j), np.array([100.0]))[0]
    assert (np.diag(kept) < np.diag(covariance)).all()
