import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.limits import Curve, known_limits, risk_curves

# Worked values of the two rules of IEEE Std 1789-2015 (from memory of the standard): 0.025 f below 90 Hz, 0.08 f to
# 1250 Hz for low risk; 0.01 f and f / 30 to 3000 Hz for no observable effect.
WORKED = [
    (8.0, 0.2, 0.08),
    (10.0, 0.25, 0.10),
    (50.0, 1.25, 0.50),
    (60.0, 1.50, 0.60),
    (89.99, 2.24975, 0.8999),
    (90.0, 7.2, 3.0),
    (100.0, 8.0, 10 / 3),
    (120.0, 9.6, 4.0),
    (240.0, 19.2, 8.0),
    (1000.0, 80.0, 100 / 3),
    (1249.99, 99.9992, 41.6663333),
    (1250.0, math.inf, 125 / 3),
    (2999.99, math.inf, 99.9996667),
    (3000.0, math.inf, math.inf),
]


@pytest.mark.parametrize(("frequency", "low_risk", "no_effect"), WORKED)
def test_the_curves_of_ieee_1789_give_their_worked_values(frequency, low_risk, no_effect):
    curves = risk_curves()
    assert curves[0].at(frequency) == pytest.approx(low_risk, rel=1e-9)
    assert curves[1].at(frequency) == pytest.approx(no_effect, rel=1e-9)


def test_the_slope_of_no_observable_effect_is_between_the_two_printed_ones():
    # IEEE Std 1789-2015 is quoted with 0.0333 f and with 0.08 f / 2.5 (both from memory); the first rounds 1/30
    (band,) = [band for band in known_limits()["ieee1789-no-effect"].bound.bands if band.end == 3000.0]
    assert band.slope == pytest.approx(1 / 30, rel=1e-12)
    assert band.slope == pytest.approx(0.0333, rel=2e-3)
    assert "0.032" in band.note


def test_the_national_curve_is_continuous_and_ends_at_3125_hz():
    # GB 40070-2021 (from memory): 0.288 % to 9 Hz, then 0.08 f / 2.5 to 3125 Hz, above that exempt
    curve = known_limits()["gb-40070-depth"].bound
    assert curve.at(5.0) == 0.288
    assert curve.at(9.0) == pytest.approx(0.288, rel=1e-12)
    assert curve.at(100.0) == pytest.approx(3.2, rel=1e-12)
    assert curve.at(3124.9) == pytest.approx(99.9968, rel=1e-9)
    assert math.isinf(curve.at(3125.0))


CURVES = [limit.bound for limit in known_limits().values() if isinstance(limit.bound, Curve)]


@given(curve=st.sampled_from(CURVES), low=st.floats(0.1, 4000), width=st.floats(0, 200), share=st.floats(0, 1))
def test_the_allowance_between_two_frequencies_encloses_every_one_inside(curve, low, width, share):
    smallest, largest = curve.between(low, low + width)
    assert smallest <= curve.at(low + share * width) <= largest


def test_the_allowance_across_a_step_reaches_from_one_side_to_the_other():
    low_risk, _ = risk_curves()
    assert low_risk.between(89.0, 91.0) == pytest.approx((89 * 0.025, 91 * 0.08))
    assert low_risk.step_between(89.0, 91.0) == 90.0
    assert low_risk.step_between(80.0, 89.9) is None
    assert low_risk.step_between(1249.0, 1251.0) is None  # the ramp ends at 100 %, and no depth exceeds that
