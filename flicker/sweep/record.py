"""What a laboratory report needs beside the figures: who, what, when, with which instrument, under which conditions."""

from __future__ import annotations

import datetime
import re
import tomllib
from pathlib import Path
from typing import Any

from flicker.errors import InputError, UnreadableFileError
from flicker.registry import did_you_mean

# The items of ISO/IEC 17025:2017, 7.8.2 to 7.8.6, in this program's words, and what the trade adds to them.
ITEMS = {
    "title": "title",
    "report_id": "report",
    "laboratory": "laboratory",
    "address": "address",
    "place_of_test": "place of test",
    "customer": "customer",
    "item": "item tested",
    "item_condition": "condition of the item",
    "sampling": "sampling",
    "received": "received on",
    "tested": "tested on",
    "issued": "issued on",
    "operator": "tested by",
    "authorised_by": "authorised by",
    "method": "method",
    "deviations": "deviations from the method",
    "external_results": "results from others",
    "detector": "detector",
    "amplifier": "amplifier",
    "converter": "converter",
    "calibration_due": "calibration due",
    "camera": "camera",
    "supply": "supply",
    "dimmer": "dimmer",
    "warm_up": "warm-up",
    "temperature": "temperature",
    "humidity": "humidity",
    "geometry": "geometry and aperture",
    "raw_data": "raw data kept at",
    "remarks": "remarks",
}


def read_record(path: str | Path) -> dict[str, Any]:
    """
    Read the items that a report states; all are optional.

    Parameters
    ----------
    path : path
        TOML with some of the keys of `ITEMS`: texts, numbers or dates.

    Returns
    -------
    dict
        The items given, in the order of `ITEMS`; dates as texts.

    Raises
    ------
    UnreadableFileError
        If the file is missing or no TOML.
    InputError
        If a key is unknown or a value is neither text, number nor date; the sentence names file and line.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8")
        data = tomllib.loads(text)
    except OSError as error:
        raise UnreadableFileError(f"{path.name}: cannot be read: {error.strerror or error}") from error
    except UnicodeDecodeError as error:
        raise UnreadableFileError(f"{path.name}: a record is UTF-8 text, and byte {error.start} is not") from None
    except tomllib.TOMLDecodeError as error:
        raise UnreadableFileError(f"{path.name}: no TOML: {error}") from None
    for key, value in data.items():
        where = f"{path.name}, line {_line_of(text, key)}"
        if key not in ITEMS:
            raise InputError(f"{where}: {did_you_mean('item', key, list(ITEMS))}")
        if isinstance(value, bool) or not isinstance(value, str | int | float | datetime.date | datetime.time):
            raise InputError(f"{where}: {key}: must be a text, a number or a date, not {value!r}")
        if isinstance(value, float) and value - value != 0:
            raise InputError(f"{where}: {key}: must be a finite number, not {value!r}")
    return {key: _plain(data[key]) for key in ITEMS if key in data}


def _plain(value: Any) -> Any:
    return value.isoformat() if isinstance(value, datetime.date | datetime.time) else value


def _line_of(text: str, key: str) -> int:
    lines = text.splitlines()
    pattern = re.compile(rf"\s*(?:\[+\s*)?[\"']?{re.escape(key)}[\"']?\s*[\].=]")
    return next((number for number, line in enumerate(lines, 1) if pattern.match(line)), 1)
