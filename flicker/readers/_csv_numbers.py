"""
Digits into numbers, many at once: exactly what `float()` gives, to the last bit.

Cells of one layout (the same kind of character at the same places) are a matrix of bytes. Digits times powers of ten,
summed, are the mantissa; below 2**53 it is exact, and one multiplication or division by an exact power of ten (up to
10**22) rounds correctly. Longer mantissas are treated alike in extended precision where its last bits leave no doubt;
what remains goes through numpy's own parser, which is correctly rounded and slower.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from flicker.trace import FloatArray

Bytes = npt.NDArray[np.uint8]
Bools = npt.NDArray[np.bool_]
Integers = npt.NDArray[np.int64]
Span = tuple[int, int]

OVERLOAD = 9e36  # instruments write 9.9e37 where they were overloaded

_ROWS = 2048  # treated at once, so that they stay in the cache
_LAYOUTS = 12  # tried on a block before its rest goes cell by cell
_LONGEST = 40  # bytes of a cell that is treated with others
_POWERS = 10.0 ** np.arange(23)
_LARGEST_EXACT = 2.0**53
_LONG_POWERS = np.longdouble(10) ** np.arange(28)
_HAS_LONG = np.finfo(np.longdouble).nmant == 63
_LARGEST_LONG = np.longdouble(2) ** 64
_LOW_DIGITS = 12
_ZERO, _MINUS = ord("0"), ord("-")
_SIGNS = np.isin(np.arange(256), [ord(sign) for sign in " +-"])
_ANY_DIGIT_TO_ZERO = bytes.maketrans(b"123456789", b"000000000")
_NUMBER = {
    decimal: re.compile(
        rb"[ \t]*[+-]?(?:(?P<whole>\d+)(?:M(?P<after>\d*))?|M(?P<only>\d+))"
        rb"(?:[eEdD](?P<sign>[+-]?)(?P<power>\d{1,4}))?[ \t\r]*".replace(b"M", re.escape(decimal))
    )
    for decimal in (b".", b",")
}
_NORMAL = {decimal: bytes.maketrans(b"dD" + decimal, b"eE.") for decimal in (b".", b",")}
_MARK = re.compile(
    rb"(?P<either>[-+]*|\*+|#+|[-+]?(?:s?q?nan|n/?a|null|none|\d?\.#(?:ind|s?q?nan)\w*))"
    rb"|(?P<below>-(?:\d?\.#inf\w*|inf(?:inity)?|o\.?v?\.?l\.?d?|ovf|over\w*|clip\w*)|under\w*|<+)"
    rb"|\+?(?:\d?\.#inf\w*|inf(?:inity)?|o\.?v?\.?l\.?d?|ovf|over\w*|clip\w*)|>+",
    re.IGNORECASE,
)
_PADDING = b" \t\r\"'"


@dataclass(frozen=True, slots=True)
class _Place:
    """Where one number stands in a row of bytes."""

    span: Span
    sign: int | None  # index of the byte that is blank or a sign
    fraction: int  # digits behind the decimal mark
    power_sign: int  # of the exponent: 1 or -1, 0 without one
    low: int  # indices into the sums: lower digits of the mantissa,
    high: int | None  # its upper digits,
    power: int | None  # digits of the exponent
    too_long: bool  # more digits than can be summed


class Layout:
    """
    Places of the digits in rows of bytes, taken from an example.

    Raises
    ------
    ValueError
        If a span of the example holds no number.
    """

    def __init__(self, example: bytes, spans: tuple[Span, ...], decimal: bytes) -> None:
        self._width = len(example)
        self._decimal = decimal
        template = np.frombuffer(example, dtype=np.uint8).copy()
        limit = np.zeros(self._width, dtype=np.uint8)
        weights: list[FloatArray] = []

        def add(digits: list[int]) -> int:
            column = np.zeros(self._width)
            column[digits] = 10.0 ** np.arange(len(digits))[::-1]
            weights.append(column)
            template[digits], limit[digits] = _ZERO, 9
            return len(weights) - 1

        self._places = []
        for span in spans:
            found = _NUMBER[decimal].fullmatch(example, *span)
            if found is None:
                raise ValueError("no number")
            after = range(*found.span("after" if found["only"] is None else "only"))
            digits = [*range(*found.span("whole")), *after]
            begin = found.start("whole") if found["only"] is None else after[0] - 1
            signed = begin > span[0] and bool(_SIGNS[example[begin - 1]])
            if signed:
                limit[begin - 1] = 255
            several = len(digits) > 15
            low = add(digits[-_LOW_DIGITS:] if several else digits)
            high = add(digits[:-_LOW_DIGITS]) if several else None
            power = add([*range(*found.span("power"))]) if found["power"] is not None else None
            power_sign = 0 if power is None else (-1 if found["sign"] == b"-" else 1)
            sign = begin - 1 if signed else None
            self._places.append(_Place(span, sign, len(after), power_sign, low, high, power, len(digits) > 22))
        self._weights = np.array(weights).T.copy()
        self._template = np.tile(template, _ROWS)
        self._limit = np.tile(limit, _ROWS)

    def parse(self, block: Bytes, values: FloatArray) -> Bools | None:
        """
        Put the numbers of all rows of this layout into `values`.

        Parameters
        ----------
        block : ndarray
            Contiguous bytes, shape (r, w).
        values : ndarray
            Where the numbers go, shape (spans, r); what belongs to other rows stays as it is.

        Returns
        -------
        ndarray or None
            Which rows have this layout, shape (r,); None if all have.
        """
        fits: Bools | None = None
        for first in range(0, len(block), _ROWS):
            part = block[first : first + _ROWS]
            rows = slice(first, first + len(part))
            digits = part.reshape(-1) - self._template[: part.size]
            within = digits <= self._limit[: part.size]
            same = None if within.all() else within.reshape(part.shape).all(axis=1)
            for place in self._places:
                if place.sign is not None:
                    signs = _SIGNS[part[:, place.sign]]
                    if not signs.all():
                        same = signs if same is None else same & signs
            digits = digits.reshape(part.shape)
            if same is None:
                self._fill(part, digits, values[:, rows])
                continue
            if fits is None:
                fits = np.ones(len(block), dtype=bool)
            fits[rows] = same
            if same.any():
                numbers = np.empty((len(self._places), int(np.count_nonzero(same))))
                self._fill(part[same], digits[same], numbers)
                values[:, first + np.flatnonzero(same)] = numbers
        return fits

    def _fill(self, rows: Bytes, digits: Bytes, values: FloatArray) -> None:
        sums = digits.astype(np.float64) @ self._weights
        for index, place in enumerate(self._places):
            numbers = self._magnitudes(rows, place, sums)
            if place.sign is not None:
                negative = rows[:, place.sign] == _MINUS
                if negative.any():
                    np.negative(numbers, out=numbers, where=negative)
            values[index] = numbers

    def _magnitudes(self, rows: Bytes, place: _Place, sums: FloatArray) -> FloatArray:
        """Give mantissa times power of ten, rounded once."""
        shift: Integers | int = -place.fraction
        if place.power is not None:
            shift = place.power_sign * sums[:, place.power].astype(np.int64) - place.fraction
        mantissa, sure = sums[:, place.low], None
        if place.high is not None:
            mantissa = sums[:, place.high] * 10.0**_LOW_DIGITS + mantissa
            sure = mantissa < _LARGEST_EXACT
        if np.max(np.abs(shift)) > 22:
            near = np.abs(shift) <= 22
            sure = near if sure is None else near & sure
        numbers = _times_power(mantissa, shift, _POWERS)
        if place.too_long:
            sure = np.zeros(len(rows), dtype=bool)
        if sure is None or sure.all():
            return numbers
        doubtful = np.flatnonzero(np.broadcast_to(~sure, numbers.shape))
        if _HAS_LONG and place.high is not None and not place.too_long:
            some = shift[doubtful] if isinstance(shift, np.ndarray) else shift
            numbers[doubtful], safe = _through_long(sums[doubtful, place.high], sums[doubtful, place.low], some)
            doubtful = doubtful[~safe]
        if doubtful.size:
            numbers[doubtful] = np.abs(_slowly(rows[doubtful, slice(*place.span)], self._decimal))
        return numbers


def _times_power(
    mantissa: npt.NDArray[np.floating], shift: Integers | int, powers: npt.NDArray[np.floating]
) -> FloatArray:
    """Give `mantissa * 10**shift` with one rounding, for shifts within the table of powers."""
    last = len(powers) - 1
    if isinstance(shift, int):
        product = mantissa * powers[min(shift, last)] if shift >= 0 else mantissa / powers[min(-shift, last)]
        return np.asarray(product)
    return np.asarray(mantissa * powers[np.clip(shift, 0, last)] / powers[np.clip(-shift, 0, last)])


def _through_long(high: FloatArray, low: FloatArray, shift: Integers | int) -> tuple[FloatArray, Bools]:
    """
    Numbers of up to 19 digits through 64-bit mantissas, and which of them are surely rounded right.

    The long quotient is off by at most half its last place; rounding it to 53 bits gives the same as rounding the true
    value unless it lies that close to the middle between two doubles (a quarter, below a power of two).
    """
    mantissa = high.astype(np.longdouble) * 10**_LOW_DIGITS + low
    quotient = np.asarray(_times_power(mantissa, shift, _LONG_POWERS), dtype=np.longdouble)
    numbers = quotient.astype(np.float64)
    half = np.spacing(numbers) / 2
    off = np.abs(quotient - numbers).astype(np.float64)
    clear = (np.abs(off - half) > half / 256) & (np.abs(off - half / 2) > half / 256)
    return numbers, clear & (mantissa < _LARGEST_LONG) & (np.abs(shift) <= 27)


def _slowly(cells: Bytes, decimal: bytes) -> FloatArray:
    """Read cells of shape (r, w), each of which holds one number."""
    text = np.full((len(cells), cells.shape[1] + 1), ord(" "), dtype=np.uint8)
    text[:, :-1] = cells
    numbers = np.fromstring(text.tobytes().translate(_NORMAL[decimal]), sep=" ")
    if len(numbers) != len(cells):
        raise AssertionError("a layout that holds one number in each row gave another count")
    return numbers


@lru_cache(maxsize=128)
def _cached_layout(example: bytes, spans: tuple[Span, ...], decimal: bytes) -> Layout | None:
    try:
        return Layout(example, spans, decimal)
    except ValueError:
        return None


def layout_like(example: bytes, spans: tuple[Span, ...], decimal: bytes) -> Layout | None:
    """Give the layout of the example's numbers; None if a span holds no number."""
    return _cached_layout(example.translate(_ANY_DIGIT_TO_ZERO), spans, decimal)


