"""Predicted frames and clips: the pitch, the colour, the movement, and no unsafe flashing."""

import av
import numpy as np
import pytest

import flicker
from flicker.camera import Camera
from flicker.camera.answer import predict_all
from flicker.camera.filmed import decoded, encoded, line_light
from flicker.light import pwm_light
from flicker.plots.clip import flashes, read_scene, write_clip
from flicker.plots.frame import draw_exposures, draw_frame, predicted_frame

CAMERA = Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0)
RED_IS_SLOW = pwm_light(240.0, 0.3, decay=(8.5e-3, 0.0, 0.0))


def answer(light=RED_IS_SLOW, camera=CAMERA, exposures=(1 / 250,)):
    return predict_all(light, camera, exposures=exposures)


def pitch(profile):
    """Cycles over the length of a profile, by its strongest line."""
    trial = np.linspace(0.5, profile.size / 3, 4000)
    turns = np.exp(-2j * np.pi * trial[:, None] * np.arange(profile.size) / profile.size)
    return trial[np.argmax(np.abs(turns @ ((profile - profile.mean()) * np.hanning(profile.size))))]


@pytest.mark.parametrize("frequency", [240.0, 1003.0, 3300.0])
@pytest.mark.parametrize("direction", ["down", "up", "left", "right"])
def test_bands_stand_at_the_predicted_pitch_across_the_read_direction(frequency, direction):
    one = answer(pwm_light(frequency, 0.4), CAMERA.changed(read_direction=direction), (0.3 / frequency,))
    picture = decoded(predicted_frame(one, 0))
    lines_down = picture[:, :, 0] if direction in ("down", "up") else picture[:, :, 0].T
    along, across = lines_down[:, -5], lines_down[lines_down[:, -5].argmax()]
    assert pitch(along) == pytest.approx(one.predictions[0].bands_per_frame, abs=0.25)
    assert np.unique(across).size == 4, "four fields of the plain scene, and no band across them"


def test_lines_run_the_way_they_are_read():
    down = predicted_frame(answer(), 0)
    up = predicted_frame(answer(camera=CAMERA.changed(read_direction="up")), 0)
    assert np.array_equal(down, up[::-1])


def test_dark_bands_are_red_and_bright_ones_cyan():
    picture = decoded(predicted_frame(answer(), 0))[:, 400]
    total = picture.sum(axis=1)
    dark, bright = picture[total.argmin()], picture[total.argmax()]
    assert dark[0] > dark[1] == dark[2]
    assert bright[0] < bright[1] == bright[2]
    lit = line_light(RED_IS_SLOW, CAMERA, 1 / 250)[0]
    ratio = lit[:, 0] / lit[:, 1]
    assert (dark / dark[1])[0] == pytest.approx(ratio.max(), rel=0.02)
    assert (bright / bright[1])[0] == pytest.approx(ratio.min(), rel=0.02)


def test_the_line_light_has_the_predicted_contrast_and_mean():
    lit = line_light(RED_IS_SLOW, CAMERA, 1 / 250, frame_starts=np.arange(200) / 25.3)
    high, low = lit.max(axis=1), lit.min(axis=1)
    found = 100 * ((high - low) / (high + low)).max(axis=0)
    expected = flicker.predict_bands(RED_IS_SLOW, CAMERA, 1 / 250).contrast_percent
    assert found == pytest.approx(list(expected.values()), abs=0.05)
    assert lit.mean() == pytest.approx(1.0, abs=0.01)


def test_the_picture_says_what_it_shows():
    figure = draw_frame(answer(), 0)
    picture, profile = figure.axes
    assert "240 Hz at 1/250 s, 36°: obvious, bands 7.14 % deep" in figure.get_suptitle()
    assert "rolling down" in picture.get_title(loc="left")
    assert "line, in the order read" in profile.get_xlabel()
    assert "%" in profile.get_ylabel()
    assert [line.get_label() for line in profile.lines] == ["red", "green", "blue"]
    assert max(profile.lines[1].get_ydata()) == pytest.approx(104.17, abs=0.05), "(0 + D) / (D x), by hand"
    strip = draw_exposures(answer(exposures=(1 / 50, 1 / 60, 1 / 100, 1 / 250)))
    assert sum("s, " in axes.get_title(loc="left") for axes in strip.axes) == 4


