"""The page in a real browser: alone, quiet, readable at every width, whole on paper."""

import csv
import re

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera.render import Lit, Shot, write_clip
from flicker.cli import program
from flicker.light import Pulse

WICKED = "<img src=x onerror=document.title='ran'>&amp;.csv"
WICKED_COLUMN = "</script><script>document.title='ran'</script> (V)"
WIDTHS = (360, 820, 1400)  # a phone, a tablet, a desk


def write_trace(path, frequency, duty, *, column="light (V)", low=0.0, seconds=1.2, rate=20_000.0):
    times = np.arange(int(seconds * rate)) / rate
    light = 0.02 + low + (1 - low) * (times * frequency % 1 < duty)
    light += np.random.default_rng(5).normal(0, 0.002, times.size)
    with path.open("w", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(["time (s)", column])
        writer.writerows(zip(times.round(7).tolist(), light.round(5).tolist(), strict=True))


def run(*words):
    done = CliRunner().invoke(program, [str(word) for word in words])
    assert done.exit_code in (0, 1, 3), done.output + done.stderr
    return done


@pytest.fixture(scope="module")
def pages(tmp_path_factory):
    """A page of each kind, by its name."""
    folder = tmp_path_factory.mktemp("pages")
    write_trace(folder / "display.csv", 240.3, 0.3)
    write_trace(folder / WICKED, 120.7, 0.5, column=WICKED_COLUMN, low=0.4)
    run("measure", folder / "display.csv", "--dark-level", 0.02, "--html", folder / "capture.html")
    run("check", folder / WICKED, "--html", folder / "judged.html")
    for sweep, frequency in (("before", 240.3), ("after", 960.7)):
        lines = ["capture,unit,level,dark_level"]
        for level in (80, 40, 20, 10, 5):
            write_trace(folder / f"{sweep}-{level}.csv", frequency, level / 100)
            lines.append(f"{sweep}-{level}.csv,night display,{level},0.02")
        (folder / f"{sweep}.csv").write_text("\n".join(lines))
    run("check", "--manifest", folder / "after.csv", "--against", folder / "before.csv",
        "--limit", "ieee1789-low-risk", "--html", folder / "sweep.html")  # fmt: skip
    run("measure", folder / "after-80.csv", folder / WICKED, "--html", folder / "several.html")
    film(folder / "display.mp4")
    how = ("--line-time", "30us", "--exposure", "1/2000")
    run("map", folder / "display.mp4", *how, "--rows", 4, "--columns", 6, "--html", folder / "map.html")
    run("stripes", folder / "display.mp4", *how, "--html", folder / "film.html")
    run("bands", "--frequency", 240, "--duty", 0.4, "--decay", "8.5ms,50us,50us", "--line-time", "14.8us",
        "--lines", 1080, "--frame-rate", 25, "--exposure", "1/500", "--exposure", "1/50",
        "--html", folder / "bands.html")  # fmt: skip
    write_plan(folder)
    run("plan", folder / "plan.toml", "--html", folder / "card.html")
    return {path.stem: path for path in folder.glob("*.html")}


def write_plan(folder):
    rows = []
    for number in range(12):
        rows.append(f'[[light]]\nname = "lamp {number} of the <b>chart room</b>"')
        rows.append(f"frequency_hz = {97 + 31 * number}\nduty = 0.3")
    for number in range(6):
        name = f"camera-{number}.toml"
        (folder / name).write_text(f'name = "dock camera {number}"\nlines = 1080\nline_time_s = {12 + number}e-6\n')
        rows.append(f'[[camera]]\nfile = "{name}"\nframe_rates_hz = [24, 25]\nexposures_s = [0.02, 0.01, 0.004]')
    (folder / "plan.toml").write_text("\n".join(rows))


def film(path):
    scene = np.full((240, 48), 0.2)
    write_clip(path, Shot(30e-6, 25.0, 1 / 2000, 30, [Lit(scene, [Pulse(1003.0, 0.4)])], noise=0.01))


@pytest.fixture
def opened(open_file, pages):
    """Open a page by its name."""
    return lambda name, **how: open_file(pages[name], **how)


@pytest.mark.parametrize("name", ["capture", "judged", "several", "sweep", "map", "film", "bands", "card"])
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_nothing_runs_over_the_side_at_any_width(opened, name, scheme):
    page = opened(name, color_scheme=scheme)
    for width in WIDTHS:
        page.set_viewport_size({"width": width, "height": 800})
        assert page.evaluate("document.documentElement.scrollWidth") <= width


def test_the_answer_comes_first(opened):
    page = opened("capture", viewport={"width": 360, "height": 740})
    sentence = page.locator(".sentence").first
    assert "240.3 Hz" in sentence.inner_text()
    assert "above low risk" in sentence.inner_text()
    after = page.locator(".answers dd").last
    assert "for low risk" in after.inner_text()
    assert after.bounding_box()["y"] + after.bounding_box()["height"] < 740, "without scrolling, on a phone too"


def test_sections_stand_in_the_stated_order(opened):
    page = opened("judged")
    names = page.locator("article").first.locator("h3").all_inner_texts()
    assert [name for name in names if name in ORDER] == ORDER
    assert page.locator("article").last.locator("h2").inner_text() == "Record"


ORDER = ["Answer", "Figures", "Waveform", "Spectrum", "Where it lies", "Verdicts", "Notes", "Method"]


@pytest.mark.parametrize("name", ["judged", "several"])
def test_names_and_units_with_html_in_them_show_as_text(opened, name):
    page = opened(name)
    assert page.title() != "ran"
    assert page.locator("img").count() == 0
    assert WICKED in page.locator("body").inner_text()
    assert WICKED_COLUMN.removesuffix(" (V)") in page.locator("body").text_content()


@pytest.mark.parametrize("name", ["capture", "sweep", "map", "film", "bands"])
def test_every_picture_says_in_words_what_it_shows(opened, name):
    page = opened(name)
    pictures = page.locator("svg:not([aria-hidden])")
    assert pictures.count() >= 1
    for picture in pictures.all():
        assert picture.get_attribute("role") == "img"
        assert len(picture.get_attribute("aria-label")) > 20
    page.locator("figure svg text").nth(10).wait_for(state="attached")  # words stay words


def test_a_mark_of_a_sweep_says_its_capture(opened):
    page = opened("sweep")
    figure = page.locator("figure").first
    figure.locator("g.mark.fail").first.hover()
    said = figure.locator("output").inner_text()
    assert re.search(r"after-\d+\.csv: FAIL by ieee1789-low-risk", said)


def test_the_keyboard_goes_from_mark_to_mark(opened):
    page = opened("sweep")
    figure = page.locator("figure").first
    assert figure.locator('[tabindex="0"]').count() == 1, "one stop of the tab key a figure"
    figure.locator('[tabindex="0"]').focus()
    said = []
    for _ in range(3):
        said.append(figure.locator("output").inner_text())
        page.keyboard.press("ArrowRight")
    assert [words.removeprefix("before: ").split(":")[0] for words in said] == ["5 %", "5 %", "10 %"]
    assert sum(words.startswith("before: ") for words in said) >= 1


def test_the_keyboard_goes_over_the_cells_of_a_map(opened):
    page = opened("map")
    figure = page.locator("figure").first
    figure.locator('[tabindex="0"]').focus()
    for key in ("ArrowDown", "ArrowRight", "ArrowUp", "ArrowUp"):
        page.keyboard.press(key)
    assert figure.locator("output").inner_text().startswith("row 1, column 2: ")


def test_a_cell_of_a_map_says_its_values_to_who_touches_it(opened):
    page = opened("map", has_touch=True, viewport={"width": 360, "height": 740})
    figure = page.locator("figure").first
    figure.locator("rect").nth(8).tap()
    said = figure.locator("output").inner_text()
    assert re.match(r"row 2, column 3: [\d.]+ % flicker, 100\d\.?\d* Hz", said), said


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_words_stand_out_from_the_ground(opened, scheme):
    """Contrast of at least 4.5: WCAG 2.2, success criterion 1.4.3."""
    page = opened("judged", color_scheme=scheme)
    names = ("--paper", "--ink", "--faint", "--mark", "--light")
    values = page.evaluate("n => n.map(k => getComputedStyle(document.documentElement).getPropertyValue(k))", names)
    paper, *inks = (luminance(value.strip()) for value in values)
    for ink in inks:
        assert (max(ink, paper) + 0.05) / (min(ink, paper) + 0.05) >= 4.5


def luminance(colour):
    parts = np.array([int(colour[place : place + 2], 16) / 255 for place in (1, 3, 5)])
    linear = np.where(parts <= 0.04045, parts / 12.92, ((parts + 0.055) / 1.055) ** 2.4)
    return float(linear @ (0.2126, 0.7152, 0.0722))


@pytest.mark.parametrize("sheet", ["A4", "Letter"])
@pytest.mark.parametrize("name", ["capture", "sweep"])
def test_no_figure_is_cut_on_paper(opened, name, sheet):
    data = opened(name).pdf(format=sheet, tagged=True)
    objects = dict(re.findall(rb"(?m)^(\d+) 0 obj\n(.*?)endobj", data, re.DOTALL))
    figures = [number for number, text in objects.items() if b"/S /Figure" in text]
    assert len(figures) > 6
    assert len(set(re.findall(rb"/Pg (\d+) 0 R", data))) > 1, "several sheets, or nothing could be cut"
    for figure in figures:
        assert len(sheets_of(figure, objects)) <= 1


@pytest.mark.parametrize("sheet", ["A4", "Letter"])
def test_a_shoot_card_of_twelve_lights_and_six_cameras_is_one_sheet(opened, sheet):
    page = opened("card")
    data = page.pdf(format=sheet)
    assert len(re.findall(rb"/Type /Page\b", data)) == 1
    assert page.locator("table tbody tr").count() == 14
    assert "<b>chart room</b>" in page.locator("body").inner_text()


def sheets_of(number, objects):
    """Sheets on which an element of the tagged document has contents."""
    text = objects[number]
    found = set(re.findall(rb"/Pg (\d+) 0 R", text))
    children = re.search(rb"/K (\[.*?\]|\d+ 0 R)", text, re.DOTALL)
    for child in re.findall(rb"(?<!/Pg )\b(\d+) 0 R", children[1] if children else b""):
        if b"/StructElem" in objects.get(child, b""):
            found |= sheets_of(child, objects)
    return found
