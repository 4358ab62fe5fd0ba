"""Plans: ranking, what spoils a setting, what does not fit, and the file that asks for it."""

import time

import numpy as np
import pytest

import flicker
from flicker.camera import Camera, predict_bands
from flicker.camera.plan import PlannedCamera, make_plan
from flicker.camera.plan_file import plan_from_file
from flicker.light import pwm_light
from flicker.report.plan import plan_words

DOCK = PlannedCamera(Camera(lines=1080, line_time=14.8e-6), "dock", (24.0, 25.0, 50.0), (1 / 48, 1 / 50, 1 / 60))
LIGHTS = {"display": pwm_light(240.0, 0.05), "lamp": pwm_light(100.0, 0.6, 0.4)}

PLAN = """
tolerance_percent = 1.0
contrast_limit_percent = 2.0

[[light]]
name = "display"
frequency_hz = "4.8kHz"
duty = 0.05
decay_s = ["8.5ms", 0, 0]

[[light]]
name = "lamp"
capture = "lamp.csv"
dark_level = 0.01
tolerance_percent = 0.2

[[camera]]
file = "dock.toml"
frame_rates_hz = [24.0, "25"]
exposures_s = ["1/48", "1/50"]

[[camera]]
name = "phone"
lines = 1000
readout_time_s = "12ms"
frame_rate_hz = 30.0
exposures_s = ["1/50"]
"""
DOCK_FILE = "name = 'dock'\nlines = 1080\nline_rate_hz = 67567.6\nexposures_s = ['1/25']\n"


def test_settings_are_those_of_single_predictions_and_ranked_by_the_worst_light():
    plan = make_plan(LIGHTS, [DOCK], tolerance=0.01, limit=0.02)
    assert len(plan.settings) == 8
    assert plan.impossible == 1  # 1/48 s does not fit into a frame of 1/50 s
    ranked = [one.deepest for one in plan.settings]
    assert ranked == pytest.approx(sorted(ranked), abs=1e-4)
    for one in plan.settings:
        camera = DOCK.camera.changed(frame_rate=one.frame_rate_hz)
        each = {
            name: predict_bands(light, camera, one.exposure_s, 0.01).worst_contrast_percent
            for name, light in LIGHTS.items()
        }
        assert one.contrast_percent == pytest.approx(each)
        assert one.worst_contrast_percent == pytest.approx(max(each.values()))
        assert one.worst_light == max(each, key=each.get)
        assert one.without_worst_light_percent == pytest.approx(min(each.values()))
        assert one.clean == (max(each.values()) <= 2.0)
    assert plan.best == plan.settings[0]
    standing = next(one for one in plan.settings if one.frame_rate_hz == 24.0)
    assert standing.standing == ("display",)


def test_a_global_shutter_is_judged_by_its_pulsing():
    camera = PlannedCamera(Camera(shutter="global"), "pole", (24.0, 25.0), (1 / 50,))
    plan = make_plan({"display": LIGHTS["display"]}, [camera], limit=0.02)
    rates = {one.frame_rate_hz: one for one in plan.settings}
    assert rates[24.0].worst_contrast_percent == rates[25.0].worst_contrast_percent == 0
    assert rates[24.0].clean, "240 Hz meets every frame of 24 a second in the same phase"
    assert not rates[25.0].clean
    assert rates[25.0].worst_frame_flicker_percent == pytest.approx(11.11, abs=0.005)
    off = make_plan({"display": LIGHTS["display"]}, [camera], tolerance=0.001, limit=0.02)
    assert not any(one.clean for one in off.settings)


def test_settings_common_to_all_cameras():
    phone = PlannedCamera(Camera(lines=2000, readout_time=12e-3), "phone", (25.0, 30.0), (1 / 60, 1 / 50))
    plan = make_plan(LIGHTS, [DOCK, phone], tolerance=0.001, limit=0.02)
    assert {(one.frame_rate_hz, one.exposure_s) for one in plan.shared} == {(25.0, 1 / 50), (25.0, 1 / 60)}
    best = plan.shared[0]
    members = [one for one in plan.settings if (one.frame_rate_hz, one.exposure_s) == (25.0, best.exposure_s)]
    assert best.worst_contrast_percent == max(one.deepest for one in members)
    words = plan_words(plan)
    assert "all cameras at 25 frames/s" in words
    assert "Spoilt by" in words


