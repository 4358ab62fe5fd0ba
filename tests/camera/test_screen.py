"""Flicker over the picture: zones with duties and phases of their own."""

import json

import numpy as np
import pytest
from click.testing import CliRunner

from flicker.camera.render import Lit, Shot, write_clip
from flicker.cli import program
from flicker.filmed import map_video
from flicker.light import Pulse

FREQUENCY, HEIGHT, WIDTH = 117.3, 60, 96
DUTIES = (0.2, 0.35, 0.5, 0.65)


def zones_of(path, places, duties, phases, *, frame_rate=960.0, line_time=8e-6, frames=240, **changes):
    parts = []
    for (rows, columns, level), duty, phase in zip(places, duties, phases, strict=True):
        scene = np.zeros((HEIGHT, WIDTH))
        scene[rows, columns] = level
        parts.append(Lit(scene, [Pulse(FREQUENCY, duty)], delay=-phase / FREQUENCY))
    write_clip(path, Shot(line_time, frame_rate, 1 / 2000, frames, parts, noise=0.01, options={"crf": "16"}, **changes))


def quarters():
    halves = [(slice(0, 30), slice(30, 60)), (slice(0, 48), slice(48, 96))]
    return [
        (rows, columns, 0.16 - 0.02 * (2 * r + c))
        for r, rows in enumerate(halves[0])
        for c, columns in enumerate(halves[1])
    ]


def test_four_zones_with_their_duties_and_phases(tmp_path):
    zones_of(tmp_path / "clip.mp4", quarters(), DUTIES, (0.0, 0.25, 0.5, 0.75))
    found = map_video(tmp_path / "clip.mp4", rows=6, columns=8, line_time=8e-6, exposure=1 / 2000)
    assert len(found.zones) == 4
    for number, zone in enumerate(found.zones):
        assert zone.duty == pytest.approx(DUTIES[number], abs=0.03)
        assert abs((zone.phase - 0.25 * number + 0.5) % 1 - 0.5) < 0.02
        assert zone.frequency == pytest.approx(FREQUENCY, rel=1e-4)
        assert len(zone.cells) == 12
    assert found.kind == "staggered zones"


def test_a_scanning_backlight_is_named(tmp_path):
    places = [(slice(15 * k, 15 * k + 15), slice(0, 96), 0.15) for k in range(4)]
    zones_of(tmp_path / "clip.mp4", places, (0.3,) * 4, (0.0, 0.2, 0.4, 0.6))
    found = map_video(tmp_path / "clip.mp4", rows=4, columns=8, line_time=8e-6, exposure=1 / 2000)
    assert found.kind == "scanning backlight"


def test_a_local_dimming_backlight_with_half_its_zones_dark(tmp_path):
    """30 zones of four emitters each: common practice, no source."""
    rng = np.random.default_rng(30)
    lit = np.zeros(30, bool)
    lit[rng.permutation(30)[:15]] = True
    lit = lit.reshape(5, 6)
    duties = rng.uniform(0.15, 0.85, (5, 6))
    rows, columns = np.linspace(0, HEIGHT, 6).astype(int), np.linspace(0, WIDTH, 7).astype(int)
    places = [
        (slice(rows[r], rows[r + 1]), slice(columns[c], columns[c + 1]), 0.15)
        for r, c in zip(*np.nonzero(lit), strict=True)
    ]
    zones_of(tmp_path / "clip.mp4", places, duties[lit], np.zeros(15))
    found = map_video(tmp_path / "clip.mp4", rows=5, columns=6, line_time=8e-6, exposure=1 / 2000)
    np.testing.assert_array_equal(found.dark, ~lit)
    inner = np.abs(found.duty[lit] - duties[lit])
    assert np.median(inner) < 0.03
    assert np.isnan(found.frequency[~lit]).all()


def test_a_rolling_shutter_at_an_ordinary_rate_serves_too(tmp_path):
    places = [(slice(0, 60), slice(0, 48), 0.15), (slice(0, 60), slice(48, 96), 0.13)]
    zones_of(tmp_path / "clip.mp4", places, (0.4, 0.4), (0.0, 0.3), frame_rate=29.97, line_time=400e-6, frames=60)
    found = map_video(tmp_path / "clip.mp4", rows=3, columns=8, line_time=400e-6, exposure=1 / 2000)
    assert len(found.zones) == 2
    assert found.zones[1].phase == pytest.approx(0.3, abs=0.03)


def test_the_command_prints_zones_and_draws_maps(tmp_path):
    zones_of(tmp_path / "clip.mp4", quarters(), DUTIES, (0.0, 0.25, 0.5, 0.75))
    words = [
        "map",
        str(tmp_path / "clip.mp4"),
        "--rows",
        "6",
        "--columns",
        "8",
        "--figures",
        str(tmp_path / "pictures"),
    ]
    done = CliRunner().invoke(program, [*words, "--json", str(tmp_path / "map.json")])
    assert done.exit_code == 0, done.output
    assert "4 zones" in done.output
    assert (tmp_path / "pictures" / "map.png").stat().st_size > 10_000
    data = json.loads((tmp_path / "map.json").read_text())
    assert (data["rows"], data["columns"]) == (6, 8)
    assert len(data["phase_cycles"]) == 6
    assert {"cells", "frequency_hz", "percent_flicker", "duty_cycle", "phase_cycles"} <= set(data["zones"][0])
