import dataclasses

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.errors import InputError
from flicker.limits import Conditions, default_limits, judge, known_limits, overall
from flicker.limits.limit import Limit
from flicker.results import Component, Family, Measure

LIMITS = known_limits()
DEPTH = Limit("house", "house", "percent_flicker", 30.0, "1", "all", "house", "house", "text seen")


def family(frequency, depth, spread=0.0, frequency_spread=0.0):
    fundamental = Measure(frequency, "Hz", frequency - frequency_spread, frequency + frequency_spread)
    return Family(fundamental, Measure(depth, "%", depth - spread, depth + spread), 1, "")


def depth(value, spread=0.0):
    return {"percent_flicker": Measure(value, "%", value - spread, value + spread)}


# a number: inside, on and outside the bound of 30, with the interval clear of it and across it; by the rule of
# ILAC-G8:09/2019 with a guard band as wide as the interval (read in a public summary)
PLAIN = [
    (29.0, 0.5, "guarded", "pass"),
    (29.5, 0.5, "guarded", "pass"),
    (29.8, 0.5, "guarded", "undecided"),
    (30.2, 0.5, "guarded", "undecided"),
    (30.6, 0.5, "guarded", "fail"),
    (30.0, 0.0, "guarded", "pass"),
    (29.8, 0.5, "simple", "pass"),
    (30.0, 0.5, "simple", "pass"),
    (30.2, 0.5, "simple", "fail"),
]


@pytest.mark.parametrize(("value", "spread", "decision", "expected"), PLAIN)
def test_a_number_is_decided_by_its_interval_or_by_itself(value, spread, decision, expected):
    verdict = judge(DEPTH, depth(value, spread), (), (), decision)
    assert verdict.verdict == expected
    assert verdict.decision == decision
    assert bool(verdict.reason) == (expected == "undecided")


def test_a_strict_bound_is_broken_by_the_bound_itself():
    strict = dataclasses.replace(DEPTH, strict=True)
    assert judge(strict, depth(30.0), (), ()).verdict == "fail"
    assert judge(strict, depth(29.999), (), ()).verdict == "pass"


def test_what_was_not_measured_is_never_a_pass():
    svm = LIMITS["eu-2019-2020-svm"]
    missing = {"svm": Measure.missing("1", "1 s is needed, and the capture has 0.2 s")}
    assert judge(svm, missing, (), ()).verdict == "undecided"
    assert judge(svm, missing, (), ()).reason == "1 s is needed, and the capture has 0.2 s"
    assert judge(svm, {}, (), ()).verdict == "undecided"
    no_depth = {"percent_flicker": Measure.missing("%", "AC coupling lost the mean")}
    for limit in default_limits():
        assert judge(limit, no_depth, (), ()).verdict == "undecided"


def test_a_family_without_depth_leaves_its_curve_undecided():
    lost = Family(Measure(240.0, "Hz", 239.9, 240.1), Measure.missing("%", "the mean is not known"), 3, "")
    verdict = judge(LIMITS["ieee1789-low-risk"], {}, (), (lost,))
    assert (verdict.verdict, verdict.reason) == ("undecided", "the mean is not known")


# Full-depth PWM keeps low risk from 1250 Hz on and no observable effect from 3000 Hz on, at any duty cycle
# (IEEE Std 1789-2015, from memory); a sine of 8 % keeps low risk at 100 Hz, one of 8.1 % does not.
CURVES = [
    ("ieee1789-low-risk", 1249.0, 100.0, "fail"),
    ("ieee1789-low-risk", 1250.0, 100.0, "pass"),
    ("ieee1789-no-effect", 2999.0, 100.0, "fail"),
    ("ieee1789-no-effect", 3000.0, 100.0, "pass"),
    ("ieee1789-low-risk", 100.0, 8.0, "pass"),
    ("ieee1789-low-risk", 100.0, 8.1, "fail"),
    ("ieee1789-no-effect", 120.0, 4.0, "pass"),
    ("ieee1789-no-effect", 120.0, 4.01, "fail"),
    ("ieee1789-seizure", 89.0, 5.0, "pass"),
    ("ieee1789-seizure", 89.0, 5.1, "fail"),
    ("ieee1789-seizure", 90.0, 100.0, "pass"),
    ("gb-40070-depth", 100.0, 3.2, "pass"),
    ("gb-40070-depth", 100.0, 3.21, "fail"),
    ("wcag-2-flash", 10.0, 5.8, "pass"),
    ("wcag-2-flash", 10.0, 5.9, "fail"),
    ("wcag-2-flash", 2.0, 100.0, "pass"),
    ("itu-r-bt-1702-flash", 59.0, 6.0, "fail"),
    ("itu-r-bt-1702-flash", 61.0, 100.0, "pass"),
]


@pytest.mark.parametrize(("name", "frequency", "value", "expected"), CURVES)
def test_a_curve_is_read_at_the_frequency_of_the_family(name, frequency, value, expected):
    verdict = judge(LIMITS[name], depth(value), (), (family(frequency, value),))
    assert verdict.verdict == expected
    assert verdict.frequency == frequency


def test_a_limit_that_steps_is_undecided_where_the_frequency_may_lie_on_either_side():
    verdict = judge(LIMITS["ieee1789-low-risk"], {}, (), (family(90.1, 5.0, frequency_spread=0.2),))
    assert verdict.verdict == "undecided"
    assert "steps at 90 Hz" in verdict.reason
    assert judge(LIMITS["ieee1789-low-risk"], {}, (), (family(90.3, 5.0, frequency_spread=0.2),)).verdict == "pass"
    assert judge(LIMITS["ieee1789-low-risk"], {}, (), (family(90.1, 2.0, frequency_spread=0.2),)).verdict == "pass"
    assert judge(LIMITS["ieee1789-low-risk"], {}, (), (family(90.1, 8.0, frequency_spread=0.2),)).verdict == "fail"


