import dataclasses
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.light import pwm_light
from flicker.limits import Curve, default_limits, judge, known_limits, margin, margin_of
from flicker.limits.limit import Limit
from flicker.tunable import TunableLight

LIMITS = known_limits()
HAIR = 1e-9
HOUSE = [
    Limit("house-depth", "depth", "percent_flicker", 30.0, "1", "all", "house", "house", "text seen"),
    Limit("house-index", "index", "flicker_index", 0.1, "1", "all", "house", "house", "text seen", strict=True),
    Limit("house-rms", "rms", "rms_modulation", 20.0, "1", "all", "house", "house", "text seen"),
]


def typed(frequency, duty, low_level=0.0, decay=0.0):
    return TunableLight.typed(pwm_light(frequency, duty, low_level, decay).channels[0])


def passes(limit, light):
    """The verdict on a light, taken as a report would take it: from its measures, lines and families."""
    return judge(limit, *light.findings([limit.measure]), "simple").verdict == "pass"


def random_lights(count):
    rng = np.random.default_rng(5)
    for _ in range(count):
        frequency = float(np.exp(rng.uniform(np.log(8.0), np.log(6000.0))))
        low = float(rng.choice([0.0, rng.uniform(0.0, 0.9)]))
        decay = float(rng.choice([0.0, rng.uniform(1e-4, 1e-2)]))
        yield typed(frequency, float(rng.uniform(0.05, 0.95)), low, decay)


def different_rules():
    """Every limit in force, but one of each set that asks for the same bound on the same measure."""
    return tuple({(limit.measure, limit.bound, limit.strict): limit for limit in default_limits()}.values())


def test_every_answer_put_back_in_passes_by_a_hair_and_fails_a_hair_beyond():
    counts = {"frequency": 0, "depth": 0, "ripple": 0}
    for light in random_lights(200):
        for limit in (*different_rules(), *HOUSE):
            found = margin(limit, light, "fail")
            if found.least_frequency is not None:
                counts["frequency"] += 1
                speed = found.least_frequency / light.frequency
                assert passes(limit, light.at(speed * (1 + HAIR), 1.0)), (limit.id, light.channel.pulse)
                assert not passes(limit, light.at(speed * (1 - HAIR), 1.0)), (limit.id, light.channel.pulse)
            now = passes(limit, light)
            if found.ripple_factor is not None:
                assert (found.ripple_factor == 1.0) == now
                if not now:
                    counts["ripple"] += 1
                    assert passes(limit, light.at(1.0, (1 - HAIR) / found.ripple_factor)), limit.id
                    assert not passes(limit, light.at(1.0, (1 + HAIR) / found.ripple_factor)), limit.id
            if found.most_percent_flicker is not None and has_room(light, found.most_percent_flicker):
                counts["depth"] += 1
                deeper, shallower = (
                    scale_for(light, found.most_percent_flicker * side) for side in (1 + 1e-7, 1 - 1e-7)
                )
                assert passes(limit, light.at(1.0, shallower)), (limit.id, light.channel.pulse)
                assert not passes(limit, light.at(1.0, deeper)), (limit.id, light.channel.pulse)
    assert min(counts.values()) > 400, counts


def has_room(light, depth):
    """Whether the light can be made deeper at all: the drive of a pulse ends at nothing."""
    return scale_for(light, depth) < light.largest_scale * (1 - 1e-5)


def scale_for(light, depth):
    """Scale at which a light has that percent flicker; by hand from 100 a (u + v) / (2 + a (u - v))."""
    (shape,) = light.shapes
    part = depth / 100.0
    return 2.0 * part / ((shape.above + shape.below) - part * (shape.above - shape.below))


def test_at_every_higher_frequency_it_passes_as_well():
    rng = np.random.default_rng(8)
    for light in random_lights(20):
        for limit in different_rules():
            found = margin(limit, light, "fail")
            if found.least_frequency is None:
                continue
            for factor in 1.0 + rng.exponential(1.0, 3):
                assert passes(limit, light.at(factor * found.least_frequency / light.frequency, 1.0)), limit.id


# by hand from the curves of IEEE Std 1789-2015 (from memory)
WORKED = [
    # light                       limit                 frequency  depth    source
    (typed(240.0, 0.5), "ieee1789-low-risk", 1250.0, 2 * 19.2 / 4 * math.pi / 2, "line 4/pi of a square: 19.2 pi / 4"),
    (typed(240.0, 0.5), "ieee1789-no-effect", 3000.0, 8.0 * math.pi / 4, "line 4/pi of a square: 8 pi / 4"),
    (typed(100.0, 0.5, 0.6), "ieee1789-low-risk", 25 / 0.08 * 4 / math.pi, 8.0 * math.pi / 4, "the same"),
    (typed(50.0, 0.5), "ieee1789-seizure", 90.0, 5.0 * math.pi / 4, "no limit from 90 Hz on"),
    (typed(100.0, 0.5, 0.6), "gb-40070-depth", 25 / 0.032, 3.2, "depth of the family alone counts"),
    (typed(100.0, 0.5, 0.6), "california-ja8-below-200hz", 200.0, 30 * math.pi / 4, "only the fundamental lies below"),
]


