"""The limits known: those of the sheets in this folder, and those of the user's own sheet."""

from __future__ import annotations

import datetime
import functools
from collections.abc import Iterable
from pathlib import Path

from flicker.errors import InputError
from flicker.limits.limit import Limit
from flicker.limits.sheets import read_sheet
from flicker.registry import did_you_mean


class Limits(dict[str, Limit]):
    """Limits by id; asking for one that is not there says which id was probably meant."""

    def __missing__(self, name: str) -> Limit:
        raise InputError(did_you_mean("limit", name, list(self)))


@functools.cache
def built_in() -> tuple[Limit, ...]:
    """Every row of the sheets in this folder, superseded ones included, in the order of the sheets."""
    folder = Path(__file__).parent
    return tuple(limit for sheet in sorted(folder.glob("*.toml")) for limit in read_sheet(sheet))


def all_rows(limits_file: str | Path | None = None) -> tuple[Limit, ...]:
    """
    Every row known: those built in, then those of the user's own sheet.

    Raises
    ------
    InputError, UnreadableFileError
        If the user's sheet is broken, or gives a limit the id of one built in.
    """
    if limits_file is None:
        return built_in()
    own = read_sheet(limits_file)
    taken = {limit.id for limit in built_in()}
    for limit in own:
        if limit.id in taken:
            raise InputError(f"{Path(limits_file).name}: '{limit.id}' is the id of a limit built in: choose another id")
    return built_in() + own


def known_limits(limits_file: str | Path | None = None, on_date: datetime.date | str | None = None) -> Limits:
    """
    Limits by id, each as it stood on a day.

    Parameters
    ----------
    limits_file : path, optional
        Sheet of the user's own, beside those built in.
    on_date : date or str, optional
        Day (`2024-09-01`) whose limits are asked for; without it, those that nothing has replaced.

    Returns
    -------
    Limits
        One limit an id; asking for an unknown one raises `InputError` with the nearest.

    Raises
    ------
    InputError, UnreadableFileError
        If the date or the sheet is broken.
    """
    day = read_date(on_date)
    return Limits((limit.id, limit) for limit in all_rows(limits_file) if limit.in_force(day))


def chosen_limits(
    names: Iterable[str], limits_file: str | Path | None = None, on_date: datetime.date | str | None = None
) -> tuple[Limit, ...]:
    """Give the limits of those ids in that order, all that apply when none is named; `InputError` if one is unknown."""
    names = tuple(dict.fromkeys(names))
    known = known_limits(limits_file, on_date)
    if not names:
        return tuple(known.values())
    for name in names:
        stages = [limit for limit in all_rows(limits_file) if limit.id == name]
        if stages and name not in known:
            spans = "; ".join(_span(limit) for limit in stages)
            raise InputError(f"limit '{name}' did not apply on {read_date(on_date)}, only {spans}")
    return tuple(known[name] for name in names)


def default_limits() -> tuple[Limit, ...]:
    """All limits built in that are in force."""
    return chosen_limits(())


def _span(limit: Limit) -> str:
    return f"from {limit.begins or 'the beginning'} until {limit.until or 'today'}"


def read_date(text: datetime.date | str | None) -> datetime.date | None:
    """Read a date written as 2024-09-01; `InputError` if it is none."""
    if not isinstance(text, str):
        return text
    try:
        return datetime.date.fromisoformat(text)
    except ValueError:
        raise InputError(f"'{text}' is no date: write it as 2024-09-01") from None
