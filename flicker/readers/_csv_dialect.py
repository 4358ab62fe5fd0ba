"""How a table of text is written: delimiter, decimal mark, which columns hold numbers, where its head ends."""

from __future__ import annotations

import itertools
import re
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from flicker.readers._csv_clock import time_of_day
from flicker.readers._csv_numbers import is_number, number
from flicker.trace import FloatArray

_RUN = 10  # rows in a row that make a table
_SAMPLE = 60  # lines that are looked at for the dialect
_LOOK = 200  # rows whose numbers are looked at for times


@dataclass(frozen=True, slots=True)
class Dialect:
    """Delimiter (a blank stands for any run of blanks), decimal mark, and two bad habits."""

    delimiter: bytes = b","
    decimal: bytes = b"."
    paired: bool = False  # the decimal comma is the delimiter too: every number takes two fields
    quoted: bool = False

    def cells(self, line: bytes) -> list[bytes]:
        """Split a line into its cells, without quotes and outer blanks."""
        line = line.strip(b"\r\x00")
        if self.quoted and b'"' in line:
            line = re.sub(rb'"([^"]*)"', lambda found: found[1].replace(self.delimiter, b"\x01"), line)
        if self.delimiter == b" ":
            return line.split()
        cells = [cell.replace(b"\x01", self.delimiter).strip(b' \t"') for cell in line.split(self.delimiter)]
        if self.paired and len(cells) % 2 == 0:
            cells = [b",".join(pair) for pair in zip(cells[::2], cells[1::2], strict=True)]
        return cells

    def number(self, cell: bytes) -> float | None:
        """Read a cell: a number, NaN or infinity for blanks and marks, None for other text."""
        return number(cell, self.decimal)

    def is_number(self, cell: bytes) -> bool:
        """Whether the cell holds a number, and no mark."""
        return is_number(cell, self.decimal)

    def __str__(self) -> str:
        names = {b",": "comma", b";": "semicolon", b"\t": "tab", b" ": "blanks", b"|": "bar"}
        decimal = ", decimal comma" if self.decimal == b"," else ""
        return f"delimiter {names[self.delimiter]}{decimal}"


_CANDIDATES = tuple(
    (delimiter, decimal)
    for delimiter in (b",", b";", b"\t", b"|", b" ")
    for decimal in (b".", b",")
    if delimiter != decimal
)


@dataclass(frozen=True, slots=True)
class TableShape:
    """What the looked-at lines say about a table."""

    dialect: Dialect
    fields: int  # cells of a row
    numeric: tuple[int, ...]  # columns that hold numbers, from 0
    head: tuple[bytes, ...]  # lines above the first row
    beside: tuple[bytes, ...]  # cells of columns that hold no numbers, beside the first rows, as lines
    values: Mapping[int, FloatArray]  # numbers of the first rows, by column
    clock: int | None = None  # a column of times of day, from 0
    units: Mapping[int, str] = field(default_factory=dict)  # of columns whose cells carry them
    units_beside: tuple[int, ...] = ()  # those of them whose units fill the next column


def find_dialect(lines: Sequence[bytes]) -> Dialect | None:
    """Choose the dialect in which the numbers of these lines cover the most text; None if there are no numbers."""
    quoted = sum(b'"' in line for line in lines) * 2 > len(lines)
    best, best_share = None, 0.0
    for delimiter, decimal in (*_CANDIDATES, *(((b",", b","),) if quoted else ())):
        dialect = Dialect(delimiter, decimal, quoted=quoted)
        covered = total = 0
        for line in lines:
            cells = dialect.cells(line)
            total += sum(map(len, cells))
            covered += sum(len(cell) for cell in cells if dialect.is_number(cell))
        if total and covered / total > best_share + 1e-9:
            best, best_share = dialect, covered / total
    if best == Dialect() and _decimal_is_delimiter(lines):
        return Dialect(b",", b",", paired=True)
    return best