def test_a_line_alone_can_break_a_limit_on_modulation_but_none_on_depth():
    line = Component(110.0, 0.09 + 0j)
    shallow = family(20000.0, 50.0)
    assert judge(LIMITS["ieee1789-low-risk"], {}, (line,), (shallow,)).verdict == "fail"
    assert judge(LIMITS["ieee1789-low-risk"], {}, (line,), (shallow,)).frequency == 110.0
    assert judge(LIMITS["gb-40070-depth"], {}, (line,), (shallow,)).verdict == "pass"


def test_the_worst_decides_and_not_the_strongest():
    verdict = judge(LIMITS["ieee1789-low-risk"], {}, (), (family(2000.0, 100.0), family(100.0, 9.0)))
    assert (verdict.verdict, verdict.frequency, verdict.value) == ("fail", 100.0, 9.0)


def test_steady_light_passes_every_curve():
    verdict = judge(LIMITS["ieee1789-low-risk"], depth(0.01, 0.01), (), ())
    assert (verdict.verdict, verdict.bound, verdict.frequency) == ("pass", None, None)


def test_a_capture_that_is_blind_to_part_of_the_range_is_no_pass():
    slow = judge(LIMITS["ieee1789-low-risk"], {}, (), (family(100, 1.0),), conditions=Conditions(sample_rate=1000.0))
    assert slow.verdict == "undecided"
    assert "sample at 2500 Hz or faster" in slow.reason
    assert (
        judge(LIMITS["ieee1789-low-risk"], {}, (), (family(100, 50.0),), conditions=Conditions(1000.0)).verdict
        == "fail"
    )
    assert (
        judge(LIMITS["ieee1789-low-risk"], {}, (), (family(100, 1.0),), conditions=Conditions(2500.0)).verdict == "pass"
    )
    short = judge(LIMITS["wcag-2-flash"], {}, (), (family(100, 1.0),), conditions=Conditions(50e3, duration=0.2))
    assert short.verdict == "undecided"
    assert "record at least 0.67 s" in short.reason


def test_a_limit_outside_its_scope_is_not_applicable():
    svm = LIMITS["eu-2019-2020-svm"]
    measures = {"svm": Measure(3.0, "1", 2.9, 3.1)}
    assert judge(svm, measures, (), (), conditions=Conditions(level=30.0)).verdict == "not-applicable"
    assert judge(svm, measures, (), (), conditions=Conditions(level=100.0)).verdict == "fail"
    assert judge(svm, measures, (), ()).verdict == "fail"
    assert judge(svm, measures, (), (), conditions=Conditions(supply="24 V DC")).verdict == "not-applicable"
    assert judge(svm, measures, (), (), conditions=Conditions(supply="230 V 50 Hz")).verdict == "fail"
    ja8 = LIMITS["california-ja8-below-200hz"]
    assert judge(ja8, {}, (), (), conditions=Conditions(level=20.0)).verdict == "undecided"
    assert judge(ja8, {}, (), (), conditions=Conditions(level=50.0)).verdict == "not-applicable"


def test_an_unknown_rule_is_refused():
    with pytest.raises(InputError, match="no decision rule is called 'hopeful'; known: guarded, simple"):
        judge(DEPTH, depth(1.0), (), (), "hopeful")


def test_one_fail_outweighs_all_and_nothing_undecided_passes():
    good, bad, open_ = (judge(DEPTH, depth(*value), (), ()).verdict for value in ((1, 0), (99, 0), (30, 1)))
    assert overall([good, open_, bad]) == "fail"
    assert overall([good, open_]) == "undecided"
    assert overall([good]) == "pass"
    assert overall([]) == "not-applicable"


def test_the_json_form_has_the_agreed_keys():
    data = judge(LIMITS["ieee1789-low-risk"], {}, (), (family(120.0, 12.0, 0.1),)).to_dict()
    agreed = "limit measure value low high bound unit margin_percent verdict reason source"
    assert set(agreed.split()) <= set(data)
    assert data["bound"] == pytest.approx(9.6)
    assert data["margin_percent"] == pytest.approx(-25.0)
    assert data["source"].startswith("IEEE Std 1789-2015")


@given(
    limit=st.sampled_from([limit for limit in LIMITS.values() if limit.measure == "modulation"]),
    frequency=st.floats(1.0, 5000.0),
    value=st.floats(0.01, 100.0),
    spread=st.floats(0.0, 5.0),
    drift=st.floats(0.0, 5.0),
)
def test_a_decided_guarded_verdict_is_the_simple_one_anywhere_in_the_intervals(limit, frequency, value, spread, drift):
    guarded = judge(limit, {}, (), (family(frequency, value, spread, drift),)).verdict
    corners = {
        judge(limit, {}, (), (family(frequency + side * drift, value + end * spread),), "simple").verdict
        for side in (-1, 0, 1)
        for end in (-1, 1)
    }
    assert guarded == "undecided" or corners == {guarded}


def test_on_the_limit_a_guarded_pass_is_rarer_than_four_in_a_hundred():
    # a two-sided 95 % interval leaves 2.5 % on either side; 3000 draws of a normal estimate with its own interval
    noise = np.random.default_rng(4).normal(0.0, 0.1, 3000)
    verdicts = [judge(LIMITS["ieee1789-low-risk"], {}, (), (family(100.0, 8.0 + e, 0.196),)).verdict for e in noise]
    assert 0.015 < verdicts.count("pass") / 3000 < 0.04
    assert 0.015 < verdicts.count("fail") / 3000 < 0.04
