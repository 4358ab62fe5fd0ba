"""One light at several rates: the frequency that fits them all, against lights whose frequency is known."""

import json

import numpy as np
import pytest
from click.testing import CliRunner
from hypothesis import given, settings
from hypothesis import strategies as st

import flicker
from flicker.aliases import Seen, settle
from flicker.cli import program
from flicker.trace import Capture
from flicker.waveforms import pwm, sampled


def seen_of(frequency, rate, error=1e-3, seed=0):
    off = np.random.default_rng(seed).normal(0, error)
    return Seen("capture", abs(Seen("", 0.0, error, rate).folded(frequency) + off), error, rate)


@given(
    frequency=st.floats(60, 40e3),
    slow=st.floats(900, 1100),
    middle=st.floats(4100, 5900),
    quick=st.floats(7300, 19e3),
    seed=st.integers(0, 999),
)
@settings(max_examples=150, deadline=None, derandomize=True)
def test_three_rates_leave_the_true_frequency(frequency, slow, middle, quick, seed):
    rates = (slow, middle, quick)
    found = settle([seen_of(frequency, rate, seed=seed + place) for place, rate in enumerate(rates)], clock=1e-6)
    assert any(abs(one - frequency) < 0.2 for one in found.fits), "sampling theorem: seen at |k r +- f|"


@pytest.mark.parametrize("frequency", [120.0, 3210.0, 20_010.0])  # below both Nyquist frequencies, between, above
def test_captures_of_one_light_settle_it(frequency):
    light = pwm(frequency, 0.4, 0.3)
    traces = [
        sampled(light.at, sample_rate=rate, duration=1.0, noise=0.01, seed=4, dark_level=0.0) for rate in (5e3, 7.3e3)
    ]
    found = flicker.same_light(flicker.measure(*(Capture((trace,)) for trace in traces)), clock_ppm=1.0)
    assert found.frequency == pytest.approx(frequency, abs=0.2)
    assert all(off > 3 for _, off in found.others)


def test_what_cannot_be_settled_says_why():
    one = seen_of(20_010.0, 5000.0)
    with pytest.raises(flicker.InputError, match="two captures"):
        settle([one])
    with pytest.raises(flicker.InputError, match="another rate"):
        settle([one, one])
    several = settle([one, seen_of(20_010.0, 10_000.0)], clock=1e-6)
    assert several.frequency is None and "all fit" in several.reason, "rates in a simple ratio leave many"
    none = settle([one, Seen("other", 1234.5, 1e-3, 7300.0)], clock=1e-6)
    assert none.frequency is None and "no frequency" in none.reason


def test_the_command_answers_in_words_and_in_data(tmp_path):
    light = pwm(20_010.0, 0.4, 0.3)
    paths = []
    for rate in (5000, 7300):
        trace = sampled(light.at, sample_rate=rate, duration=1.0, noise=0.01, seed=2)
        paths.append(str(tmp_path / f"deck-{rate}.csv"))
        table = np.column_stack([np.arange(trace.samples) / rate, trace.light])
        np.savetxt(paths[-1], table, delimiter=",", header="time (s),light (V)", comments="", fmt="%.9f")
    data = tmp_path / "report.json"
    told = CliRunner().invoke(program, ["measure", *paths, "--dark-level", "0", "--same-light", "--json", str(data)])
    assert told.exit_code == 0, told.output
    assert "20.01 kHz" in told.output and "fits all captures" in told.output
    settled = json.loads(data.read_text())["same_light"]
    assert settled["low_hz"] < 20_010.0 < settled["high_hz"]
    alone = CliRunner().invoke(program, ["measure", paths[0], "--dark-level", "0", "--same-light"])
    assert alone.exit_code == 2
