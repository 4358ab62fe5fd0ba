"""Numbers as people read them: as many digits as the interval carries, with the prefix that suits the unit."""

from __future__ import annotations

import math

from flicker.results import Measure

_PREFIXES = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n"))
_DIGITS_WITHOUT_INTERVAL = 4
_MOST_DECIMALS = 6
_MOST_DECIMALS_OF = {"%": 3, "1": 4}  # finer is never asked for
_WORDS = {"svm": "SVM", "pst_lm": "Pst LM", "rms_modulation": "RMS modulation"}


def measure_name(name: str) -> str:
    """Spell a measure out: `percent_flicker_below_40hz` becomes `percent flicker below 40 Hz`."""
    words = _WORDS.get(name, name.replace("_", " "))
    head, _, last = words.rpartition(" ")
    return f"{head} {last.removesuffix('hz')} Hz" if head and last.endswith("hz") else words


def _scale(value: float, unit: str) -> tuple[float, str]:
    """Factor and unit that bring the value near 1 to 1000; frequencies stay in Hz below 10 kHz."""
    if unit not in ("s", "Hz") or value == 0 or (unit == "Hz" and 1e-1 <= abs(value) < 1e4):
        return 1.0, unit
    factor, prefix = next((entry for entry in _PREFIXES if abs(value) >= entry[0] * 0.9995), _PREFIXES[-1])
    return factor, prefix + unit


def _decimals(spread: float, digits: int = 2) -> int:
    """Decimals that show the given number of digits of a spread."""
    if spread <= 0:
        return _MOST_DECIMALS
    return min(max(digits - 1 - math.floor(math.log10(spread) + 1e-9), 0), _MOST_DECIMALS)


def _join(number: str, unit: str) -> str:
    return number if unit in ("", "1") else f"{number} {unit}"


def quantity(value: float, unit: str, digits: int = _DIGITS_WITHOUT_INTERVAL) -> str:
    """Give a number and its unit with significant digits, trailing zeros dropped: `19.18 %`, `1.25 kHz`."""
    factor, unit = _scale(value, unit)
    scaled = value / factor
    text = f"{scaled:.{_decimals(abs(scaled), digits)}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return _join("0" if text == "-0" else text, unit)


def measured(measure: Measure) -> tuple[str, str]:
    """
    Give the value and its 95 % interval as text, both in the same unit.

    Parameters
    ----------
    measure : Measure
        One that has a value.

    Returns
    -------
    value, interval : str
        The interval is `± half` where the value lies in its middle, else `low to high`; empty where there is none.
    """
    if measure.value is None:
        raise ValueError("a measure without a value cannot be printed as one")
    value, low, high = measure.value, measure.low, measure.high
    if low is None or high is None:
        return quantity(value, measure.unit), ""
    factor, unit = _scale(value or high, measure.unit)
    value, low, high = value / factor, low / factor, high / factor
    half = (high - low) / 2
    if half <= 0:
        return quantity(measure.value, measure.unit), "± 0"
    decimals = min(_decimals(half), _MOST_DECIMALS_OF.get(unit, _MOST_DECIMALS))
    number = _join(f"{value:.{decimals}f}", unit)
    step = 10.0**-decimals
    if abs((high - value) - (value - low)) > max(0.2 * half, step):
        low, high = math.floor(low / step + 1e-6) * step, math.ceil(high / step - 1e-6) * step
        return number, f"{low:.{decimals}f} to {high:.{decimals}f}"
    return number, f"± {max(half, step):.{decimals}f}"


def round_up(value: float) -> float:
    """Round up to three significant digits, so that what is advised is enough."""
    step = 10.0 ** (math.floor(math.log10(value)) - 2)
    return math.ceil(value / step - 1e-9) * step


def round_down(value: float) -> float:
    """Round down to three significant digits, so that what is allowed is not exceeded."""
    if value <= 0.0:
        return 0.0
    step = 10.0 ** (math.floor(math.log10(value)) - 2)
    return math.floor(value / step + 1e-9) * step
