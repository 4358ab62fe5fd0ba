"""`flicker bands` as it is typed."""

import json

import pytest
from click.testing import CliRunner

from flicker.cli import program

CAMERA = ["--lines", "1080", "--line-time", "14.8us", "--frame-rate", "25"]
DISPLAY = ["--frequency", "240", "--duty", "0.05"]


def run(*words, status=0):
    done = CliRunner().invoke(program, ["bands", *words])
    assert done.exit_code == status, done.output
    return done


def answer(*words):
    return json.loads(run(*words, "--json", "-").stdout)


def test_typed_numbers_need_no_capture():
    said = " ".join(run(*DISPLAY, *CAMERA, "--exposure", "1/50").output.split())
    assert "11.1 % deep, 3.8 bands in the picture, 282 lines each" in said
    assert "1/50 s lets in 4.8 cycles of the 240 Hz light: some lines catch 5 of its flashes, others" in said
    assert "1/48 s" in said
    assert "--tolerance" in said, "a tolerance that nobody stated is named"
    assert "rolling down" in said


@pytest.mark.parametrize(("direction", "way"), [("down", "down"), ("up", "up"), ("left", "left"), ("right", "right")])
def test_the_way_that_bands_roll_follows_the_read_direction(direction, way):
    said = run(*DISPLAY, *CAMERA, "--exposure", "1/50", "--read-direction", direction).output
    assert f"rolling {way}" in " ".join(said.split())
    other = run("--frequency", "260", "--duty", "0.05", *CAMERA, "--exposure", "1/50", "--read-direction", direction)
    opposite = {"down": "up", "up": "down", "left": "right", "right": "left"}[way]
    assert f"rolling {opposite}" in " ".join(other.output.split()), "260 Hz is 10 Hz above 10 x 25 Hz"


def test_json_has_every_key_that_is_promised():
    data = answer(*DISPLAY, *CAMERA, "--exposure", "1/50", "--exposure", "1/250", "--tolerance", "0.1%")
    assert {"light", "camera", "predictions", "advice"} <= set(data)
    assert data["light"]["frequency_hz"] == 240
    assert data["light"]["lines"]["all"][0]["frequency_hz"] == 240
    assert len(data["predictions"]) == 2
    first = data["predictions"][0]
    assert first["exposure_s"] == pytest.approx(0.02)
    assert first["contrast_percent"] == {"all": pytest.approx(11.11, abs=0.005)}
    assert first["band_period_lines"] == pytest.approx(281.53, abs=0.005)
    assert first["bands_per_frame"] == pytest.approx(3.836, abs=0.0005)
    assert first["drift_lines_per_frame"] == pytest.approx(112.6, abs=0.05)
    assert first["drift_seconds_per_band"] == pytest.approx(0.1)
    assert (first["standing"], first["aliased"], first["visible"]) == (False, False, True)
    assert set(first["frame_flicker_percent"]) == {"all"}
    assert first["worst_contrast_percent"] >= first["contrast_percent"]["all"]
    assert {"exposure_s", "label", "contrast_percent", "worst_contrast_percent"} <= set(data["advice"][0])
    assert data["advice"][0]["label"].endswith("°")
    worst = [max(one["worst_contrast_percent"], one["worst_frame_flicker_percent"] or 0) for one in data["advice"]]
    assert worst == pytest.approx(sorted(worst), abs=1e-3)


def test_three_decays_make_three_channels_and_coloured_bands():
    data = answer("--frequency", "240", "--duty", "0.5", "--decay", "8.5ms,0,0", *CAMERA, "--exposure", "1/300")
    contrast = data["predictions"][0]["contrast_percent"]
    assert list(contrast) == ["red", "green", "blue"]
    assert contrast["red"] < contrast["green"] / 5
    colours = data["predictions"][0]["colours"]
    assert (colours["bright_hue"], colours["dark_hue"]) == ("cyan", "red")
    said = run("--frequency", "240", "--duty", "0.5", "--decay", "8.5ms,0,0", *CAMERA, "--exposure", "1/300").output
    assert "bright bands cyan, dark bands red" in said


def test_a_capture_and_a_camera_file(tmp_path):
    from flicker.demo import write_demo

    write_demo(tmp_path)
    capture, camera = str(tmp_path / "bridge-display-night.csv"), str(tmp_path / "dock-camera.toml")
    data = answer(capture, "--dark-level", "0.012", "--camera", camera, "--exposure", "1/50")
    truth = answer("--frequency", "239.7", "--duty", "0.05", "--camera", camera, "--exposure", "1/50")
    got, true = (one["predictions"][0] for one in (data, truth))
    assert got["contrast_percent"].popitem()[1] == pytest.approx(true["contrast_percent"]["all"], abs=0.3)
    assert got["band_period_lines"] == pytest.approx(true["band_period_lines"], rel=1e-4)
    assert got["drift_lines_per_frame"] == pytest.approx(true["drift_lines_per_frame"], rel=1e-2)
    assert data["capture"] == capture


