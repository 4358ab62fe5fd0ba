from flicker.plots.sweep import draw_sweep, save_sweeps
from flicker.sweep.course import Point, courses


def point(level, depth, frequency, verdict, unit="unit 7"):
    steady = depth < 1
    duty = None if steady else level / 60
    return Point(
        f"{level}.csv",
        "light",
        unit,
        level,
        level / 100,
        None if steady else frequency,
        depth,
        duty,
        "low-risk",
        verdict,
        -10.0 if verdict == "fail" else 10.0,
        "ieee1789-low-risk",
    )


STEPS = [
    point(100, 0.0, 0.0, "pass"),
    point(60, 0.0, 0.0, "pass"),
    point(30, 100.0, 240.0, "fail"),
    point(10, 100.0, 240.0, "undecided"),
]


def test_the_picture_shows_depth_and_frequency_over_the_level():
    (course,) = courses(STEPS)
    upper, lower = draw_sweep(course).axes
    assert upper.get_ylabel() == "percent flicker (%)"
    assert lower.get_ylabel() == "frequency (Hz)"
    assert lower.get_xlabel() == "dimming level (%)"
    assert list(upper.lines[0].get_xdata()) == [100, 60, 30, 10]
    assert list(upper.lines[0].get_ydata()) == [0, 0, 100, 100]
    assert list(lower.lines[0].get_xdata()) == [30, 10]
    assert list(lower.lines[0].get_ydata()) == [240, 240]


def test_verdicts_differ_by_shape_and_the_worst_step_is_named():
    (course,) = courses(STEPS)
    upper, lower = draw_sweep(course).axes
    markers = {line.get_label(): line.get_marker() for line in upper.lines if line.get_marker() != "None"}
    assert set(markers) >= {"breaks a limit", "undecided", "keeps every limit"}
    assert len(set(markers.values())) == len(markers)
    texts = [text.get_text() for axes in (upper, lower) for text in axes.texts]
    assert "worst: 30 %, ieee1789-low-risk" in texts
    assert {"amplitude", "PWM"} <= set(texts)


def test_every_course_has_a_file_of_its_own(tmp_path):
    found = courses([*STEPS, *(point(level, 0.0, 0.0, "pass", unit="unit/7") for level in (10, 20))])
    save_sweeps(found, tmp_path)
    save_sweeps(found, tmp_path)
    assert {path.name for path in tmp_path.iterdir()} == {"sweep-unit-7-light.png", "sweep-unit-7-light-again.png"}
