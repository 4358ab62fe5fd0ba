import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.sweep.course import Point, changes, courses, dimming_mode, points_of


def point(level, mean, depth=100.0, duty=None, frequency=240.0, verdict="pass", margin=10.0, unit="", **other):
    known = {"capture": f"{level}.csv", "channel": "light", "region": "low-risk", "limit": "ieee1789-low-risk"}
    steady = depth < 1.0
    return Point(
        unit=unit,
        level=level,
        mean=mean,
        frequency=None if steady else frequency,
        depth=depth,
        duty=duty,
        verdict=verdict,
        margin=margin,
        **{**known, **other},
    )


def pwm_point(level, peak, duty, **other):
    return point(level, peak * duty, 100.0, duty, **other)


def test_the_three_ways_of_dimming_are_told_apart():
    steady_high, steady_low = point(100, 1.0, depth=0.0), point(60, 0.6, depth=0.0)
    assert dimming_mode(steady_high, steady_low) == "amplitude"
    assert dimming_mode(pwm_point(60, 1.0, 0.6), pwm_point(30, 1.0, 0.3)) == "pwm"
    assert dimming_mode(pwm_point(60, 1.0, 0.6), pwm_point(15, 0.5, 0.3)) == "hybrid"
    assert dimming_mode(steady_low, pwm_point(30, 0.6, 0.5)) == "pwm"
    assert dimming_mode(point(60, 0.6, depth=30.0), point(30, 0.3, depth=30.0)) == "unknown"  # no pulse width
    assert dimming_mode(point(60, None), point(30, 0.3)) == "unknown"


@given(st.floats(0.1, 10.0), st.floats(0.05, 0.95), st.floats(0.1, 0.9), st.floats(0.0, 0.8))
def test_a_pulse_of_any_floor_that_narrows_is_pwm_and_one_that_fades_is_amplitude(peak, duty, share, floor):
    depth = 100 * (1 - floor) / (1 + floor)

    def pulse(level, peak, duty):
        return point(level, peak * (duty + floor * (1 - duty)), depth, duty)

    assert dimming_mode(pulse(80, peak, duty), pulse(20, peak, share * duty)) == "pwm"
    assert dimming_mode(pulse(80, peak, duty), pulse(20, share * peak, duty)) == "amplitude"


def test_a_sweep_is_followed_from_the_highest_level_down():
    sweep = [
        pwm_point(10, 0.6, 0.1, frequency=480.0),
        point(100, 1.0, depth=0.0),
        point(60, 0.6, depth=0.0),
        pwm_point(30, 0.6, 0.5, verdict="fail", margin=-400.0),
        pwm_point(20, 0.6, 0.33, verdict="fail", margin=-500.0),
    ]
    (course,) = courses(sweep)
    assert [one.level for one in course.points] == [100, 60, 30, 20, 10]
    assert course.worst.level == 20
    assert [(span.high, span.low, span.mode) for span in course.spans] == [(100, 60, "amplitude"), (60, 10, "pwm")]
    assert [(before.level, after.level) for before, after in course.frequency_steps] == [(20, 10)]
    assert course.breaks == ()
    data = course.to_dict()
    assert data["mode_changes_percent"] == [60]
    assert data["mean_rises_with_level"] is True


def test_a_level_at_which_the_light_does_not_get_darker_is_found():
    (course,) = courses([point(50, 0.5), point(40, 0.55), point(30, 0.3)])
    assert [(before.level, after.level) for before, after in course.breaks] == [(50, 40)]


def test_an_undecided_step_is_worse_than_any_pass_and_better_than_any_fail():
    sweep = [point(3, 0.3, margin=1.0), point(2, 0.2, verdict="undecided", margin=None), point(1, 0.1, margin=2.0)]
    assert courses(sweep)[0].worst.level == 2
    sweep.append(point(4, 0.4, verdict="fail", margin=-1.0))
    assert courses(sweep)[0].worst.level == 4


def test_every_specimen_and_channel_has_a_course_of_its_own():
    sweep = [point(level, level, unit=unit) for unit in ("unit 7", "unit 8") for level in (10, 20)]
    sweep += [point(10, 1.0, unit="unit 9"), point(None, 1.0)]
    assert [course.unit for course in courses(sweep)] == ["unit 7", "unit 8"]


def test_two_sweeps_are_laid_side_by_side_by_level():
    before = [point(100, 1.0, unit="old"), point(50, 0.5, verdict="fail", unit="old"), point(10, 0.1, unit="old")]
    after = [point(100, 1.0, verdict="fail", unit="new"), point(50, 0.5, unit="new"), point(20, 0.2, unit="new")]
    found = changes(before, after)
    assert [(change.after.level, change.kind) for change in found] == [(100, "worse"), (50, "better")]
    both = [point(50, 0.5, unit=unit) for unit in ("a", "b")]
    assert len(changes(both, both)) == 2
    assert changes(both, [point(50, 0.5, unit="c"), point(50, 0.5, unit="d")]) == ()


def test_a_capture_that_was_not_read_gives_no_point():
    assert points_of({"capture": {"path": "a.csv"}, "error": "a.csv: is empty"}) == ()


def test_the_limit_that_decides_is_the_worst_one():
    verdicts = [
        {"verdict": "pass", "margin_percent": 2.0, "limit": "a", "reason": ""},
        {"verdict": "fail", "margin_percent": -5.0, "limit": "b", "reason": ""},
        {"verdict": "fail", "margin_percent": -9.0, "limit": "c", "reason": ""},
        {"verdict": "undecided", "margin_percent": None, "limit": "d", "reason": "too short"},
    ]
    channel = {
        "name": "light",
        "level": {"mean": 0.5},
        "measures": {"percent_flicker": {"value": 12.0}},
        "families": [{"fundamental_hz": 240.0}],
        "risk_region": {"region": "low-risk"},
        "verdicts": verdicts,
    }
    capture = {"capture": {"path": "a.csv"}, "channels": [channel], "conditions": {"level_percent": 5.0}}
    (found,) = points_of(capture)
    assert (found.verdict, found.limit, found.margin, found.level) == ("fail", "c", -9.0, 5.0)
    assert found.frequency == pytest.approx(240.0)


def test_another_recorder_names_its_only_channel_otherwise_and_is_compared():
    before = [point(80, 0.8), point(5, 0.05, verdict="fail")]
    after = [point(80, 0.8, channel="channel 1"), point(5, 0.05, channel="channel 1")]
    assert [change.kind for change in changes(before, after)] == ["same", "better"]


def test_of_two_channels_each_is_compared_with_its_own():
    before = [point(80, 0.8), point(80, 0.8, channel="other", verdict="fail")]
    after = [point(80, 0.8, verdict="fail"), point(80, 0.8, channel="other")]
    assert [change.kind for change in changes(before, after)] == ["worse", "better"]
