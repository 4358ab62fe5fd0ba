"""The camera bench in a real browser: its figures are those of `flicker bands`, by mouse and by keyboard."""

import json
import re

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera.answer import Answer, predict_all
from flicker.camera.bands import predict_bands
from flicker.camera.sensor import Camera
from flicker.cli import program
from flicker.light import ChannelLight, Light, pwm_light
from flicker.report.pages import bands_page

SETTINGS = 20  # of every kind of light, 100 in all


def lines_light(rng):
    """Two lights at once, of a few harmonics each."""
    first, second = rng.uniform(90, 400), rng.uniform(500, 3000)
    numbers = np.arange(1.0, 6.0)
    frequencies = np.concatenate([first * numbers, second * numbers])
    sizes = np.concatenate([0.25 / numbers**1.5, 0.2 / numbers**1.5])
    amplitudes = sizes * np.exp(2j * np.pi * rng.uniform(size=10))
    return Light((ChannelLight("light", frequencies, amplitudes, (first, second)),))


def light_of(kind, rng):
    frequency, duty = rng.uniform(90, 2500), rng.uniform(0.05, 0.95)
    if kind == "rectangle":
        return pwm_light(frequency, duty, rng.choice([0.0, rng.uniform(0, 0.8)]))
    if kind == "slow red":
        return pwm_light(frequency, duty, 0.0, (rng.uniform(1e-3, 9e-3), 5e-5, 2e-5))
    if kind == "bursts":
        gate = rng.uniform(8, 60)
        number = np.arange(1.0, 41.0)
        pauses = 2 * 0.6 * np.sinc(number * 0.6) / 0.6 * np.exp(-2j * np.pi * number * rng.uniform())
        fast = rng.uniform(700, 3000)
        carriers = np.array([fast, fast + gate, fast - gate])
        sizes = np.array([0.5, 0.3, 0.3]) * np.exp(2j * np.pi * rng.uniform(size=3))
        frequencies = np.concatenate([number * gate, carriers])
        return Light((ChannelLight("light", frequencies, np.concatenate([pauses, sizes]), (gate, *carriers)),))
    if kind == "nearly nothing":
        return pwm_light(frequency, 0.5, 0.97)
    return lines_light(rng)


def camera_of(rng):
    return Camera(
        lines=int(rng.integers(240, 2200)),
        line_time=float(rng.uniform(4e-6, 15e-6)),
        frame_rate=float(rng.choice([23.976, 24.0, 25.0, 29.97, 30.0, rng.uniform(15, 30)])),
        shutter=str(rng.choice(["rolling", "rolling", "rolling", "global"])),
    )


def predicted(light, camera, exposure):
    return predict_bands(light, camera, exposure).to_dict()


