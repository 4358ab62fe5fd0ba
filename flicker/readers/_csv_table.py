"""The rows of a table of text, read piece by piece into columns of numbers."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field

import numpy as np

from flicker.errors import UnreadableFileError
from flicker.readers._csv_dialect import TableShape
from flicker.readers._csv_numbers import Bytes, Integers
from flicker.readers._csv_rows import LINE_END, Kinds, Line, RowReader
from flicker.readers._csv_text import TextFile, as_words
from flicker.readers._csv_units import UnitReader
from flicker.trace import FloatArray

_TOLERATED = 0.05  # share of damaged rows


@dataclass(slots=True)
class Table:
    """Columns of numbers, and what stood between the rows."""

    columns: list[FloatArray] = field(default_factory=list)  # NaN and infinities are overload marks, each shape (n,)
    damaged: list[int] = field(default_factory=list)  # for each row left out: how many rows stand before it
    breaks: list[int] = field(default_factory=list)  # rows before which several lines of other text stand
    foreign: int = 0  # lines of other text among and behind the rows
    cut: bool = False  # the last line was incomplete and left out

    @property
    def rows(self) -> int:
        """Number of rows n."""
        return len(self.columns[0])

    def row_numbers(self) -> Integers:
        """Number of each row from 0, counting those left out too, shape (n,)."""
        every = np.arange(self.rows)
        return every + np.searchsorted(self.damaged, every, side="right") if self.damaged else every


class _Columns:
    """Columns that grow."""

    def __init__(self, count: int, capacity: int) -> None:
        self._columns = [np.empty(capacity) for _ in range(count)]
        self.rows = 0

    def append(self, values: FloatArray) -> None:
        needed = self.rows + values.shape[1]
        if needed > len(self._columns[0]):
            more = np.empty(needed // 2 + values.shape[1])
            self._columns = [np.concatenate((column[: self.rows], more)) for column in self._columns]
        for column, part in zip(self._columns, values, strict=True):
            column[self.rows : needed] = part
        self.rows = needed

    def finished(self) -> list[FloatArray]:
        return [column[: self.rows] for column in self._columns]


class _Remarks:
    """What lines that are no rows say, gathered while the rows are read."""

    def __init__(self) -> None:
        self.damaged: list[int] = []
        self.foreign: Counter[int] = Counter()
        self.example = ""

    def add(self, piece: Bytes, kinds: Kinds, rows_before: int, lines_before: int) -> None:
        odd = np.flatnonzero((kinds == Line.DAMAGED) | (kinds == Line.FOREIGN))
        if not odd.size:
            return
        before = rows_before + np.cumsum(kinds == Line.ROW)
        for line in odd.tolist():
            if kinds[line] == Line.DAMAGED:
                self.damaged.append(int(before[line]))
            else:
                self.foreign[int(before[line])] += 1
        if not self.example:
            text = as_words(piece.tobytes().split(b"\n")[odd[0]])
            self.example = f"line {lines_before + odd[0] + 1}: '{text[:60]}'"


def read_table(text: TextFile, shape: TableShape, wanted: tuple[int, ...]) -> Table:
    """
    Read the wanted columns of all rows.

    Parameters
    ----------
    text : TextFile
        The file.
    shape : TableShape
        How the table is written.
    wanted : tuple of int
        Columns, from 0.

    Returns
    -------
    Table
        Its columns in the order of `wanted`.

    Raises
    ------
    UnreadableFileError
        If there is no row, or many cannot be read.
    """
    reader = UnitReader(shape, wanted) if shape.units else RowReader(shape.dialect, wanted, shape.clock)
    table, remarks = Table(), _Remarks()
    columns: _Columns | None = None
    skip = lines = len(shape.head)
    before = 0  # length of the line before
    for piece in text.pieces():
        if skip:
            ends = np.flatnonzero(piece == LINE_END)
            if len(ends) <= skip:
                skip -= len(ends)
                if skip or not len(ends):
                    continue
            piece = piece[ends[skip - 1] + 1 :] if skip else piece[:0]
            skip = 0
            if not piece.size:
                continue
        if piece[-1] != LINE_END:
            if piece.size < before:
                table.cut = True
                break
            piece = np.append(piece, np.uint8(LINE_END))
        values, kinds = reader.read(piece)
        if columns is None:
            columns = _Columns(len(wanted), _capacity(text, piece, len(kinds)))
        remarks.add(piece, kinds, columns.rows, lines)
        rows = kinds == Line.ROW
        columns.append(values if rows.all() else values[:, rows])
        lines += len(kinds)
        before = _last_line(piece)
    if columns is None or not columns.rows:
        raise UnreadableFileError(
            f"{text.path}: holds no row of numbers; export the capture as rows of time and reading"
        )
    table.columns = columns.finished()
    _settle(table, remarks, text)
    return table


def _capacity(text: TextFile, piece: Bytes, lines: int) -> int:
    characters = text.path.stat().st_size / (2 if text.wide else 1)
    return int(characters / piece.size * lines * 1.02) + 1000


def _last_line(piece: Bytes) -> int:
    """Length of the last line without its end."""
    return len(piece[-1000:-1].tobytes().rsplit(b"\n", 1)[-1])


def _settle(table: Table, remarks: _Remarks, text: TextFile) -> None:
    """One line of other text among rows was a row once; several are the head of a new part."""
    table.foreign = sum(remarks.foreign.values())
    table.breaks = sorted(place for place, count in remarks.foreign.items() if count > 1 and 0 < place < table.rows)
    lone = [place for place, count in remarks.foreign.items() if count == 1]
    table.damaged = sorted(place for place in (*remarks.damaged, *lone) if 0 < place < table.rows)
    if len(table.damaged) > _TOLERATED * table.rows + 2:
        raise UnreadableFileError(
            f"{text.path}, {remarks.example} where a row of numbers should be, and {len(table.damaged)} such lines: "
            "export the capture again"
        )