def test_code_values_go_there_and_back():
    code = np.arange(256, dtype=np.uint8)
    assert np.array_equal(encoded(decoded(code)), code)
    assert decoded(np.array([118], dtype=np.uint8))[0] == pytest.approx(0.181, abs=0.001), "IEC 61966-2-1: mid-grey"


def test_flashes_are_counted_as_pairs_of_opposing_changes():
    time = np.arange(100) / 50.0
    five = (np.floor(time * 10) % 2)[:, None] * np.ones(20)  # 5 Hz
    assert flashes(five, 50.0) == pytest.approx(5.0, abs=0.5)
    assert flashes(five, 25.0) == pytest.approx(2.5, abs=0.5), "played at half the speed"
    assert flashes(0.5 + 0.09 * five, 50.0) == 0, "less than 10 % of the largest luminance"
    assert flashes(0.85 + 0.15 * five, 50.0) == 0, "the darker side is not below 80 %"
    assert flashes(five * (np.arange(20) < 4), 50.0) == 0, "a fifth of the picture"
    slow = np.linspace(0, 1, 100)[:, None] * np.ones(20)
    assert flashes(slow, 50.0) <= 0.5


def clip_rows(path):
    """Luminance of the rows of every frame, and the frame rate, as a player would show them."""
    with av.open(str(path)) as container:
        frames = [frame.to_ndarray(format="rgb24") for frame in container.decode(video=0)]
        rate = float(container.streams.video[0].average_rate)
    light = decoded(np.stack(frames)[:, :, -20]) @ np.array([0.2126, 0.7152, 0.0722])
    return light, rate


def test_a_clip_rolls_as_the_camera_records_it(tmp_path):
    one = answer(pwm_light(240.0, 0.5), CAMERA.changed(frame_rate=24000 / 1001), (1 / 300,))
    clip = write_clip(one, tmp_path / "roll.mp4")
    assert clip.slowed == 1
    light, rate = clip_rows(clip.path)
    assert rate == pytest.approx(24000 / 1001, rel=1e-4)
    tone = np.exp(-2j * np.pi * np.arange(light.shape[1]) * one.predictions[0].bands_per_frame / light.shape[1])
    phase = np.unwrap(np.angle((light - light.mean(axis=1, keepdims=True)) @ (tone * np.hanning(light.shape[1]))))
    moved = -(phase[-1] - phase[0]) / (2 * np.pi) / (len(light) - 1) * one.predictions[0].band_period_lines
    assert moved == pytest.approx(one.predictions[0].drift_lines_per_frame, rel=0.1)
    assert flashes(light, rate) <= 3


@pytest.mark.parametrize("name", ["flash.mp4", "flash.gif"])
def test_a_clip_that_would_flash_plays_slower(tmp_path, name):
    one = answer(
        pwm_light(240.0, 0.1), CAMERA, (1 / 2000,)
    )  # every row is lit in one frame of five: five flashes a second
    clip = write_clip(one, tmp_path / name)
    assert clip.slowed > 1.5
    light, rate = clip_rows(clip.path)
    assert np.ptp(light) > 0.4
    assert flashes(light, rate) <= 3
    assert clip.duration > 3


def test_a_scene_of_ones_own(tmp_path):
    import cv2

    still = np.full((90, 161, 3), (30, 120, 200), dtype=np.uint8)
    cv2.imwrite(str(tmp_path / "still.png"), still)
    scene = read_scene(tmp_path / "still.png")
    assert scene.shape == (90, 161, 3)
    assert encoded(scene)[0, 0].tolist() == [200, 120, 30]
    assert predicted_frame(answer(), 0, scene).shape == (90, 161, 3)
    write_clip(answer(), tmp_path / "clip.mp4", scene=scene)
    (tmp_path / "no.png").write_text("no picture", encoding="utf-8")
    with pytest.raises(flicker.UnreadableFileError, match="is no picture"):
        read_scene(tmp_path / "no.png")