def test_a_plan_file(tmp_path):
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    (tmp_path / "dock.toml").write_text(DOCK_FILE, encoding="utf-8")
    asked = []

    def read_light(path, **how):
        asked.append((path, how))
        return LIGHTS["lamp"]

    plan = plan_from_file(tmp_path / "plan.toml", read_light)
    assert asked == [(tmp_path / "lamp.csv", {"dark_level": 0.01})]
    assert plan.lights == ("display", "lamp")
    assert plan.cameras == ("dock", "phone")
    data = plan.to_dict()
    assert data["tolerance_percent"] == 1.0
    assert {(one["camera"], one["frame_rate_hz"]) for one in data["settings"]} == {
        ("dock", 24.0), ("dock", 25.0), ("phone", 30.0),
    }  # fmt: skip
    assert data["best"] == data["settings"][0]
    camera = Camera(lines=1080, line_time=1 / 67567.6)
    lamp = predict_bands(LIGHTS["lamp"], camera, 1 / 48, 0.002).worst_contrast_percent
    first = next(one for one in data["settings"] if one["exposure_s"] == 1 / 48)
    assert first["light_contrast_percent"]["lamp"] == pytest.approx(lamp)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("duty = 0.05", "", "light 1: duty is missing"),
        ("duty = 0.05", "duty = 5", "light 1: a duty cycle lies above 0"),
        ('frequency_hz = "4.8kHz"', 'frequency_hz = "4.8kV"', "frequency_hz: '4.8kV' is no frequency"),
        ("tolerance_percent = 1.0", "tolerance = 1.0", "did you mean 'tolerance_percent'"),
        ("tolerance_percent = 1.0", "tolerance_percent = 80", "between 0 and 50"),
        ('capture = "lamp.csv"', 'capture = "lamp.csv"\nduty = 0.1', "give one of them"),
        ('file = "dock.toml"', 'file = "quay.toml"', "no camera file can be read there"),
        ("lines = 1000", "lines = 0", "camera 2: a frame has a whole number of lines"),
        ('name = "phone"', 'name = "dock"', "called 'dock' is there already"),
        ("frame_rate_hz = 30.0", "", "phone: the camera's frame rate is unknown"),
        ("[[camera]]\nname", "[camera]\nname", "is no plan file in TOML"),
        ('exposures_s = ["1/48", "1/50"]', 'exposures_s = "1/48"', "must be a list"),
    ],
)
def test_a_wrong_plan_file_says_where(tmp_path, old, new, said):
    (tmp_path / "plan.toml").write_text(PLAN.replace(old, new, 1), encoding="utf-8")
    (tmp_path / "dock.toml").write_text(DOCK_FILE, encoding="utf-8")
    with pytest.raises(flicker.FlickerError) as found:
        plan_from_file(tmp_path / "plan.toml", lambda path, **how: LIGHTS["lamp"])
    assert said in str(found.value)
    assert "\n" not in str(found.value)


def test_a_large_plan_is_quick():
    rng = np.random.default_rng(5)
    lights = {
        f"light {number}": pwm_light(float(rng.uniform(90, 20_000)), float(rng.uniform(0.02, 0.9)))
        for number in range(12)
    }
    exposures = tuple(np.geomspace(1 / 60, 1 / 8000, 40))
    rates = (23.976, 24.0, 25.0, 29.97, 30.0, 48.0, 50.0, 60.0)
    modes = [Camera(lines=int(rng.integers(720, 2200)), readout_time=float(rng.uniform(4e-3, 16e-3))) for _ in range(6)]
    cameras = [PlannedCamera(mode, f"camera {number}", rates, exposures) for number, mode in enumerate(modes)]
    begin = time.process_time()
    plan = make_plan(lights, cameras, tolerance=0.01, limit=0.02)
    assert len(plan.settings) == 6 * 40 * 8
    assert time.process_time() - begin < 3.0
