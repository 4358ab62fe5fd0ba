"""Which captures belong to a sweep, and under which conditions each was taken."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flicker.errors import InputError, UnreadableFileError
from flicker.registry import did_you_mean

COLUMNS = ("capture", "unit", "level", "supply", "dark_level", "note")
_NUMBER = r"\d+(?:[.,]\d+)?"


@dataclass(frozen=True, slots=True)
class Step:
    """One capture of a sweep, and what is known of how it was taken."""

    capture: str
    unit: str = ""  # which specimen
    level: float | None = None  # dimming level [%]
    supply: str = ""
    dark_level: float | None = None  # in the unit of the capture
    note: str = ""

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form: the keys of a manifest that are known."""
        known = {
            "unit": self.unit or None,
            "level_percent": self.level,
            "supply": self.supply or None,
            "note": self.note or None,
        }
        return {key: value for key, value in known.items() if value is not None}


def read_manifest(path: str | Path) -> tuple[Step, ...]:
    """
    Read a table of captures: columns `capture`, and where known `unit`, `level`, `supply`, `dark_level`, `note`.

    Parameters
    ----------
    path : path
        CSV with a head line, fields apart by comma, semicolon or tab; captures relative to its own folder.

    Returns
    -------
    tuple of Step
        In the order of the table.

    Raises
    ------
    UnreadableFileError
        If the file cannot be read as text.
    InputError
        If a column is unknown or missing, or a cell is no number; the sentence names file and line.
    """
    path = Path(path)
    try:
        lines = path.read_text(encoding="utf-8-sig").splitlines()
    except OSError as error:
        raise UnreadableFileError(f"{path.name}: cannot be read: {error.strerror or error}") from error
    except UnicodeDecodeError as error:
        raise UnreadableFileError(f"{path.name}: a manifest is UTF-8 text, and byte {error.start} is not") from None
    if not lines:
        raise InputError(f"{path.name}: is empty: write a head line with the column capture")
    delimiter = max(";\t,", key=lines[0].count)
    rows = csv.reader(lines, delimiter=delimiter)
    head = [name.strip().lower() for name in next(rows)]
    for name in head:
        if name not in COLUMNS:
            raise InputError(f"{path.name}, line 1: {did_you_mean('column', name, list(COLUMNS))}")
    if "capture" not in head:
        raise InputError(f"{path.name}, line 1: the column capture is missing")
    steps = []
    for cells in rows:
        if not any(cell.strip() for cell in cells):
            continue
        where = f"{path.name}, line {rows.line_num}"
        if len(cells) > len(head):
            raise InputError(f"{where}: {len(cells)} fields, and the head line has {len(head)}")
        steps.append(_step(dict(zip(head, (cell.strip() for cell in cells), strict=False)), path.parent, where))
    if not steps:
        raise InputError(f"{path.name}: lists no capture")
    return tuple(steps)


def _step(cells: dict[str, str], folder: Path, where: str) -> Step:
    if not cells.get("capture"):
        raise InputError(f"{where}: the capture is missing")
    level = _number(cells.get("level", "").removesuffix("%").strip(), "level", where)
    if level is not None and not 0 <= level <= 100:
        raise InputError(f"{where}: a level lies between 0 and 100 %, not {level:g}")
    return Step(
        str(folder / cells["capture"]),
        cells.get("unit", ""),
        level,
        cells.get("supply", ""),
        _number(cells.get("dark_level", ""), "dark_level", where),
        cells.get("note", ""),
    )


def _number(text: str, column: str, where: str) -> float | None:
    if not text:
        return None
    try:
        number = float(text.replace(",", "."))
    except ValueError:
        raise InputError(f"{where}: {column}: '{text}' is no number") from None
    if number != number or abs(number) == float("inf"):
        raise InputError(f"{where}: {column}: '{text}' is no number")
    return number


def steps_from_names(captures: Sequence[str]) -> tuple[Step, ...]:
    """
    Take dimming levels from file names, where every name carries one in the same place.

    A level is the number before `%`, `pct` or `percent`, or else after `level` or `dim`: `display-30pct.csv`,
    `level_05.wav`. Unless all captures of at least two carry one, none has a level.
    """
    found = [_level_in(Path(capture).stem) for capture in captures]
    if len(captures) < 2 or None in found:
        return tuple(Step(capture) for capture in captures)
    return tuple(Step(capture, level=level) for capture, level in zip(captures, found, strict=True))


def _level_in(name: str) -> float | None:
    before = re.search(rf"(?<![\d.,])({_NUMBER})[ _-]?(?:%|pct|percent)", name, re.IGNORECASE)
    after = re.search(rf"(?:level|dim)[ _-]?({_NUMBER})", name, re.IGNORECASE)
    found = before or after
    level = float(found.group(1).replace(",", ".")) if found else None
    return level if level is not None and level <= 100 else None
