import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.limits import risk_curves, risk_region
from flicker.results import Component, Family, Measure


def family(frequency, depth, frequency_spread=0.0):
    fundamental = Measure(frequency, "Hz", frequency - frequency_spread, frequency + frequency_spread)
    return Family(fundamental, Measure(depth, "%", depth, depth), 1, "")


# IEEE Std 1789-2015 (figures from memory); typical sources of the trade (common practice, no source)
PLACES = [
    ("full-depth PWM of a display", 240.0, 100.0, "above-low-risk"),
    ("full-depth PWM of a display", 1250.0, 100.0, "low-risk"),
    ("full-depth PWM of a display", 3000.0, 100.0, "no-observable-effect"),
    ("filament lamp at 50 Hz mains", 100.0, 10.0, "above-low-risk"),
    ("filament lamp at 60 Hz mains", 120.0, 6.6, "low-risk"),
    ("good driver", 100.0, 2.0, "no-observable-effect"),
    ("beat", 20.0, 0.3, "low-risk"),
]


@pytest.mark.parametrize(("what", "frequency", "depth", "region"), PLACES)
def test_a_light_falls_into_its_region(what, frequency, depth, region):
    place = risk_region((), (family(frequency, depth),))
    assert place.region == region, what
    assert (place.frequency, place.modulation) == (frequency, depth)


def test_steady_light_has_no_effect_at_no_frequency():
    assert risk_region((), ()).to_dict() | {"reading": ""} == {
        "standard": "IEEE 1789-2015",
        "region": "no-observable-effect",
        "frequency_hz": None,
        "modulation_percent": None,
        "low_risk_bound_percent": None,
        "no_effect_bound_percent": None,
        "ambiguous_with": None,
        "reading": "",
    }


def test_a_faint_slow_line_outweighs_a_deep_fast_family():
    place = risk_region((Component(4000.0, 1.2 + 0j), Component(60.0, 0.02 + 0j)), (family(4000.0, 100.0),))
    assert (place.region, place.frequency) == ("above-low-risk", 60.0)
    assert place.modulation == pytest.approx(2.0)
    assert place.low_risk_bound == pytest.approx(1.5)


def test_bounds_are_unlimited_where_the_standard_sets_none():
    place = risk_region((), (family(2000.0, 100.0),))
    assert (place.region, place.low_risk_bound) == ("low-risk", None)
    assert place.no_effect_bound == pytest.approx(200 / 3)


def test_across_the_step_the_stricter_side_decides_and_the_other_is_named():
    place = risk_region((), (family(90.05, 5.0, frequency_spread=0.1),))
    assert (place.region, place.other) == ("above-low-risk", "low-risk")
    assert risk_region((), (family(90.05, 5.0),)).region == "low-risk"
    assert risk_region((), (family(90.05, 5.0),)).other is None


def test_a_depth_that_is_not_known_has_no_region():
    lost = Family(Measure(240.0, "Hz", 239.9, 240.1), Measure.missing("%", "the mean is not known"), 3, "")
    assert risk_region((Component(240.0, 0.1 + 0j),), (lost,)) is None


@given(
    st.lists(st.tuples(st.floats(1.0, 5000.0), st.floats(0.01, 100.0)), min_size=1, max_size=6),
    st.floats(1.0, 5000.0),
    st.floats(0.01, 100.0),
)
def test_one_more_family_never_makes_the_region_milder(families, frequency, depth):
    order = ("no-observable-effect", "low-risk", "above-low-risk")
    before = risk_region((), [family(*one) for one in families])
    after = risk_region((), [family(*one) for one in (*families, (frequency, depth))])
    assert order.index(after.region) >= order.index(before.region)
    low_risk, no_effect = (curve.at(frequency) for curve in risk_curves())
    alone = risk_region((), [family(frequency, depth)]).region
    assert alone == order[(depth > no_effect) + (depth > low_risk)]
