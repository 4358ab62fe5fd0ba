"""Times of day in cells of text, with or without a date before them."""

from __future__ import annotations

import re

import numpy as np

from flicker.readers._csv_numbers import Bools, Bytes, Integers
from flicker.trace import FloatArray

DAY = 86_400.0  # [s]
_CLOCK = re.compile(
    rb"[ \t\"']*(?:(?:\d{4}-\d\d?-\d\d?|\d\d?[./-]\d\d?[./-]\d{2,4})[ T,]\s*)?"
    rb"(\d\d?):(\d\d):(\d\d)(?:[.,:](\d{1,9}))?(?: ?([AaPp])\.?[Mm]\.?| ?Z| ?[-+]\d\d:?\d\d)?[ \t\"'\r]*"
)


def time_of_day(cell: bytes) -> float | None:
    """
    Read hours, minutes and seconds, with decimals if there are any; None if the cell holds anything else. [s]

    Examples
    --------
    >>> time_of_day(b"2026-12-01 22:00:30.250+01:00"), time_of_day(b"1:00:00 PM"), time_of_day(b"07:30")
    (79230.25, 46800.0, None)
    """
    found = _CLOCK.fullmatch(cell)
    if found is None:
        return None
    hours, minutes, seconds, decimals, half = found.groups()
    hour = int(hours) if half is None else int(hours) % 12 + 12 * (half in b"pP")
    return 3600.0 * hour + 60.0 * int(minutes) + float(seconds + b"." + (decimals or b"0"))


def times_of_day(text: Bytes, starts: Integers, stops: Integers) -> tuple[FloatArray, Bools]:
    """
    Read many cells of a text.

    Parameters
    ----------
    text : ndarray
        Contiguous bytes.
    starts, stops : ndarray
        Where each cell begins and ends, shape (r,).

    Returns
    -------
    values : ndarray
        Seconds since midnight, NaN where there are none, shape (r,). [s]
    unreadable : ndarray
        Where a cell holds anything else, shape (r,).
    """
    whole = text.tobytes()
    times = [time_of_day(whole[start:stop]) for start, stop in zip(starts.tolist(), stops.tolist(), strict=True)]
    values = np.array(times, dtype=np.float64)
    return values, np.isnan(values)


def past_midnight(times: FloatArray) -> FloatArray:
    """Let times of day go on where they begin a new day, shape (n,). [s]"""
    steps = np.diff(times)
    if not (steps < -0.5 * DAY).any():
        return times
    return np.asarray(times + DAY * np.concatenate(([0], np.cumsum(steps < -0.5 * DAY))))