@pytest.mark.parametrize(("light", "name", "frequency", "depth", "source"), WORKED)
def test_agrees_with_what_is_worked_by_hand(light, name, frequency, depth, source):
    found = margin(LIMITS[name], light, "fail")
    assert found.least_frequency == pytest.approx(frequency, rel=1e-9), source
    assert found.most_percent_flicker == pytest.approx(depth, rel=1e-3 if "ja8" in name else 1e-9), source


def test_a_slow_emitter_gains_from_frequency_twice():
    # one pole driven by PWM has depth tanh((1 - D) / (2 f tau)) (closed form, by hand); low risk allows 0.08 f
    light = typed(100.0, 0.5, decay=8.5e-3)
    found = margin(LIMITS["gb-40070-depth"], light, "fail")
    frequency = found.least_frequency
    assert 100 * math.tanh(0.5 / (2 * frequency * 8.5e-3)) == pytest.approx(0.032 * frequency, rel=1e-9)


def test_the_ripple_factor_shrinks_what_it_says():
    light = typed(100.0, 0.3)
    found = margin(LIMITS["gb-40070-depth"], light, "fail")
    assert light.at(1.0, 1.0 / found.ripple_factor).percent_flicker(1.0) == pytest.approx(3.2, rel=1e-9)
    assert found.ripple_decibels == pytest.approx(20 * math.log10(found.ripple_factor))
    # steady light r times the mean divides every deviation by 1 + r (by hand)
    assert 1.0 / (1.0 + found.pedestal) == pytest.approx(1.0 / found.ripple_factor)


def test_the_reservoir_follows_its_model():
    # depth 1 / sqrt(1 + (2 w R C)^2); R C of 19.83 ms leaves 8.0 % at 100 Hz, and 47.8 ms leaves 3.33 % (by hand)
    def depth(time):
        return 100.0 / math.sqrt(1.0 + (2 * math.pi * 100.0 * time) ** 2)

    assert depth(19.83e-3) == pytest.approx(8.0, abs=0.01)
    assert depth(47.8e-3) == pytest.approx(3.33, abs=0.01)
    present = depth(5e-3)
    level = (100 - present) / (100 + present)
    found = margin(LIMITS["gb-40070-depth"], typed(100.0, 0.5, level), "fail")
    assert depth(5e-3 * found.capacitance_factor) == pytest.approx(3.2, rel=1e-9)
    assert margin(LIMITS["gb-40070-depth"], typed(240.0, 0.5, level), "fail").capacitance_factor is None


def test_steady_light_and_hopeless_limits_say_why():
    steady = typed(100.0, 1.0)
    found = margin(LIMITS["ieee1789-low-risk"], steady, "pass").to_dict()
    assert (found["ripple_factor"], found["least_frequency_hz"]) == (1.0, None)
    assert found["reason"] == "the light is steady"
    deep = margin(HOUSE[0], typed(100.0, 0.5), "fail").to_dict()
    assert deep["least_frequency_hz"] is None
    assert deep["reason"] == "no frequency helps"
    mild = margin(HOUSE[0], typed(100.0, 0.5, 0.9), "pass").to_dict()
    assert mild["reason"] == "this waveform passes at every frequency"
    none = dataclasses.replace(HOUSE[1], bound=0.0)
    assert margin(none, typed(100.0, 0.5), "fail").to_dict()["ripple_factor"] is None


def test_a_guarded_verdict_asks_for_its_interval_as_well():
    light = typed(100.0, 0.5, 0.6)
    measures, lines, families = light.findings()
    wide = [
        dataclasses.replace(one, percent_flicker=dataclasses.replace(one.percent_flicker, low=22.5, high=27.5))
        for one in families
    ]
    limit = LIMITS["gb-40070-depth"]
    guarded = margin_of(judge(limit, measures, lines, wide), light)
    simple = margin_of(judge(limit, measures, lines, wide, "simple"), light)
    assert simple.least_frequency == pytest.approx(25.0 / 0.032)
    assert guarded.least_frequency == pytest.approx(27.5 / 0.032)
    assert guarded.most_percent_flicker == pytest.approx(3.2 / 1.1)


def test_what_cannot_be_judged_has_no_margin():
    light = typed(100.0, 0.5)
    verdict = judge(LIMITS["eu-2019-2020-svm"], {}, (), ())
    found = margin_of(verdict, light).to_dict()
    assert found["least_frequency_hz"] is found["most_percent_flicker"] is found["ripple_factor"] is None
    assert found["reason"] == verdict.reason


@settings(max_examples=60)
@given(
    st.floats(1.0, 5000.0),
    st.floats(0.05, 0.95),
    st.floats(0.0, 0.9),
    st.floats(0.1, 10.0),
    st.floats(0.1, 1.0),
)
def test_a_light_changed_step_by_step_is_the_light_changed_at_once(frequency, duty, low, speed, scale):
    light = typed(frequency, duty, low)
    for limit in LIMITS.values():
        if isinstance(limit.bound, Curve):
            at_once = light.modulations(limit.measure, speed, scale)
            in_steps = light.at(speed, scale).modulations(limit.measure, 1.0, 1.0)
            np.testing.assert_allclose(at_once, in_steps, rtol=1e-9, atol=1e-12)