@pytest.mark.parametrize("kind", ["rectangle", "slow red", "nearly nothing", "two lights", "bursts"])
def test_the_figures_are_those_of_the_prediction(open_file, tmp_path, kind):
    """`flicker bands --json` writes what `predict_bands` gives, so the page is held against that."""
    rng = np.random.default_rng([7, len(kind)])
    for number in range(4):
        light = light_of(kind, rng)
        first = camera_of(rng)
        path = tmp_path / f"{number}.html"
        answer = Answer(light, first, (predict_bands(light, first, 0.005),), ())
        path.write_text(bands_page(answer, "flicker bands"), encoding="utf-8")
        page = open_file(path)
        for _ in range(SETTINGS // 4):
            camera = camera_of(rng)
            exposure = float(np.exp(rng.uniform(np.log(1 / 4000), np.log(1 / camera.frame_rate))))
            # As the fields round them, which is how a reader would read them off.
            exposure = 1 / float(f"{1 / exposure:.4g}")
            shown = set_and_read(page, camera, exposure)
            expected = predicted(light, camera, exposure)
            told = f"{light!r} {camera} {exposure}"
            assert_same(shown["contrast"], expected["contrast_percent"], told)
            assert_same(shown["frame flicker"], expected["frame_flicker_percent"], told)
            if expected["band_period_lines"] is not None and max(expected["contrast_percent"].values()) > 0.05:
                pitch = float(shown["band pitch"].split()[0])
                assert pitch == pytest.approx(expected["band_period_lines"], rel=1e-3), told


def set_and_read(page, camera, exposure):
    page.locator('select[name="shutter"]').select_option(camera.shutter)
    values = {"frameRate": camera.frame_rate, "lineTime": camera.line_time * 1e6, "lines": camera.lines}
    for name, value in (values | {"exposure": exposure}).items():
        page.locator(f'input[name="{name}"]').fill(repr(value))
    return figures(page)


def figures(page):
    told = page.locator(".desk .figures")
    return dict(zip(told.locator("dt").all_inner_texts(), told.locator("dd").all_inner_texts(), strict=True))


def assert_same(shown, expected, told):
    values = [float(one) for one in re.findall(r"([\d.]+)\xa0%", shown)]
    assert values == pytest.approx([value or 0.0 for value in expected.values()], abs=0.05), told


@pytest.fixture(scope="module")
def capture_page(tmp_path_factory):
    """Page of a measured capture, whose camera nobody stated."""
    folder = tmp_path_factory.mktemp("bench")
    times = np.arange(20_000) / 20_000
    levels = 0.05 + (times * 240.3 % 1 < 0.3) + np.random.default_rng(3).normal(0, 0.002, times.size)
    np.savetxt(folder / "light.csv", np.column_stack([times, levels]), "%.6f", ",", header="t (s),v (V)", comments="")
    path = folder / "capture.html"
    words = ["measure", str(folder / "light.csv"), "--dark-level", "0.05", "--html", str(path)]
    assert CliRunner().invoke(program, words).exit_code == 0
    return path


def test_a_camera_that_nobody_stated_is_marked_as_an_example(open_file, capture_page):
    page = open_file(capture_page)
    assert page.locator(".mark-example", has_text="example").count() == 5, "exposure, angle, rate, line time, lines"
    assert "no facts about your camera" in page.locator(".example").inner_text()
    for name, value in {"exposure": "1/60", "frameRate": "25", "lineTime": "14.8", "lines": "1080"}.items():
        page.locator(f'input[name="{name}"]').fill(value)
    assert page.locator(".mark-example", has_text="example").count() == 0
    assert page.locator(".example").inner_text() == ""


def test_sliders_by_mouse_and_keyboard_change_frame_and_figures(open_file, capture_page):
    page = open_file(capture_page, viewport={"width": 1200, "height": 1000})
    slider = page.locator('input[data-of="exposure"]')
    seen = [state(page)]
    slider.scroll_into_view_if_needed()
    box = slider.bounding_box()
    page.mouse.click(box["x"] + 0.8 * box["width"], box["y"] + box["height"] / 2)
    seen.append(state(page))
    slider.focus()
    for _ in range(40):
        page.keyboard.press("ArrowLeft")
    seen.append(state(page))
    for position in (0, 1, 2):
        assert len({one[position] for one in seen}) == 3, "field, contrast and picture all follow"
    assert slider.get_attribute("aria-valuetext").startswith("1/")


def state(page):
    picture = page.evaluate("document.querySelector('.desk canvas').toDataURL()")
    return page.locator('input[name="exposure"]').input_value(), figures(page)["contrast"], picture


def test_angle_and_exposure_say_the_same(open_file, capture_page):
    page = open_file(capture_page)
    page.locator('input[name="frameRate"]').fill("25")
    page.locator('input[name="angle"]').fill("172.8")
    assert page.locator('input[name="exposure"]').input_value() == "1/52.08"
    page.locator('input[name="exposure"]').fill("1/100")
    assert page.locator('input[name="angle"]').input_value() == "90"


def test_what_cannot_be_an_exposure_is_marked_and_changes_nothing(open_file, capture_page):
    page = open_file(capture_page)
    field = page.locator('input[name="exposure"]')
    before = figures(page)
    for wrong in ("-1", "1/0", "abc", "1/2/3", "", "Infinity"):
        field.fill(wrong)
        assert field.get_attribute("aria-invalid") is not None, wrong
        assert figures(page) == before
    field.blur()
    assert field.get_attribute("aria-invalid") is None, "what counts is shown again"


def test_a_clean_setting_is_one_press_away(open_file, capture_page):
    page = open_file(capture_page)
    button = page.locator(".settings button").first
    button.wait_for()
    button.focus()
    page.keyboard.press("Enter")
    assert float(figures(page)["contrast"].split("\xa0")[0]) <= 1.0
    page.locator(".curve .area.safe").first.wait_for(state="attached")
    assert "safe windows: 1/" in page.locator(".curve").get_attribute("aria-label")


def test_nothing_rolls_until_the_reader_starts_it(open_file, capture_page):
    page = open_file(capture_page)
    page.locator('input[name="exposure"]').fill("1/1000")
    before = state(page)[2]
    page.wait_for_timeout(300)
    assert state(page)[2] == before
    caution, roll = page.locator(".caution"), page.locator(".roll")
    assert caution.bounding_box()["y"] < roll.bounding_box()["y"], "the caution is read first"
    roll.click()
    page.wait_for_timeout(300)
    moved = state(page)[2]
    assert moved != before
    roll.click()
    page.wait_for_timeout(100)
    assert state(page)[2] == state(page)[2]


def test_who_asked_for_less_motion_steps_frame_by_frame(open_file, capture_page):
    page = open_file(capture_page, reduced_motion="reduce")
    page.locator('input[name="exposure"]').fill("1/1000")
    roll = page.locator(".roll")
    assert roll.inner_text() == "Next frame"
    first = state(page)[2]
    roll.click()
    second = state(page)[2]
    page.wait_for_timeout(500)
    third, fourth = page.evaluate(
        """() => [1, 2].map(() => {
            document.querySelector('.roll').click();
            return document.querySelector('.desk canvas').toDataURL();
        })"""
    )
    assert first != second != third, "one frame a press"
    assert third == fourth, "and not in quick succession"


def test_rolling_never_flashes_more_than_three_times_a_second(open_file, tmp_path):
    """WCAG 2.2, success criterion 2.3.1; counted on the picture as it moves."""
    light = pwm_light(29.0, 0.2)
    answer = predict_all(light, Camera(lines=400, line_time=1e-5, frame_rate=25.0), exposures=[1 / 2000])
    path = tmp_path / "pulsing.html"
    path.write_text(bands_page(answer, "flicker bands"), encoding="utf-8")
    page = open_file(path)
    page.locator(".roll").click()
    levels = page.evaluate(
        """async () => {
            const canvas = document.querySelector('.desk canvas'), found = [];
            const own = new OffscreenCanvas(1, 1).getContext('2d', { willReadFrequently: true });
            const start = performance.now();
            while (performance.now() - start < 2500) {
                await new Promise(requestAnimationFrame);
                own.drawImage(canvas, 5, 100, 1, 1, 0, 0, 1, 1);
                found.push(own.getImageData(0, 0, 1, 1).data[0]);
            }
            return found;
        }"""
    )
    bright = np.array(levels) > (min(levels) + max(levels)) / 2
    assert max(levels) - min(levels) > 20, "it pulses"
    assert np.count_nonzero(bright[1:] & ~bright[:-1]) <= 8, "in 2.5 s"


def test_data_in_the_page_cannot_end_its_script():
    wicked = Light((ChannelLight("</script><script>x()</script>", np.array([120.0]), np.array([0.3 + 0j]), (120.0,)),))
    text = bands_page(predict_all(wicked, Camera(frame_rate=25.0), exposures=[0.02]), "flicker bands")
    data = re.search(r'<script type="application/json">(.*?)</script>', text, re.DOTALL)[1]
    assert json.loads(data)["light"]["channels"][0]["name"] == "</script><script>x()</script>"