def number(cell: bytes, decimal: bytes) -> float | None:
    """
    Read one cell: a number, or NaN or an infinity for a blank and an overload mark; None if it is anything else.

    Examples
    --------
    >>> number(b" -00.2464", b"."), number(b"1,5D-3", b","), number(b"-OL", b"."), number(b"volt", b".")
    (-0.2464, 0.0015, -inf, None)
    """
    cell = cell.strip(_PADDING)
    if _NUMBER[decimal].fullmatch(cell):
        return float(cell.translate(_NORMAL[decimal]))
    mark = _MARK.fullmatch(cell)
    if mark is None:
        return None
    if mark["either"] is not None:
        return np.nan
    return np.inf if mark["below"] is None else -np.inf


def is_number(cell: bytes, decimal: bytes) -> bool:
    """Whether the cell holds a number, and no mark."""
    return _NUMBER[decimal].fullmatch(cell.strip(_PADDING)) is not None


def _windows(text: Bytes, starts: Integers, length: int) -> Bytes:
    """Copy `length` bytes from each start on, shape (r, length)."""
    every = np.ndarray((text.size - length + 1,), dtype=f"V{length}", buffer=text, strides=(1,))
    return every[starts].view(np.uint8).reshape(-1, length)


def numbers(text: Bytes, starts: Integers, stops: Integers, decimal: bytes) -> tuple[FloatArray, Bools]:
    """
    Read many cells of a text.

    Parameters
    ----------
    text : ndarray
        Contiguous bytes.
    starts, stops : ndarray
        Where each cell begins and ends, shape (r,).
    decimal : bytes
        The decimal mark.

    Returns
    -------
    values : ndarray
        As `number` gives them, NaN where it gives None, shape (r,).
    unreadable : ndarray
        Where `number` gives None, shape (r,).
    """
    values = np.full(len(starts), np.nan)
    unreadable = np.zeros(len(starts), dtype=bool)
    lengths = stops - starts

    def singly(rows: Integers, read: Callable[[bytes, bytes], float | None] = number) -> None:
        for row in rows.tolist():
            value = read(text[starts[row] : stops[row]].tobytes(), decimal)
            values[row], unreadable[row] = (np.nan, True) if value is None else (value, False)

    counts = np.bincount(np.minimum(lengths, _LONGEST + 1), minlength=1)
    for length in np.flatnonzero(counts).tolist():
        if length == 0:
            continue
        if length > _LONGEST:
            singly(np.flatnonzero(lengths > _LONGEST))
            continue
        rows = np.arange(len(starts)) if counts[length] == len(starts) else np.flatnonzero(lengths == length)
        block = _windows(text, starts[rows], length)
        for _ in range(_LAYOUTS):
            layout = layout_like(block[0].tobytes(), ((0, length),), decimal)
            if layout is None:
                same = (block == block[0]).all(axis=1)
                value = number(block[0].tobytes(), decimal)
                values[rows[same]] = np.nan if value is None else value
                unreadable[rows[same]] = value is None
            else:
                found = np.empty((1, len(rows)))
                fits = layout.parse(block, found)
                if fits is None:
                    values[rows] = found[0]
                    rows = rows[:0]
                    break
                values[rows[fits]] = found[0, fits]
                same = fits
            rows, block = rows[~same], block[~same]
            if not len(rows):
                break
        singly(rows)
    return values, unreadable
