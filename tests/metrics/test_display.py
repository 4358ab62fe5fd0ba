"""Display flicker: weights from memory of JEITA ED-2522 and VESA FPDM, the rest by hand."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.errors import NotMeasurable
from flicker.metrics import Observation
from flicker.metrics.display import display_flicker_contrast, display_flicker_level, display_weight
from flicker.waveforms import sampled, sine

WEIGHTS = {0: 0, 20: 0, 25: -1.5, 30: -3, 40: -6, 50: -12, 55: -26, 60: -40, 240: -40}  # [Hz]: [dB]


def observed(light, seed=1):
    return Observation(sampled(light, sample_rate=5000.0, duration=2.0, noise=1e-3, seed=seed))


@pytest.mark.parametrize("frequency", WEIGHTS)
def test_weights(frequency):
    assert display_weight(frequency) == pytest.approx(WEIGHTS[frequency], abs=1e-9), "from memory"


@given(frequency=st.floats(5.0, 120.0), depth=st.floats(0.02, 0.9), seed=st.integers(0, 1000))
@settings(max_examples=12, deadline=None)
def test_a_sine(frequency, depth, seed):
    got = display_flicker_level(observed(sine(frequency, depth).at, seed))
    assert got.value == pytest.approx(20 * math.log10(depth) + display_weight(frequency), abs=0.05)


def test_a_weak_slow_line_outweighs_a_strong_fast_one():
    got = display_flicker_level(observed(lambda times: sine(30.0, 0.01).at(times) + sine(60.1, 0.1).at(times) - 1))
    assert got.value == pytest.approx(20 * math.log10(0.01) - 3, abs=0.1)
    assert "30" in got.method


def test_contrast_is_the_swing_over_the_middle():
    got = display_flicker_contrast(observed(sine(60.1, 0.3).at))
    assert got.value == pytest.approx(60.0, abs=0.1), "by hand: (1.3 - 0.7) / 1"
    assert got.low <= 60.0 <= got.high


def test_steady_light_has_no_level():
    with pytest.raises(NotMeasurable, match="below -"):
        display_flicker_level(observed(lambda times: np.ones(times.shape)))
