"""Sheets of limits in TOML, one a standard, read and checked row by row."""

from __future__ import annotations

import datetime
import math
import re
import tomllib
from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path
from typing import Any

from flicker.errors import InputError, UnreadableFileError
from flicker.limits.limit import FAMILY_DEPTH, MODULATION, UNITS, Band, Curve, Limit
from flicker.registry import did_you_mean


def read_sheet(path: str | Path) -> tuple[Limit, ...]:
    """
    Read one sheet of limits.

    Raises
    ------
    UnreadableFileError
        If the file is missing or no TOML.
    InputError
        If a row is broken; the sentence names the file, the line and the reason.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8")
    except OSError as error:
        raise UnreadableFileError(f"{path.name}: cannot be read: {error.strerror or error}") from error
    except UnicodeDecodeError as error:
        raise UnreadableFileError(
            f"{path.name}: a sheet of limits is UTF-8 text, and byte {error.start} is not"
        ) from None
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise UnreadableFileError(f"{path.name}: no TOML: {error}") from None
    return tuple(_Sheet(path.name, text, data).limits())


class _Sheet:
    """Checks a parsed sheet and knows in which line each key stands."""

    KEYS = ("title", "source", "basis", "limit")
    LIMIT_KEYS = (
        *("id", "name", "measure", "at_most", "below", "band", "clause", "applies", "from", "until"),
        *("levels_percent", "mains_only", "source", "basis"),
    )
    BAND_KEYS = ("from_hz", "to_hz", "at_most", "at_most_per_hz", "note")

    def __init__(self, name: str, text: str, data: dict[str, Any]) -> None:
        self.name = name
        self.lines = text.splitlines()
        self.data = data

    def limits(self) -> Iterator[Limit]:
        """Give the checked rows."""
        self.check_keys(self.data, self.KEYS, 0)
        for key in ("title", "source", "basis"):
            self.text(self.data, key, 0)
        rows = self.data.get("limit")
        if not isinstance(rows, list) or not rows or not all(isinstance(row, dict) for row in rows):
            raise self.error(0, "limit", "a sheet needs at least one [[limit]]")
        seen: list[Limit] = []
        for row, start in zip(rows, self.starts("[[limit]]", 0, len(rows)), strict=True):
            limit = self.limit(row, start)
            for other in seen:
                if other.id == limit.id and _overlap(other, limit):
                    raise self.error(
                        start, "id", f"'{limit.id}' stands twice for the same days: give another id or dates"
                    )
            seen.append(limit)
            yield limit

    def limit(self, row: dict[str, Any], start: int) -> Limit:
        """Check one row."""
        self.check_keys(row, self.LIMIT_KEYS, start)
        measure = self.text(row, "measure", start)
        if measure not in UNITS:
            raise self.error(start, "measure", did_you_mean("measure that can be limited", measure, list(UNITS)))
        given = [key for key in ("at_most", "below", "band") if key in row]
        if len(given) != 1:
            raise self.error(start, "id", "a limit needs exactly one of at_most, below and [[limit.band]]")
        if measure == MODULATION and given != ["band"]:
            raise self.error(
                start, given[0], "a limit on modulation needs [[limit.band]] rows: it depends on the frequency"
            )
        if given == ["band"] and measure not in (MODULATION, FAMILY_DEPTH):
            raise self.error(start, "measure", f"'{measure}' has no frequency of its own: use at_most")
        begins, until = self.date(row, "from", start), self.date(row, "until", start)
        if begins and until and until < begins:
            raise self.error(start, "until", f"ends on {until}, before it begins on {begins}")
        levels = row.get("levels_percent", [])
        if not isinstance(levels, list) or not all(_is_number(level) and 0 <= level <= 100 for level in levels):
            raise self.error(start, "levels_percent", "must be a list of dimming levels from 0 to 100")
        return Limit(
            id=self.identifier(row, start),
            name=self.text(row, "name", start) if "name" in row else self.text(row, "id", start),
            measure=measure,
            bound=self.curve(row, start) if given == ["band"] else self.number(row, given[0], start, UNITS[measure]),
            clause=self.text(row, "clause", start),
            applies=self.text(row, "applies", start),
            title=self.data["title"],
            source=self.text(row, "source", start) if "source" in row else self.data["source"],
            basis=self.text(row, "basis", start) if "basis" in row else self.data["basis"],
            strict=given == ["below"],
            begins=begins,
            until=until,
            levels=tuple(float(level) for level in levels),
            mains_only=self.flag(row, "mains_only", start),
        )

    def identifier(self, row: dict[str, Any], start: int) -> str:
        name = self.text(row, "id", start)
        if not re.fullmatch(r"[a-z0-9]+(?:-[a-z0-9]+)*", name):
            raise self.error(start, "id", f"'{name}' must be small letters and digits, with single hyphens between")
        return name

    def curve(self, row: dict[str, Any], start: int) -> Curve:
        rows = row["band"]
        if not isinstance(rows, list) or not rows or not all(isinstance(band, dict) for band in rows):
            raise self.error(start, "band", "write each band as [[limit.band]]")
        starts = self.starts("[[limit.band]]", start, len(rows))
        bands: list[Band] = []
        for band, line in zip(rows, starts, strict=True):
            self.check_keys(band, self.BAND_KEYS, line)
            if ("at_most" in band) == ("at_most_per_hz" in band):
                raise self.error(line, "at_most", "a band needs exactly one of at_most and at_most_per_hz")
            first = self.number(band, "from_hz", line) if "from_hz" in band else 0.0
            last = self.number(band, "to_hz", line) if "to_hz" in band else math.inf
            if first >= last:
                raise self.error(line, "to_hz", f"a band cannot run from {first:g} Hz to {last:g} Hz")
            if bands and first < bands[-1].end:
                raise self.error(line, "from_hz", f"starts at {first:g} Hz, inside the band before it")
            bands.append(
                Band(
                    first,
                    last,
                    self.number(band, "at_most", line) if "at_most" in band else None,
                    self.number(band, "at_most_per_hz", line) if "at_most_per_hz" in band else None,
                    self.text(band, "note", line) if "note" in band else "",
                )
            )
        return Curve(tuple(bands))

    def number(self, row: dict[str, Any], key: str, start: int, unit: str = "") -> float:
        value = row[key]
        try:
            number = float(Fraction(value)) if isinstance(value, str) else float(value)
        except (TypeError, ValueError, ZeroDivisionError):
            raise self.error(start, key, f"must be a number or a fraction like '1/30', not {value!r}") from None
        if isinstance(value, bool) or not math.isfinite(number) or (number < 0 and unit != "dB"):
            raise self.error(start, key, f"must be a number from 0 up, not {value!r}")
        return number

    def text(self, row: dict[str, Any], key: str, start: int) -> str:
        value = row.get(key)
        if not isinstance(value, str) or not value.strip():
            raise self.error(
                start, key, "is missing" if value is None else f"must be a text that says something, not {value!r}"
            )
        return value

    def date(self, row: dict[str, Any], key: str, start: int) -> datetime.date | None:
        value = row.get(key)
        if value is None or (isinstance(value, datetime.date) and not isinstance(value, datetime.datetime)):
            return value
        raise self.error(start, key, f"must be a date like 2024-09-01 without quotes, not {value!r}")

    def flag(self, row: dict[str, Any], key: str, start: int) -> bool:
        value = row.get(key, False)
        if not isinstance(value, bool):
            raise self.error(start, key, f"must be true or false, not {value!r}")
        return value

    def check_keys(self, row: dict[str, Any], known: tuple[str, ...], start: int) -> None:
        for key in row:
            if key not in known:
                raise self.error(start, key, did_you_mean("key", key, list(known)), says_key=False)

    def starts(self, header: str, first: int, count: int) -> list[int]:
        """Lines in which the rows begin; the line before them all where the sheet writes them in another way."""
        found = [index for index in range(first, self.end_of(first)) if self.opens(index, header)]
        return found if len(found) == count else [first] * count

    def end_of(self, start: int) -> int:
        """Line after the row that begins at `start`; after the sheet, for its head."""
        following = range(start + 1, len(self.lines) if self.opens(start, "[[limit]]") else 0)
        return next((index for index in following if self.opens(index, "[[limit]]")), len(self.lines))

    def opens(self, index: int, header: str) -> bool:
        return re.sub(r"\s", "", self.lines[index]).startswith(header)

    def error(self, start: int, key: str, problem: str, *, says_key: bool = True) -> InputError:
        """Say what is wrong, at the first line from `start` on that sets the key, or else at `start`."""
        for index in range(start, len(self.lines)):
            if re.match(rf"\s*[\"']?{re.escape(key)}[\"']?\s*=", self.lines[index]):
                start = index
                break
            if index > start and self.lines[index].lstrip().startswith("["):
                break
        return InputError(f"{self.name}, line {start + 1}: {f'{key}: ' if says_key else ''}{problem}")


def _overlap(one: Limit, other: Limit) -> bool:
    earliest, latest = datetime.date.min, datetime.date.max
    return (one.begins or earliest) <= (other.until or latest) and (other.begins or earliest) <= (one.until or latest)


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)
