"""What the lines above and beside a table say: names, units, sample rate."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from flicker.errors import InputError
from flicker.quantities import parse_quantity
from flicker.readers._csv_dialect import Dialect, TableShape
from flicker.readers._csv_text import as_words
from flicker.readers._timebase import tidy

_TIME_UNITS = {
    "s": "s",
    "sec": "s",
    "secs": "s",
    "second": "s",
    "seconds": "s",
    "ms": "ms",
    "msec": "ms",
    "millisecond": "ms",
    "milliseconds": "ms",
    "us": "us",
    "µs": "us",
    "μs": "us",
    "usec": "us",
    "microsecond": "us",
    "microseconds": "us",
    "ns": "ns",
    "nsec": "ns",
    "nanosecond": "ns",
    "nanoseconds": "ns",
    "min": "min",
}
_READING_UNITS = {
    "volt": "V",
    "volts": "V",
    "millivolt": "mV",
    "millivolts": "mV",
    "ampere": "A",
    "amperes": "A",
    "amp": "A",
    "amps": "A",
    "lux": "lx",
    "klux": "klx",
    "fc": "fc",
    "footcandle": "fc",
    "footcandles": "fc",
    "counts": "counts",
    "count": "counts",
    "adu": "counts",
    "nit": "cd/m²",
    "nits": "cd/m²",
    "percent": "%",
}
_SYMBOL = re.compile(r"[numkMµμ]?(?:V|A|lx|lm|W|cd|cd/m²|W/m²|W/cm²|Ohm|Ω)|%|a\.?u\.?|arb\.?|dB|FS")
_INTERVAL = re.compile(
    r"(?:sampl\w*|time|hor\w*|x)?[ _.-]*(?:interval|increment|incr?|step|delta|spacing|resolution)"
    r"|dt|delta[ _]?t|sampl\w* (?:period|time)|hres|x[ _-]?incr?|tstep|t ?sample|period"
)
_RATE = re.compile(
    r"(?:sampl\w*|acqui\w*|adc|scan|data|effective|actual)?[ _.-]*(?:rate|freq\w*|clock)"
    r"|fs|f_?s(?:ample)?|sampling|samples per second|sps"
)
_NO_RATE = re.compile(r"freq\w*|clock|resolution|period|time resolution")  # alone they mean something else
_FIRST = re.compile(
    r"(?:first|start|begin|initial)[ _-]*(?:time)?|t0|x[ _-]?(?:zero|start|origin|first)|time of first sample"
)
_LAST = re.compile(r"(?:last|stop|end|final)[ _-]*(?:time)?|x[ _-]?(?:stop|end|last)|time of last sample")
_TIME_UNIT = re.compile(r"(?:horizontal|hor\w*|time|x)[ _-]*(?:axis)?[ _-]*units?")
_READING_UNIT = re.compile(r"(?:vertical|vert\w*|y|signal|reading|light|volt\w*)[ _-]*(?:axis)?[ _-]*units?")
_FACT = re.compile(
    r"instrument|model|serial|date|time stamp|firmware|source|format|type|version|operator|file|title|comment"
    r"|record|probe|trigger|pt fmt|\w+ units?|device|lamp|owner|site|place",
    re.IGNORECASE,
)
_VALUE = re.compile(r"\s*([-+]?(?:\d+[.,]?\d*|[.,]\d+)(?:[eE][-+]?\d+)?)\s*(.*?)\s*")
_BRACKETS = re.compile(r"(.*?)\s*[\(\[\{<]\s*([^)\]}>]{0,12})\s*[)\]}>]\s*")


@dataclass(frozen=True, slots=True)
class Stated:
    """A quantity that the head states, and the words that state it."""

    value: float  # SI
    words: str


@dataclass(slots=True)
class Head:
    """What is known of a table before its numbers are read."""

    names: dict[int, str] = field(default_factory=dict)  # of columns, from 0
    units: dict[int, str] = field(default_factory=dict)
    rate: Stated | None = None  # [Hz]
    first: Stated | None = None  # time of the first row [s]
    last: Stated | None = None  # time of the last row [s]
    time_unit: str = ""
    reading_unit: str = ""
    scale: dict[str, float] = field(default_factory=dict)  # ymult, yoff, yzero of raw counts


def known_unit(text: str) -> str:
    """
    Give the usual symbol of a unit, empty if it is none that is known.

    Examples
    --------
    >>> [known_unit(text) for text in ("(µs)", "Volts", "in mV", "mVDC", "lux", "uW/cm2", "lamp")]
    ['us', 'V', 'mV', 'mV', 'lx', 'uW/cm²', '']
    """
    text = text.strip().strip("()[]{}<>").strip().removeprefix("in ").strip()
    if text in _TIME_UNITS or text.lower() in _TIME_UNITS:
        return _TIME_UNITS.get(text, _TIME_UNITS.get(text.lower(), ""))
    if text.lower() in _READING_UNITS:
        return _READING_UNITS[text.lower()]
    text = re.sub(r"(?<=/m)\^?2$|(?<=/cm)\^?2$", "²", re.sub(r"(?i)(?<=V) ?DC$", "", text))
    return text.replace("μ", "µ") if _SYMBOL.fullmatch(text) else ""


def is_time_unit(unit: str) -> bool:
    """Whether a symbol of `known_unit` is one of time."""
    return unit in _TIME_UNITS.values()


def name_and_unit(text: str) -> tuple[str, str]:
    """
    Part a column's name from its unit.

    Examples
    --------
    >>> [name_and_unit(text) for text in ("Time (ms)", "light/V", "CH1 in mV", "time_us", "CH1")]
    [('Time', 'ms'), ('light', 'V'), ('CH1', 'mV'), ('time', 'us'), ('CH1', '')]
    """
    text = text.strip().strip("\"'").lstrip("#;%*!").strip()
    found = _BRACKETS.fullmatch(text)
    if found:
        return found[1].strip(), known_unit(found[2]) or found[2].strip()
    found = re.fullmatch(r"(.*\S)(?:\s*/\s*| in |\s*,\s*|_)(\S+)", text)
    if found and known_unit(found[2]):
        return found[1].strip(), known_unit(found[2])
    return text, ""


def read_head(shape: TableShape) -> Head:
    """Understand the lines above and beside a table."""
    head = Head()
    lines = [line for line in shape.head if line.strip(b" \t\r,;|")]
    for key, value in _facts(shape.dialect, [*lines, *(line for line in shape.beside if line.strip(b" \t\r,;|"))]):
        _take(head, key, value)
    rows = [cells for cells in (_names_of(line, shape) for line in lines[-4:]) if cells]
    _take_names(head, rows, shape)
    head.units.update(shape.units)
    return head


# key and value


def _facts(dialect: Dialect, lines: Sequence[bytes]) -> Iterator[tuple[str, str]]:
    """Give every key with its value: beside it, or below it in the next line."""
    above: list[str] = []
    comma = dialect.decimal == b","
    for line in lines:
        words = as_words(line).strip().strip("\"'").lstrip("#;%*!").strip()
        for mark in (":", "=", "\t", ";", *(() if comma and dialect.delimiter != b"," else (",",))):
            key, found, value = words.partition(mark)
            if found and key.strip() and re.search(r"[A-Za-z]", key):
                yield key, value.strip(f"{mark} \t\"'").replace(mark, " ")
                break
        else:
            found_words = re.fullmatch(r"(.*[A-Za-z)\]])\s+([-+.\d]\S*(?:\s+\S+)?)", words)
            if found_words:
                yield found_words[1], found_words[2]
        cells = [as_words(cell) for cell in dialect.cells(line)]
        for key, value in zip(above, cells, strict=False):
            if re.search(r"[A-Za-z]", key) and _VALUE.fullmatch(value):
                yield key, value
        above = cells


def _take(head: Head, key: str, value: str) -> None:
    """Keep a fact that is about time, rate, units or scale."""
    name, unit = name_and_unit(key)
    found_unit = re.fullmatch(r"(.*)_(hz|khz|mhz|s|ms|us|ns)", key.strip().lower())
    if found_unit:
        name, unit = found_unit[1], found_unit[2]
    plain = re.sub(r"\s+", " ", name.strip().lower())
    words = f"{key.strip()} {value}".strip()
    if _TIME_UNIT.fullmatch(plain):
        head.time_unit = head.time_unit or known_unit(value)
    elif _READING_UNIT.fullmatch(plain):
        head.reading_unit = head.reading_unit or known_unit(value)
    elif plain in ("ymult", "yoff", "yzero"):
        number = _VALUE.fullmatch(value)
        if number:
            head.scale.setdefault(plain, float(number[1].replace(",", ".")))
    elif _INTERVAL.fullmatch(plain) and not (_NO_RATE.fullmatch(plain)):
        interval = _quantity(value, unit, "time")
        if interval and interval > 0 and head.rate is None:
            head.rate = Stated(tidy(1.0 / interval), words)
    elif _RATE.fullmatch(plain) and not _NO_RATE.fullmatch(plain):
        rate = _quantity(value, unit, "frequency")
        if rate and rate > 0 and head.rate is None:
            head.rate = Stated(rate, words)
    elif _FIRST.fullmatch(plain) and head.first is None:
        time = _quantity(value, unit, "time")
        head.first = None if time is None else Stated(time, words)
    elif _LAST.fullmatch(plain) and head.last is None:
        time = _quantity(value, unit, "time")
        head.last = None if time is None else Stated(time, words)


def _quantity(value: str, unit: str, dimension: str) -> float | None:
    """Read a value with the unit behind it, or else the one that its key names; None if it is none of this "
    "dimension."""
    found = _VALUE.fullmatch(value)
    if found is None:
        return None
    number = found[1].replace(",", ".")
    unit = found[2] or unit
    if dimension == "frequency":
        unit = re.sub(r"(?i)(?:sa|samples?|pts?|points?|s)\s*(?:/|per)\s*(?:s|sec\w*)$|sps$|hz$", "Hz", unit.strip())
        unit = re.sub(r"(?i)^(kilo|k)\s*Hz", "kHz", re.sub(r"(?i)^(mega|m)\s*Hz", "MHz", unit))
        unit = re.sub(r"(?i)^(giga|g)\s*Hz", "GHz", unit)
    else:
        unit = re.sub(r"(?i)\s*(?:/|per)\s*(?:sa|samples?|pts?|points?)$", "", unit.strip())
        unit = known_unit(unit) or unit
    try:
        return parse_quantity(f"{number} {unit}".strip(), dimension)
    except InputError:
        try:
            return parse_quantity(f"{number} {unit.split()[0]}", dimension) if " " in unit else None
        except InputError:
            return None