def test_a_global_shutter_pulses():
    data = answer(*DISPLAY, "--frame-rate", "25", "--shutter", "global", "--exposure", "1/50")
    one = data["predictions"][0]
    assert one["contrast_percent"] == {"all": 0}
    assert one["frame_flicker_percent"]["all"] == pytest.approx(11.11, abs=0.005)
    assert one["bands_per_frame"] == 0
    assert one["band_period_lines"] is None
    assert "whole picture pulses" in one["reason"]
    assert one["visible"]
    assert "pulses by 11.1 %" in run(*DISPLAY, "--frame-rate", "25", "--shutter", "global", "--exposure", "1/50").output


def test_staggered_exposures():
    data = answer(*DISPLAY, *CAMERA, "--exposure", "1/50+1/400")
    assert data["predictions"][0]["exposure_s"] == pytest.approx([0.02, 0.0025])


def test_when_nothing_is_clean_it_says_what_would_help():
    said = " ".join(
        run("--frequency", "90", "--duty", "0.2", *CAMERA, "--frame-rate", "100", "--exposure", "1/200").output.split()
    )
    assert "Nothing that can be dialled in" in said
    assert "a slower frame rate: one whole cycle takes 11.1 ms" in said


def test_visibility_depends_on_grade_and_distance():
    words = [*DISPLAY[:2], "--duty", "0.5", "--lines", "1000", "--readout-time", "10ms", "--frame-rate", "24"]
    exposure = ["--exposure", str(5 / 240 * 1.001)]
    near = answer(*words, *exposure)["predictions"][0]
    assert near["contrast_percent"]["all"] == pytest.approx(0.1, abs=0.001)
    assert not near["visible"]
    graded = answer(*words, *exposure, "--grade-gain", "3")["predictions"][0]
    assert graded["visible"]
    far = answer(*words, *exposure, "--grade-gain", "3", "--viewing-distance", "3")["predictions"][0]
    assert not far["visible"], "two bands in the height of the picture, from three heights away: 0.13 cycles a degree"


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ([*DISPLAY], "exposure is unknown: give --exposure"),
        (["--frequency", "240", "--exposure", "1/50"], "--duty is missing"),
        (["--exposure", "1/50"], "no light: give a capture, or --frequency and --duty"),
        (["x.csv", *DISPLAY, "--exposure", "1/50"], "not both"),
        (["nothing.csv", "--exposure", "1/50"], "nothing.csv"),
        ([*DISPLAY, "--exposure", "1/50", "--camera", "nothing.toml"], "nothing.toml: no camera file"),
        ([*DISPLAY, "--exposure", "0"], "must be above 0"),
        ([*DISPLAY, "--exposure", "1/50", "--tolerance", "60"], "between 0 and 50 %"),
        ([*DISPLAY, "--exposure", "1/50", "--shutter", "iris"], "no shutter is called 'iris'"),
        ([*DISPLAY, "--exposure", "1/50", "--decay", "1ms,2ms"], "give one decay time, or three"),
        ([*DISPLAY, "--exposure", "1/50", "--clip", "film.avi", *CAMERA], "written as .mp4 or .gif"),
        ([*DISPLAY, "--exposure", "1/50", *CAMERA[:4], "--clip", "film.mp4"], "frame rate is unknown"),
        ([*DISPLAY, "--exposure", "1/50", "--figures", "pictures"], "line time is unknown"),
        ([*DISPLAY, "--exposure", "1/50", *CAMERA, "--figures", "p", "--scene", "none.png"], "none.png: no picture"),
    ],
)
def test_wrong_words_leave_one_sentence_and_nothing_else(words, said, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    done = run(*words, status=2)
    assert said in done.stderr
    assert len(done.stderr.strip().splitlines()) == 1
    assert done.stdout == ""
    assert list(tmp_path.iterdir()) == []


def test_files_that_are_written(tmp_path):
    words = [*DISPLAY, *CAMERA, "--exposure", "1/50", "--exposure", "1/250"]
    run(*words, "--json", str(tmp_path / "bands.json"), "--figures", str(tmp_path / "pictures"))
    assert json.loads((tmp_path / "bands.json").read_text(encoding="utf-8"))["predictions"]
    names = {file.name for file in (tmp_path / "pictures").iterdir()}
    assert names == {"frame-1-50-s.png", "frame-1-250-s.png", "frames-side-by-side.png"}
