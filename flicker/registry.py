"""Names and the entries behind them, found the first time they are asked for."""

from __future__ import annotations

import importlib
import pkgutil
from collections.abc import Iterator, Mapping
from typing import Generic, TypeVar

from flicker.errors import InputError

Entry = TypeVar("Entry")


def did_you_mean(what: str, name: str, known: list[str]) -> str:
    """Say that no `what` is called `name`, with the nearest known name, or all of them when none is near."""
    import difflib

    near = difflib.get_close_matches(name, known, n=1, cutoff=0.5)
    return f"no {what} is called '{name}'; " + (f"did you mean '{near[0]}'?" if near else f"known: {', '.join(known)}")


class Registry(Mapping[str, Entry], Generic[Entry]):
    """
    Entries by name, in the order in which the modules of a package state them.

    Parameters
    ----------
    package : str
        Dotted name of the package whose modules are imported on the first look-up. Modules whose name
        starts with an underscore are helpers and are left alone.
    what : str
        What an entry is called in an error message, such as "limit".
    """

    def __init__(self, package: str, what: str) -> None:
        self._package = package
        self._what = what
        self._entries: dict[str, Entry] = {}
        self._loaded = False

    def add(self, name: str, entry: Entry) -> None:
        """Put an entry under a name that is still free; `ValueError` if it is taken."""
        if name in self._entries:
            raise ValueError(f"two entries are called '{name}'")
        self._entries[name] = entry

    def _load(self) -> dict[str, Entry]:
        if not self._loaded:
            package = importlib.import_module(self._package)
            for module in sorted(pkgutil.iter_modules(package.__path__), key=lambda found: found.name):
                if not module.name.startswith("_"):
                    importlib.import_module(f"{self._package}.{module.name}")
            self._loaded = True  # only now: what failed to load fails again, and leaves no half list
        return self._entries

    def __getitem__(self, name: str) -> Entry:
        """Give the entry of that name; `InputError` with the nearest name if there is none."""
        entries = self._load()
        if name not in entries:
            raise InputError(did_you_mean(self._what, name, list(entries)))
        return entries[name]

    def __contains__(self, name: object) -> bool:
        return name in self._load()

    def __iter__(self) -> Iterator[str]:
        return iter(self._load())

    def __len__(self) -> int:
        return len(self._load())
