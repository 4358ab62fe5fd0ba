"""A piece of a table of text into rows of numbers."""

from __future__ import annotations

from enum import IntEnum

import numpy as np
import numpy.typing as npt

from flicker.readers._csv_clock import times_of_day
from flicker.readers._csv_dialect import Dialect
from flicker.readers._csv_numbers import Bytes, Integers, Span, layout_like, numbers
from flicker.trace import FloatArray

LINE_END = ord("\n")
_QUOTE = ord('"')
_BLANK = ord(" ")
_BLANKS = np.isin(np.arange(256), [ord(blank) for blank in " \t\r"])
_NOTHING = np.isin(np.arange(256), [ord(empty) for empty in " \t\r,;|\x00\x1a"])
_LAYOUTS = 4  # of whole lines, before the rest is taken cell by cell
_LONGEST_LINE = 400  # bytes that are worth a common layout

Kinds = npt.NDArray[np.uint8]


class Line(IntEnum):
    """What a line is."""

    ROW = 0
    DAMAGED = 1  # a row with a cell that is neither a number nor an overload mark
    FOREIGN = 2  # other text
    EMPTY = 3


class RowReader:
    """Reads the wanted columns of a dialect's lines."""

    def __init__(self, dialect: Dialect, wanted: tuple[int, ...], clock: int | None = None) -> None:
        self._dialect = dialect
        self._wanted = wanted
        self._clock = clock
        ambiguous = dialect.decimal == dialect.delimiter and not dialect.paired
        self._decimal = b"." if ambiguous else dialect.decimal  # once the quotes are off

    def read(self, piece: Bytes) -> tuple[FloatArray, Kinds]:
        """
        Read whole lines.

        Parameters
        ----------
        piece : ndarray
            Bytes, ending with a line feed.

        Returns
        -------
        values : ndarray
            Numbers of the wanted columns, NaN and infinities for overload marks, shape (columns, lines).
        kinds : ndarray
            What each line is, a `Line`, shape (lines,).
        """
        if self._dialect.quoted and (piece == _QUOTE).any():
            piece = self._unquoted(piece)
        width = int(np.argmax(piece[: _LONGEST_LINE + 1] == LINE_END)) + 1
        if piece.size % width == 0 and piece[width - 1] == LINE_END:
            lines = piece.reshape(-1, width)
            if (lines[:, -1] == LINE_END).all() and np.count_nonzero(piece == LINE_END) == len(lines):
                return self._equal_lines(lines)
        return self._any_lines(piece)

    def _equal_lines(self, lines: Bytes) -> tuple[FloatArray, Kinds]:
        """Read lines of equal length, most of which have the same layout."""
        values = np.empty((len(self._wanted), len(lines)))
        kinds = np.zeros(len(lines), dtype=np.uint8)
        left: Integers | None = None
        for _ in range(_LAYOUTS):
            example = lines[0].tobytes()
            spans = self._spans(example)
            layout = layout_like(example, spans, self._decimal) if spans else None
            if layout is None:
                break
            found = np.empty((len(spans), len(lines)))
            fits = layout.parse(lines, found)
            found = found[list(self._wanted)]
            if left is None and fits is None:
                return found, kinds
            if left is None:
                left = np.arange(len(lines))
            fits = np.ones(len(lines), dtype=bool) if fits is None else fits
            values[:, left[fits]] = found[:, fits]
            left, lines = left[~fits], lines[~fits]
            if not left.size:
                return values, kinds
        rest, rest_kinds = self._any_lines(lines.reshape(-1))
        if left is None:
            return rest, rest_kinds
        values[:, left], kinds[left] = rest, rest_kinds
        return values, kinds

    def _spans(self, line: bytes) -> tuple[Span, ...]:
        """Where the cells of a line stand; nothing if a wanted one is missing."""
        starts, stops, first, counts = self._tokens(np.frombuffer(line, dtype=np.uint8))
        if counts[0] <= self._last_token:
            return ()
        every = range(counts[0] // (2 if self._dialect.paired else 1))
        begins, ends = self._cell(every, starts, stops, first)
        return tuple(zip(begins.tolist(), ends.tolist(), strict=True))

    @property
    def _last_token(self) -> int:
        last = max(self._wanted)
        return 2 * last + 1 if self._dialect.paired else last

    def _cell(
        self, column: int | range, starts: Integers, stops: Integers, first: Integers
    ) -> tuple[Integers, Integers]:
        """Begin and end of a cell in each line."""
        number = np.asarray(column)
        if self._dialect.paired:
            return starts[first + 2 * number], stops[first + 2 * number + 1]
        return starts[first + number], stops[first + number]

    def _tokens(self, piece: Bytes) -> tuple[Integers, Integers, Integers, Integers]:
        """Give begin and end of every field, and for every line its first field and how many it has."""
        ends = piece == LINE_END
        if self._dialect.delimiter != b" ":
            stops = np.flatnonzero(ends | (piece == ord(self._dialect.delimiter)))
            starts = np.concatenate(([0], stops[:-1] + 1))
            last = np.flatnonzero(ends[stops])
            first = np.concatenate(([0], last[:-1] + 1))
            return starts, stops, first, last - first + 1
        inside = np.concatenate(([False], ~(ends | _BLANKS[piece]), [False]))
        edges = np.flatnonzero(inside[1:] != inside[:-1])
        starts, stops = edges[::2], edges[1::2]
        first_bytes = np.concatenate(([0], np.flatnonzero(ends)[:-1] + 1))
        first = np.searchsorted(starts, first_bytes)
        return starts, stops, first, np.diff(np.append(first, len(starts)))

    def _any_lines(self, piece: Bytes) -> tuple[FloatArray, Kinds]:
        starts, stops, first, counts = self._tokens(piece)
        whole = counts > self._last_token
        kinds = np.where(whole, Line.ROW, Line.FOREIGN).astype(np.uint8)
        first = first[whole]
        values = np.full((len(self._wanted), len(counts)), np.nan)
        unreadable = np.zeros(len(first), dtype=np.int64)
        empty = np.ones(len(first), dtype=bool)
        for index, column in enumerate(self._wanted):
            begins, ends = self._cell(column, starts, stops, first)
            if column == self._clock:
                values[index, whole], bad = times_of_day(piece, begins, ends)
            else:
                values[index, whole], bad = numbers(piece, begins, ends, self._decimal)
            unreadable += bad
            empty &= begins == ends
        kinds[whole] = np.select(
            [empty, unreadable == len(self._wanted), unreadable > 0], [Line.EMPTY, Line.FOREIGN, Line.DAMAGED], Line.ROW
        )
        foreign = np.flatnonzero(kinds == Line.FOREIGN)
        if foreign.size:
            ends = np.flatnonzero(piece == LINE_END)
            begins = np.concatenate(([0], ends[:-1] + 1))
            for line in foreign.tolist():
                if _NOTHING[piece[begins[line] : ends[line]]].all():
                    kinds[line] = Line.EMPTY
        return values, kinds

    def _unquoted(self, piece: Bytes) -> Bytes:
        """Put blanks for quotes, and for delimiters within quotes the decimal mark that they must be."""
        quotes = piece == _QUOTE
        passed = np.cumsum(quotes, dtype=np.uint8)  # whose last bit is all that counts
        ends = np.flatnonzero(piece == LINE_END)
        at_line = np.concatenate((np.zeros(1, np.uint8), passed[ends[:-1]]))
        lengths = np.diff(np.concatenate(([-1], ends)))
        inside = ((passed - np.repeat(at_line, lengths)) & 1).astype(bool)
        piece = piece.copy()
        piece[inside & (piece == ord(self._dialect.delimiter))] = ord(self._decimal)
        piece[quotes] = _BLANK
        return piece
