"""Pst LM against the light-domain table of the chain and, through the reference lamp, against IEC 61000-4-15:2010."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flicker.errors import NotMeasurable
from flicker.metrics import Observation
from flicker.metrics.severity import pst_lm
from flicker.signal import severity
from flicker.trace import Segment, Trace

RATE = 2000.0
COMPUTED = "chain of IEC TR 61547-1 (constants from memory), periodic steady state computed in the frequency domain"

RECTANGLES = {  # changes a minute: change of the light over its mean [%] for Pst LM = 1
    1: 7.2605, 2: 5.8912, 7: 3.8739, 39: 2.3938, 110: 1.9309, 1056: 0.6444, 1620: 0.7334, 2400: 1.0063, 4000: 1.8833,
    4800: 4.2730,
}  # fmt: skip
SINES = {  # frequency [Hz]: depth [%] for Pst LM = 1
    0.5: 6.002, 1: 3.5395, 2: 2.1556, 3: 1.5196, 5: 0.8389, 7: 0.5246, 8.8: 0.4175, 10: 0.4037, 13.5: 0.4673,
    15: 0.5076, 20: 0.6406, 25: 0.7709, 30: 0.9500, 33.33: 1.1989, 35: 1.4134, 40: 2.7203,
}  # fmt: skip
# changes a minute: change of the voltage [%] for Pst = 1, IEC 61000-4-15:2010, Table 5, 230 V 50 Hz (from memory)
VOLTAGES = {
    1: 2.715, 2: 2.191, 7: 1.450, 39: 0.894, 110: 0.722, 1620: 0.407, 4000: 2.343,
}  # fmt: skip
WEIGHTS = {  # frequency [Hz]: gain of the weighting, computed from its constants
    1: 0.045895, 2: 0.078603, 5: 0.207898, 8.8: 0.421398, 10: 0.436423, 20: 0.276598,
}  # fmt: skip


def rectangle(changes, swing, *, duration=240.0, rate=RATE, phase=0.25):
    times = np.arange(int(duration * rate)) / rate
    return 1 + swing / 200 * np.where((times * changes / 120 + phase) % 1 < 0.5, 1.0, -1.0)


def tone(frequency, depth, *, duration=180.0, rate=RATE, phase=0.0):
    times = np.arange(int(duration * rate)) / rate
    return 1 + depth / 100 * np.sin(2 * np.pi * frequency * times + phase)


def meter(light, rate=RATE):
    felt = severity.weighted_sensation(light / light.mean(), rate)
    return severity.severity_of(felt[-int(180 * rate) :])


def measured(light, rate=RATE, **how):
    trace = Trace(light, rate, dark_level=0.0, **how)
    return pst_lm(trace, Observation(trace))


@pytest.mark.parametrize("changes", RECTANGLES)
def test_rectangular_light(changes):
    assert meter(rectangle(changes, RECTANGLES[changes])) == pytest.approx(1.0, abs=0.01), COMPUTED


@pytest.mark.parametrize("frequency", SINES)
def test_sines(frequency):
    assert meter(tone(frequency, SINES[frequency])) == pytest.approx(1.0, abs=0.01), COMPUTED


@pytest.mark.parametrize("changes", VOLTAGES)
def test_voltage_through_the_lamp(changes):
    light = severity.light_of_lamp(rectangle(changes, VOLTAGES[changes]), RATE)
    assert meter(light) == pytest.approx(1.0, abs=0.01)


@pytest.mark.parametrize("frequency", WEIGHTS)
def test_the_weighting_stage_by_itself(frequency):
    from scipy.signal import sosfreqz

    weighting = severity.sections(RATE)[4:]
    gain = abs(sosfreqz(weighting, [frequency], fs=RATE)[1][0])
    assert gain == pytest.approx(WEIGHTS[frequency], rel=2e-3)


def test_the_low_pass_and_the_high_pass_by_themselves():
    """Definition of a Butterworth corner: 3.01 dB down; sixth order: 36 dB an octave; first order: 6 dB an octave."""
    from scipy.signal import sosfreqz

    sections = severity.sections(RATE)
    low = np.abs(sosfreqz(sections[1:4], [3.5, 35.0, 70.0], fs=RATE)[1])
    assert low == pytest.approx([1.0, 0.5**0.5, 2.0**-6], rel=0.02)
    high = np.abs(sosfreqz(sections[:1], [0.05, 0.005], fs=RATE)[1])
    assert high == pytest.approx([0.5**0.5, 0.0995], rel=1e-3)


def test_the_peak_sensation_of_a_sine_of_8_8_hz():
    """Calibration: depth 0.2971 % gives a largest sensation of 1 (computed)."""
    felt = severity.weighted_sensation(tone(8.8, 0.2971), RATE)
    assert felt.max() == pytest.approx(1.0, abs=2e-3)


@given(level=st.floats(1e-3, 1e3))
def test_a_steady_sensation_reads_its_root(level):
    """Sum of the weights 0.5096, by hand."""
    assert severity.severity_of(np.full(1000, level)) == pytest.approx((0.5096 * level) ** 0.5, rel=1e-9)


@given(phase=st.floats(0.0, 6.28), frequency=st.floats(5.0, 34.0))
@settings(max_examples=8, deadline=None)
def test_is_blind_to_where_the_capture_starts(phase, frequency):
    shifted = meter(tone(frequency, 1.0, phase=phase))
    assert shifted == pytest.approx(meter(tone(frequency, 1.0)), rel=2e-3)


def test_strong_ripple_of_the_mains_does_not_count():
    """Computed: a sine of full depth reads 0.080 at 100 Hz; a start without a lead-in would read far more."""
    assert meter(tone(100.0, 100.0, phase=1.0)) == pytest.approx(0.080, abs=0.006)


@pytest.mark.parametrize("rate", [1000.0, 5000.0, 20_000.0, 44_100.0])
def test_every_sample_rate_reads_the_same(rate):
    light, reduced = severity.decimated(tone(8.8, 0.4175, rate=rate), rate)
    assert 1000 <= reduced < 4000
    felt = severity.weighted_sensation(light / light.mean(), reduced)
    assert severity.severity_of(felt) == pytest.approx(1.0, abs=0.002), COMPUTED


def test_a_pwm_above_the_reduced_rate_does_not_fold_back():
    light, rate = severity.decimated(tone(1991.2, 100.0, rate=20_000.0), 20_000.0)
    felt = severity.weighted_sensation(light / light.mean(), rate)
    assert severity.severity_of(felt) < 2e-3, "the limit is 1"


def test_the_whole_measurement():
    got = measured(tone(8.8, 0.4175))
    assert got.value == pytest.approx(1.0, abs=0.003), COMPUTED
    assert got.low <= 1.0005
    assert got.high - got.low < 0.01


def test_noise_lowers_the_lower_end_only():
    random = np.random.default_rng(3)
    light = tone(8.8, 0.4175)
    got = measured(light + random.normal(0, 0.003, light.size))
    assert got.low < 1.0 < got.high
    steady = measured(1 + random.normal(0, 0.01, light.size))
    assert steady.low < 0.05
    assert steady.value == pytest.approx(0.486, rel=0.05), "white noise of 1 % at 2 kHz: computed"


def test_the_largest_of_several_windows_counts_and_all_are_told():
    quiet, loud = tone(8.8, 0.1), tone(8.8, 0.4175)
    trace = Trace(np.concatenate([quiet, loud, quiet]), RATE, dark_level=0.0)
    got = pst_lm(trace, Observation(trace))
    series = got.series
    assert got.to_dict()["series"][1] == {"start_s": series[1][0], "value": series[1][1]}
    assert len(series) == 3
    assert got.value == pytest.approx(max(value for _, value in series))
    assert "largest of 3 windows" in got.method
    assert [start for start, _ in series] == pytest.approx([20.0, 190.0, 360.0], abs=0.1)


@pytest.mark.parametrize(
    ("light", "rate", "words"),
    [
        (np.ones(2000), 1000.0, "at least 180 s are needed, and the capture has 2 s"),
        (np.ones(90_000), 500.0, "record at 1 kHz or faster"),
    ],
)
def test_says_what_is_missing(light, rate, words):
    with pytest.raises(NotMeasurable, match=words):
        measured(light, rate)


def test_a_gap_breaks_the_three_minutes():
    segments = (Segment(0, 0.0), Segment(150_000, 200.0))
    with pytest.raises(NotMeasurable, match="without a gap"):
        measured(tone(8.8, 0.4, rate=1000.0, duration=300.0), 1000.0, segments=segments)
