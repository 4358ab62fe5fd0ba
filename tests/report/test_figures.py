import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.figures import measure_name, measured, quantity
from flicker.results import Measure

FACTORS = {"": 1.0, "G": 1e9, "M": 1e6, "k": 1e3, "m": 1e-3, "µ": 1e-6, "n": 1e-9}
values = st.floats(1e-6, 1e6)
shares = st.floats(1e-5, 0.5)


def number(text, unit):
    found = re.fullmatch(rf"(-?[\d.]+)(?: ([GMkmµn]?){re.escape(unit)})?", text)
    assert found, text
    return float(found.group(1)) * FACTORS[found.group(2) or ""]


@given(value=values, share=shares, unit=st.sampled_from(["Hz", "s", "%"]))
def test_the_text_holds_the_value_to_a_twentieth_of_its_interval(value, share, unit):
    half = value * share
    text, interval = measured(Measure(value, unit, value - half, value + half))
    printed = number(text, unit)
    coarsest = 0.6e-3 if unit == "%" else 0.6e-6 * (printed and abs(printed / float(text.split()[0])))
    assert abs(printed - value) <= max(half / 19, coarsest)
    assert interval.startswith("± ")


@given(value=values, digits=st.integers(3, 6), unit=st.sampled_from(["Hz", "s"]))
def test_a_quantity_keeps_its_digits(value, digits, unit):
    text = quantity(value, unit, digits)
    assert number(text, unit) == pytest.approx(value, rel=0.51 * 10 ** (1 - digits), abs=0.51e-9)


@pytest.mark.parametrize(
    ("measure", "expected"),
    [
        (Measure(239.70032, "Hz", 239.69, 239.71), ("239.700 Hz", "± 0.010")),
        (Measure(99.98, "%", 99.5, 100.0), ("99.98 %", "99.50 to 100.00")),
        (Measure(0.02, "%", 0.0, 0.05), ("0.020 %", "0.000 to 0.050")),
        (Measure(1.23e-5, "s", 1.2e-5, 1.26e-5), ("12.30 µs", "± 0.30")),
        (Measure(0.95, "1", 0.949, 0.951), ("0.9500", "± 0.0010")),
        (Measure(0.0, "%", 0.0, 0.0), ("0 %", "± 0")),
        (Measure(12.0, "%"), ("12 %", "")),
        (Measure(0.0, "s", 0.0, 2e-5), ("0 µs", "0 to 20")),
    ],
)
def test_a_measure_is_printed_as_its_interval_allows(measure, expected):
    assert measured(measure) == expected


@pytest.mark.parametrize(
    ("value", "unit", "expected"),
    [
        (1250.0, "Hz", "1250 Hz"),
        (20_000.0, "Hz", "20 kHz"),
        (0.4, "s", "400 ms"),
        (0.05, "V", "0.05 V"),
        (-0.0, "V", "0 V"),
        (999.96e-6, "s", "1 ms"),
        (0.7, "1", "0.7"),
    ],
)
def test_a_quantity_is_written_as_people_do(value, unit, expected):
    assert quantity(value, unit) == expected


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("percent_flicker", "percent flicker"),
        ("percent_flicker_below_40hz", "percent flicker below 40 Hz"),
        ("svm", "SVM"),
        ("pst_lm", "Pst LM"),
        ("rms_modulation", "RMS modulation"),
    ],
)
def test_a_measure_is_spelled_out(name, expected):
    assert measure_name(name) == expected


def test_what_has_no_value_is_no_figure():
    with pytest.raises(ValueError, match="without a value"):
        measured(Measure.missing("s", "too short"))
