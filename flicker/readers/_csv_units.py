"""Cells that carry their unit with the number, "1.2 V" beside "950 mV": the unit of the column, and numbers in it."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import numpy.typing as npt

from flicker.readers._csv_dialect import TableShape, find_shape
from flicker.readers._csv_head import known_unit, read_head
from flicker.readers._csv_numbers import OVERLOAD, Bools, Bytes, Integers
from flicker.readers._csv_rows import LINE_END, Kinds, Line, RowReader
from flicker.readers._csv_text import as_words
from flicker.trace import FloatArray

_LONGEST = 14  # bytes of a unit
_LOOK = 200  # rows whose units are looked at
_BLANK = ord(" ")
_ONE_OF = "s, ms, us, V, mV, A, W, lx or cd/m²"
_TIMES = {
    "s": Fraction(1),
    "ms": Fraction(1, 10**3),
    "us": Fraction(1, 10**6),
    "ns": Fraction(1, 10**9),
    "min": Fraction(60),
}
_PREFIXES = {
    "n": Fraction(1, 10**9),
    "u": Fraction(1, 10**6),
    "µ": Fraction(1, 10**6),
    "m": Fraction(1, 10**3),
    "": Fraction(1),
    "k": Fraction(10**3),
    "M": Fraction(10**6),
}
_PREFIXED = re.compile(r"([numkMµ]?)(V|A|lx|lm|W|cd|cd/m²|W/m²|W/cm²|Ohm|Ω)")
_NO_LIGHT = ("Ohm", "Ω", "dB")
_STRANGE = re.compile(rb"[ \t\"']*[-+]?[\d.,]*\d[ \t]*([A-Za-z\x80-\xff%][^\s\d,;|\"']*)[ \t\"'\r]*")


def _table(bytes_in: bytes) -> Bools:
    return np.isin(np.arange(256), list(bytes_in))


_LETTERS = _table(bytes(range(65, 91)) + bytes(range(97, 123)) + b"%" + bytes(range(128, 256)))
_JOINING = _LETTERS | _table(b"/^.")
_ENDING = _table(b" \t\r\n,;|\"'")
_EXPONENT = _table(b"eEdD")
_DIGITS = _table(b"0123456789")
_AFTER_EXPONENT = _table(b"0123456789+-")
_VALUE_ENDS = _table(b"0123456789.*-#>") | _LETTERS

Words = npt.NDArray[np.bytes_]


def size_of(unit: str) -> tuple[str, Fraction]:
    """
    Part the symbol of a unit into the unit without prefix and what the prefix stands for.

    Examples
    --------
    >>> size_of("mV"), size_of("us"), size_of("counts")
    (('V', Fraction(1, 1000)), ('s', Fraction(1, 1000000)), ('counts', Fraction(1, 1)))
    """
    if unit in _TIMES:
        return "s", _TIMES[unit]
    found = _PREFIXED.fullmatch(unit)
    return (found[2], _PREFIXES[found[1]]) if found else (unit, Fraction(1))


# where units stand


@dataclass(frozen=True, slots=True)
class _Units:
    """Units found behind numbers in a piece of text, in order."""

    starts: Integers  # shape (u,)
    stops: Integers
    kinds: Integers  # index into `names`
    names: tuple[str, ...]  # symbols as `known_unit` gives them

    @classmethod
    def within(cls, piece: Bytes, passed_over: bytes = b" \t") -> _Units:
        """Find every known unit that a value precedes, with nothing but bytes to pass over between them."""
        letters = _LETTERS[piece]
        letters[1:-1] &= ~(_EXPONENT[piece[1:-1]] & _DIGITS_OR_MARK[piece[:-2]] & _AFTER_EXPONENT[piece[2:]])
        starts = np.flatnonzero(letters[1:] & ~_JOINING[piece[:-1]]) + 1
        here = np.arange(piece.size)
        here[_table(passed_over)[piece]] = 0
        before = np.maximum.accumulate(here)
        starts = starts[_VALUE_ENDS[piece[before[starts - 1]]]]
        enders = np.append(np.flatnonzero(_ENDING[piece]), piece.size)
        stops = enders[np.searchsorted(enders, starts)]
        spellings, kinds = np.unique(_words(piece, starts, stops), return_inverse=True)
        names = tuple(_symbol(spelling) for spelling in spellings.tolist())
        known = np.array([bool(name) for name in names], dtype=bool)[kinds]
        return cls(starts[known], stops[known], kinds[known], names)

    def taken_off(self, piece: Bytes) -> Bytes:
        """Give the text with blanks in place of the units."""
        edges = np.zeros(piece.size + 1, dtype=np.int8)
        edges[self.starts] += 1
        edges[self.stops] -= 1
        piece = piece.copy()
        piece[np.cumsum(edges[:-1], dtype=np.int8) > 0] = _BLANK
        return piece


_DIGITS_OR_MARK = _DIGITS | _table(b".,")


def _words(piece: Bytes, starts: Integers, stops: Integers) -> Words:
    """Copy words; what is too long for a unit becomes empty."""
    places = starts[:, None] + np.arange(_LONGEST)
    within = (places < stops[:, None]) & (stops - starts <= _LONGEST)[:, None]
    letters = np.where(within, piece[np.minimum(places, piece.size - 1)], 0).astype(np.uint8)
    return letters.view(f"S{_LONGEST}")[:, 0]


def _symbol(spelling: bytes) -> str:
    text = as_words(spelling)
    return "" if text[-1:] in (")", "]", "}", ">") else known_unit(text)


def _without_units(lines: Sequence[bytes]) -> list[bytes]:
    if not lines:
        return []
    piece = np.frombuffer(b"\n".join(lines) + b"\n", dtype=np.uint8)
    return _Units.within(piece).taken_off(piece).tobytes().split(b"\n")[:-1]


# reading


class UnitReader(RowReader):
    """
    Reads lines whose cells carry units; numbers come in the unit of their column.

    A number that lacks its unit, unless it is 0, or has one of another quantity, makes its row a damaged one.
    """

    def __init__(self, shape: TableShape, wanted: tuple[int, ...]) -> None:
        super().__init__(shape.dialect, wanted, shape.clock)
        self._units = shape.units
        self._beside = shape.units_beside

    def read(self, piece: Bytes) -> tuple[FloatArray, Kinds]:
        """Read whole lines, as `RowReader` does."""
        if self._dialect.quoted:
            piece = self._unquoted(piece)
        plain, cells = self._cells(piece)
        values, kinds = super().read(plain)
        for index, column in enumerate(self._wanted):
            if column not in self._units:
                continue
            lines, found, names = cells(column)
            bare = np.ones(len(kinds), dtype=bool)
            bare[lines[found >= 0]] = False
            own, size = size_of(self._units[column])
            for kind in np.unique(found[found >= 0]).tolist():
                rows = lines[found == kind]
                base, other = size_of(names[kind])
                if base != own:
                    bare[rows] = True
                elif other != size:
                    values[index, rows] = _times(values[index, rows], other / size)
            damaged = bare & np.isfinite(values[index]) & (values[index] != 0) & (kinds == Line.ROW)
            kinds[damaged] = Line.DAMAGED
        return values, kinds

    def seen(self, lines: Sequence[bytes], column: int) -> list[str]:
        """Give the units that a column carries in these lines, one a line that has one."""
        piece = np.frombuffer(b"\n".join(lines) + b"\n", dtype=np.uint8)
        if self._dialect.quoted:
            piece = self._unquoted(piece)
        _, found, names = self._cells(piece)[1](column)
        return [names[kind] for kind in found.tolist() if kind >= 0]

    def _cells(self, piece: Bytes) -> tuple[Bytes, Callable[[int], tuple[Integers, Integers, tuple[str, ...]]]]:
        """
        Take the units off, and give a function that finds those of a column.

        It gives the lines that have such a cell, the kind of its unit in each (-1 where it has none), and the names of
        all kinds.
        """
        within = _Units.within(piece)
        plain = within.taken_off(piece)
        beside = _Units.within(piece, b" \t" + self._dialect.delimiter) if self._beside else within
        starts, _, first, counts = self._tokens(plain)
        line_ends = np.flatnonzero(plain == LINE_END)
        pair = 2 if self._dialect.paired else 1

        def of(column: int) -> tuple[Integers, Integers, tuple[str, ...]]:
            units = beside if column in self._beside else within
            cells = column + (column in self._beside)
            lines = np.flatnonzero(counts > column * pair + pair - 1)
            begin = starts[first[lines] + column * pair]
            after = (cells + 1) * pair
            further = counts[lines] > after
            limit = line_ends[lines].copy()
            limit[further] = starts[first[lines[further]] + after]
            found = np.full(len(lines), -1)
            if len(units.starts):
                next_one = np.searchsorted(units.starts, begin)
                inside = next_one < len(units.starts)
                inside[inside] = units.starts[next_one[inside]] < limit[inside]
                found[inside] = units.kinds[next_one[inside]]
            return lines, found, units.names

        return plain, of


def _times(values: FloatArray, factor: Fraction) -> FloatArray:
    """Multiply by a power of ten with one rounding; overload marks stay what they are."""
    scaled = values * float(factor.numerator) / float(factor.denominator)
    return np.where(np.abs(values) < OVERLOAD, scaled, values)


# recognising


class OddUnit(Exception):
    """A column carries what cannot be read as light or time; the message says what is wrong and what to do."""


def find_shape_with_units(
    first: Sequence[bytes], later: Sequence[bytes], wanted: Sequence[int], plain: TableShape | None
) -> TableShape | None:
    """
    Find the table in a file of text, as `find_shape` does, where its cells carry units.

    Parameters
    ----------
    first, later : sequence of bytes
        Lines from the beginning, and from further places.
    wanted : sequence of int
        Columns that are to be read in any case, from 0.
    plain : TableShape or None
        What `find_shape` makes of them.

    Returns
    -------
    TableShape or None
        `plain` if no cell carries a unit.

    Raises
    ------
    OddUnit
        If a column carries units of several quantities.
    """
    sample = [line for line in (later or first[len(first) // 4 :]) if line.strip(b" \t\r,;|\x00")][:_LOOK]
    within = [before != after for before, after in zip(sample, _without_units(sample), strict=True)]
    united = sum(within) * 2 >= len(sample) > 1
    shape = find_shape(_without_units(first), _without_units(later), wanted) if united else plain
    if shape is None:
        return plain
    rows = first[len(shape.head) : len(shape.head) + _LOOK]
    beside = tuple(_columns_beside(shape, rows)) if shape.dialect.delimiter != b" " else ()
    if not united and not beside:
        return plain
    shape = dataclasses.replace(
        shape,
        head=tuple(first[: len(shape.head)]),
        beside=tuple(_beside(shape, rows)) if shape.dialect.delimiter != b" " else (),
        units_beside=beside,
    )
    reader = UnitReader(shape, shape.numeric)
    seen = {column: reader.seen([*rows, *later[:_LOOK]], column) for column in shape.numeric}
    stated = read_head(shape).units
    units = {
        column: _common(column, names)
        for column, names in seen.items()
        if len(names) * 2 > len(rows) and not (column in beside and column in stated and len(set(names)) == 1)
    }
    return dataclasses.replace(shape, units=units) if units else plain


def _beside(shape: TableShape, rows: Sequence[bytes]) -> Iterator[bytes]:
    """Give the cells that hold no numbers, as `find_shape` does, but with their units."""
    for line in rows[:100]:
        cells = shape.dialect.cells(line)
        yield shape.dialect.delimiter.join(cell for column, cell in enumerate(cells) if column not in shape.numeric)


def _columns_beside(shape: TableShape, rows: Sequence[bytes]) -> Iterator[int]:
    """Give the columns of numbers whose next column holds nothing but units."""
    cells = [cells for cells in map(shape.dialect.cells, rows) if len(cells) == shape.fields]
    for column in shape.numeric:
        if column + 1 < shape.fields and column + 1 not in shape.numeric and cells:
            units = [_symbol(row[column + 1]) for row in cells]
            if sum(map(bool, units)) >= 0.9 * len(cells):
                yield column


def _common(column: int, seen: Sequence[str]) -> str:
    """Give the unit of a column: the one that all cells carry, or else that without prefix."""
    units = list(dict.fromkeys(seen))
    bases = list(dict.fromkeys(size_of(unit)[0] for unit in units))
    if len(bases) > 1:
        raise OddUnit(
            f"column {column + 1} holds numbers in {bases[0]} and numbers in {bases[1]}; export each quantity as a "
            "column of its own"
        )
    return units[0] if len(units) == 1 else bases[0]


def is_no_light(unit: str) -> bool:
    """Whether readings in a unit cannot grow in proportion to light: resistance, logarithms."""
    return size_of(unit)[0] in _NO_LIGHT


def strange_cell(lines: Sequence[bytes]) -> str:
    """Say which cell has an unknown unit, where most of these lines have one; empty if they have none."""
    examples: list[str] = []
    for line in lines[-_LOOK:]:
        delimiter = next((mark for mark in (b";", b"\t", b"|") if mark in line), b",")
        found = [one for one in map(_STRANGE.fullmatch, line.split(delimiter)) if one and not _symbol(one[1])]
        examples += [as_words(one[0]).strip(" \t\"'\r") for one in found[:1]]
    if not examples or len(examples) * 2 < len(lines[-_LOOK:]):
        return ""
    return (
        f"cells such as '{examples[0][:30]}' carry a unit that is not known; export plain numbers, or numbers in "
        f"{_ONE_OF}"
    )
