"""Physical quantities as people write them: `18.9us`, `1/250`, `1.2kHz`, `24000/1001`, `2.5 %`."""

from __future__ import annotations

import math
import re

from flicker.errors import InputError

_PREFIXES = {"G": 1e9, "M": 1e6, "k": 1e3, "K": 1e3, "": 1.0, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "μ": 1e-6, "n": 1e-9}
_PER = r"(?:/|\s*per\s*)"
_UNITS = {
    "time": (r"s|sec|second|seconds", {"min": 60.0, "minute": 60.0, "minutes": 60.0, "h": 3600.0}, "s, ms, us, ns"),
    "frequency": (rf"Hz|fps|S{_PER}s|Sa{_PER}s|lines{_PER}s|frames{_PER}s", {}, "Hz, kHz, MHz"),
}
_NUMBER = r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?"
_QUANTITY = re.compile(rf"\s*({_NUMBER})\s*(?:/\s*({_NUMBER}))?\s*(\S.*?)?\s*")


def parse_quantity(text: str | float, dimension: str) -> float:
    """
    Read a time or a frequency.

    Parameters
    ----------
    text : str or float
        A number, a fraction or a number with a unit; a bare number is in s or Hz.
    dimension : {"time", "frequency"}
        What the quantity is.

    Returns
    -------
    float
        The quantity, finite. [s or Hz]

    Raises
    ------
    InputError
        If the text is no such quantity.

    Examples
    --------
    >>> parse_quantity("18.9us", "time")
    1.89e-05
    >>> parse_quantity("1/250", "time")
    0.004
    >>> parse_quantity("1.2 kHz", "frequency")
    1200.0
    """
    base, others, examples = _UNITS[dimension]
    if isinstance(text, int | float):
        text = repr(text)
    problem = f"'{text}' is no {dimension}: write a number, a fraction like 1/250, or a number with one of {examples}"
    found = _QUANTITY.fullmatch(text)
    if found is None:
        raise InputError(problem)
    number, divisor, unit = found.groups()
    value = float(number)
    if divisor is not None:
        if float(divisor) == 0.0:
            raise InputError(f"'{text}' divides by zero")
        value /= float(divisor)
    if unit:
        prefixed = re.fullmatch(rf"([GMkKmuµμn]?)(?:{base})", unit)
        if unit in others:
            value *= others[unit]
        elif prefixed:
            exponent = round(math.log10(_PREFIXES[prefixed.group(1)]))
            value = value * 10.0**exponent if exponent >= 0 else value / 10.0**-exponent
        else:
            raise InputError(problem)
    if not math.isfinite(value):
        raise InputError(problem)
    return value