# names of columns


def _names_of(line: bytes, shape: TableShape) -> dict[int, str] | None:
    """Give the words above the columns of numbers; None if the line is no row of names."""
    words = as_words(line).lstrip("#;%*! \t") if line.lstrip()[:1] in (b"#", b"%", b"*", b"!", b";") else as_words(line)
    last = max(shape.numeric)
    ways = [[as_words(cell) for cell in shape.dialect.cells(words.encode())]]
    ways += [words.split(mark) for mark in (",", ";", "\t") if mark in words]
    ways += [re.split(r"\s{2,}", words.strip()), re.findall(r"\S+(?:\s*[\(\[][^)\]]*[)\]])?", words)]
    for cells in ways:
        cells = [cell.strip(" \"'\r\t") for cell in cells]
        if len(cells) <= last or (shape.dialect.delimiter == b" " and len(cells) != shape.fields):
            continue
        if any(_VALUE.fullmatch(cells[column]) for column in shape.numeric) or (
            len(cells) < 3 and _FACT.fullmatch(cells[0])
        ):
            continue
        named = {column: cell for column, cell in enumerate(cells) if cell.strip("-=+:_|")}
        if any(column in named for column in shape.numeric):
            return named
    return None


def _take_names(head: Head, rows: Sequence[dict[int, str]], shape: TableShape) -> None:
    """Tell rows of names from rows of units."""
    units = [all(known_unit(row[column]) for column in shape.numeric if column in row) for row in rows]
    names = None
    if True in units:
        place = units.index(True)
        head.units.update({column: known_unit(text) for column, text in rows[place].items() if known_unit(text)})
        above = [row for row, unit in zip(rows[:place], units[:place], strict=True) if not unit]
        below = [row for row, unit in zip(rows[place:], units[place:], strict=True) if not unit]
        names = above[-1] if above else (below[-1] if below else None)
    elif rows:
        names = rows[-1]
    for column, text in (names or {}).items():
        head.names[column], unit = name_and_unit(text)
        if unit:
            head.units.setdefault(column, unit)