def _decimal_is_delimiter(lines: Sequence[bytes]) -> bool:
    """
    Whether commas of `0,0001,0,52` are decimal marks and delimiters by turns.

    Then nothing but whole numbers stands between commas, the second of each pair has no sign, and it shows what the
    second of two whole numbers never shows: a leading zero, or an exponent after a number that has none.
    """
    telling, firsts = 0, []
    for line in lines:
        cells = [cell.strip() for cell in line.strip(b"\r ,").split(b",")]
        if b"." in line or len(cells) % 2 or not all(re.fullmatch(rb"[-+]?\d+", cell) for cell in cells[::2]):
            return False
        if not all(re.fullmatch(rb"\d+(?:[eE][-+]?\d+)?", cell) for cell in cells[1::2]):
            return False
        telling += any(re.fullmatch(rb"0\d+(?:[eE].*)?|\d+[eE]-\d+", cell) for cell in cells[1::2])
        firsts.append(int(cells[0]))
    counting = all(after - before == firsts[1] - firsts[0] > 0 for before, after in itertools.pairwise(firsts))
    return telling * 100 >= len(lines) > 1 and not counting


def _spread(lines: Sequence[bytes], count: int) -> list[bytes]:
    step = max(1, len(lines) // count)
    return list(lines[::step])


def find_shape(first: Sequence[bytes], later: Sequence[bytes], wanted: Sequence[int] = ()) -> TableShape | None:
    """
    Find the table in a file of text.

    Parameters
    ----------
    first : sequence of bytes
        Lines at the beginning of the file.
    later : sequence of bytes
        Lines from its middle and its end; empty where `first` is the whole file.
    wanted : sequence of int
        Columns that are to be read in any case, from 0.

    Returns
    -------
    TableShape or None
        None if there is no table of numbers.
    """
    filled = [line for line in first if line.strip(b" \t\r,;|\x00")]
    sample = [line for line in later if line.strip(b" \t\r,;|\x00")] or filled[len(filled) // 4 :]
    sample = [line for line in _spread(sample, _SAMPLE) if any(byte in line for byte in b"0123456789")]
    dialect = find_dialect(sample)
    if dialect is None:
        return None
    rows = [cells for cells in map(dialect.cells, sample) if any(map(dialect.is_number, cells))]
    fields = Counter(map(len, rows)).most_common(1)[0][0]
    rows = [cells for cells in rows if len(cells) == fields]
    if len(rows) < 2:
        return None
    numeric = tuple(column for column in range(fields) if _holds_numbers(dialect, [row[column] for row in rows]))
    clock = next((column for column in range(fields) if column not in numeric and _is_clock(rows, column)), None)
    forced = {column for column in wanted if column < fields and column != clock}
    numeric = tuple(sorted({*numeric, *forced}))
    if not numeric:
        return None
    begin = _first_row(dialect, first, numeric)
    if begin is None:
        return None
    rows = [cells for cells in map(dialect.cells, first[begin : begin + _LOOK]) if len(cells) > numeric[-1]]
    beside = [[cell for column, cell in enumerate(cells) if column not in numeric] for cells in rows[:100]]
    return TableShape(
        dialect,
        fields,
        numeric,
        tuple(first[:begin]),
        tuple(dialect.delimiter.join(cells) for cells in beside),
        {column: _finite(dialect, [cells[column] for cells in rows]) for column in numeric},
        clock,
    )


def _is_clock(rows: Sequence[Sequence[bytes]], column: int) -> bool:
    cells = [cells[column] for cells in rows if column < len(cells)]
    return bool(cells) and sum(time_of_day(cell) is not None for cell in cells) >= 0.9 * len(cells)


def _finite(dialect: Dialect, cells: Sequence[bytes]) -> FloatArray:
    values = np.array([dialect.number(cell) for cell in cells], dtype=float)
    return np.asarray(values[np.isfinite(values)])


def _holds_numbers(dialect: Dialect, cells: Sequence[bytes]) -> bool:
    numbers = sum(map(dialect.is_number, cells))
    marks = sum(bool(cell) and dialect.number(cell) is not None for cell in cells) - numbers
    return numbers * 2 >= len(cells) or (numbers * 20 >= len(cells) and (numbers + marks) * 2 >= len(cells))


def _first_row(dialect: Dialect, lines: Sequence[bytes], numeric: Sequence[int]) -> int | None:
    """Find where the first long run of rows begins, or the longest where none is long."""
    best, best_length, begin, length = None, 0, 0, 0
    for index, line in enumerate(lines):
        if not line.strip(b" \t\r\x00"):
            continue
        cells = dialect.cells(line)
        values = [dialect.number(cells[column]) if column < len(cells) else None for column in numeric]
        if None in values or not any(dialect.is_number(cells[column]) for column in numeric):
            length = 0
            continue
        begin = begin if length else index
        length += 1
        if length > best_length:
            best, best_length = begin, length
            if length >= _RUN:
                break
    return best
