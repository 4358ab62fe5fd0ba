"""The films of the demonstration: what the script films, and the truth that the program finds in them."""

import json
from pathlib import Path

import numpy as np
import pytest

from flicker.demo import write_films
from flicker.filmed import find_line_time, map_video, read_back
from flicker.readers.video import read_footage

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
TRUTH = json.loads((FIXTURES / "truth-of-films.json").read_text(encoding="utf-8"))


def test_the_films_are_what_the_script_films(tmp_path):
    """Encoders of other versions write other bytes: the light is what must agree."""
    write_films(tmp_path)
    assert json.loads((tmp_path / "truth-of-films.json").read_text(encoding="utf-8")) == TRUTH
    assert {path.name for path in tmp_path.glob("*.mp4")} == set(TRUTH) == {p.name for p in FIXTURES.glob("*.mp4")}
    for name in TRUTH:
        made, kept = (read_footage(folder / name).lines_of("all") for folder in (tmp_path, FIXTURES))
        assert made.shape == kept.shape
        assert np.abs(made - kept).mean() < 0.003, f"{name}: run fixtures/make.py"


def test_the_line_time_is_found():
    truth = TRUTH["generator-1003hz.mp4"]
    found = find_line_time(FIXTURES / "generator-1003hz.mp4", 1003.0)
    assert found.line_time.value == pytest.approx(truth["line_time_s"], rel=2e-4)
    assert found.line_time.low <= truth["line_time_s"] <= found.line_time.high
    assert found.footage.read_direction == truth["read_direction"]


def test_the_lamp_is_read_back():
    truth = TRUTH["dock-lamp.mp4"]
    report = read_back(FIXTURES / "dock-lamp.mp4", line_time=truth["line_time_s"], exposure=truth["exposure_s"])
    for channel, light in zip(report.stripes.channels, truth["lights"], strict=False):
        assert channel.name == light["channel"]
        assert channel.measures["fundamental_frequency"].value == pytest.approx(
            light["fundamental_frequency_hz"], rel=20e-6
        )
        assert channel.measures["percent_flicker"].value == pytest.approx(light["percent_flicker"], abs=1.5)
        if light["decay_time_s"]:
            assert channel.measures["decay_time"].value == pytest.approx(light["decay_time_s"], rel=0.08)


def test_the_zones_are_found():
    truth = TRUTH["bridge-display-1000fps.mp4"]
    found = map_video(
        FIXTURES / "bridge-display-1000fps.mp4",
        frame_rate=truth["frame_rate_hz"],
        exposure=truth["exposure_s"],
        line_time=truth["line_time_s"],
    )
    assert found.kind == "staggered zones"
    by_place = {min(zone.cells): zone for zone in found.zones}
    assert len(by_place) == 4
    lights = {(6 * light["zone"][0], 8 * light["zone"][1]): light for light in truth["lights"]}
    reference = lights[min(found.zones[0].cells)]["switched_on_after_cycles"]
    for place, zone in by_place.items():
        light = lights[place]
        assert zone.frequency == pytest.approx(light["fundamental_frequency_hz"], rel=1e-4)
        assert zone.duty == pytest.approx(light["duty_cycle"], abs=0.03)
        ahead = reference - light["switched_on_after_cycles"]
        assert abs((zone.phase - ahead + 0.5) % 1.0 - 0.5) < 0.02
