"""The program, run on the captures as written, finds their truth again."""

import json
from pathlib import Path

import pytest

import flicker
from flicker.errors import NotMeasurable

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
TRUTH = json.loads((FIXTURES / "truth.json").read_text(encoding="utf-8"))
HOW = {
    "bridge-display-night-new-driver.wav": {"dc_coupled": True, "dark_level": 0.01},
    "corridor-lamp-recorder.wav": {},
    "sensor-covered.csv": {},
}
CHANNELS = [
    pytest.param(file, number, truth, id=f"{file}-{name}")
    for file, capture in TRUTH.items()
    for number, (name, truth) in enumerate(capture["channels"].items())
]


def measured(file, **changes):
    how = {**HOW.get(file, {"dark_level": TRUTH[file]["dark_level"]}), **changes}
    return flicker.measure(flicker.read(FIXTURES / file, **how)).captures[0]


@pytest.mark.parametrize(("file", "number", "truth"), CHANNELS)
def test_the_truth_is_found(file, number, truth):
    channel = measured(file).channels[number]
    found = {name: measure.value for name, measure in channel.measures.items()}
    if truth["fundamental_frequency_hz"] is None:
        assert found["fundamental_frequency"] is None
    else:
        assert found["fundamental_frequency"] == pytest.approx(truth["fundamental_frequency_hz"], rel=50e-6)
    if truth["percent_flicker"] is not None:
        assert found["percent_flicker"] == pytest.approx(truth["percent_flicker"], abs=0.5)
        assert found["flicker_index"] == pytest.approx(truth["flicker_index"], abs=0.005)
        assert found["rms_modulation"] == pytest.approx(truth["rms_modulation"], rel=0.03, abs=0.1)
        assert channel.observation.mean == pytest.approx(truth["mean"], rel=0.02)
        assert channel.risk_region.region == truth["risk_region"]
    if truth["duty_cycle"] is not None:
        assert found["duty_cycle"] == pytest.approx(truth["duty_cycle"], abs=0.005)


@pytest.mark.parametrize("file", TRUTH)
def test_the_capture_is_read_as_it_was_written(file):
    capture = measured(file)
    truth = TRUTH[file]
    assert len(capture.channels) == len(truth["channels"])
    for channel, name in zip(capture.channels, truth["channels"], strict=True):
        trace = channel.trace
        assert trace.sample_rate == pytest.approx(truth["sample_rate_hz"], rel=1e-9)
        assert trace.samples == truth["samples"]
        if file.endswith(".csv"):
            assert (trace.name, trace.unit) == (name, truth["unit"])


def test_the_covered_sensor_gives_the_dark_level():
    dark = flicker.read(FIXTURES / "sensor-covered.csv").traces[0].light.mean()
    assert dark == pytest.approx(TRUTH["sensor-covered.csv"]["dark_level"], abs=3e-5)
    by_capture = measured("bridge-display-dusk.csv", dark_level=None, dark_capture=FIXTURES / "sensor-covered.csv")
    depth = by_capture.channels[0].measures["percent_flicker"].value
    assert depth == pytest.approx(TRUTH["bridge-display-dusk.csv"]["channels"]["light"]["percent_flicker"], abs=0.5)


def test_a_lost_mean_is_said_and_can_be_given():
    (channel,) = measured("corridor-lamp-recorder.wav").channels
    assert channel.measures["percent_flicker"].value is None
    assert "--mean" in channel.measures["percent_flicker"].reason
    assert channel.risk_region is None
    with pytest.raises(NotMeasurable):
        _ = channel.observation.level
    (given,) = measured("corridor-lamp-recorder.wav", mean=0.4).channels
    truth = TRUTH["corridor-lamp.csv"]["channels"]["light"]
    assert given.measures["percent_flicker"].value == pytest.approx(truth["percent_flicker"], abs=0.5)


def test_noise_is_no_flicker():
    """The brightest and the darkest of 5000 readings lie 3.6 to 3.9 standard deviations off (half of peak to peak)."""
    trace = flicker.read(FIXTURES / "mess-room-lamp.csv", dark_level=0.012).traces[0]
    light = trace.above_dark
    naive = 100 * (light.max() - light.min()) / (light.max() + light.min())
    (channel,) = measured("mess-room-lamp.csv").channels
    assert naive > 0.6
    assert channel.measures["percent_flicker"].value < 0.1
