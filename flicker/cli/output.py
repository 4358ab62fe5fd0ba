"""Answers on standard output, everything else on standard error, files whole or not at all."""

from __future__ import annotations

import math
import os
import sys
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any, TextIO, TypeVar

import click

from flicker.errors import InputError

Item = TypeVar("Item")
STANDARD_OUTPUT = "-"
WIDTH_OF_A_FILE = 100  # columns, where no terminal states its own


def _plain(value: Any) -> Any:
    """Turn tuples, arrays and array scalars into what JSON knows; a number that is not finite becomes null."""
    if isinstance(value, dict):
        return {str(key): _plain(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(inner) for inner in value]
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if hasattr(value, "tolist"):
        return _plain(value.tolist())
    return value


def json_text(data: Any) -> str:
    """Give the JSON text of plain data, arrays included, with a line break at its end."""
    import json

    return json.dumps(_plain(data), ensure_ascii=False, allow_nan=False, indent=2) + "\n"


def write_json(data: Any, target: str | None) -> None:
    """
    Write data as JSON, UTF-8.

    Parameters
    ----------
    data : Any
        Dictionaries, lists, numbers, texts, arrays. NaN and infinity become null.
    target : str or None
        File, written whole or not at all; `-` for standard output; None writes nothing.

    Raises
    ------
    UnreadableFileError
        If the file cannot be written.
    """
    if target is None:
        return
    text = json_text(data)
    if target == STANDARD_OUTPUT:
        click.echo(text.encode("utf-8"), nl=False)
        return
    from flicker.files import write_text

    write_text(target, text)


def write_pieces(pieces: Iterable[bytes], target: str | None) -> None:
    """Write JSON that comes in pieces, to the same targets as `write_json`; `UnreadableFileError` as there."""
    if target == STANDARD_OUTPUT:
        for piece in pieces:
            click.echo(piece, nl=False)
    elif target is not None:
        from flicker.files import whole_file

        with whole_file(target) as temporary, temporary.open("wb") as file:
            file.writelines(pieces)


def print_words(text: str, json_target: str | None = None) -> None:
    """Print an answer for people on standard output, unless the JSON goes there."""
    if json_target == STANDARD_OUTPUT:
        return
    encoding = getattr(sys.stdout, "encoding", None) or "utf-8"
    click.echo(text.encode(encoding, errors="replace").decode(encoding), color=True)


def complain(error: Exception | str) -> None:
    """Print the one sentence of an error on standard error, in the form that every command uses."""
    click.echo(f"flicker: {error}", err=True)


def terminal_width(stream: TextIO | None = None) -> int:
    """Columns that a line may fill: those of the terminal, of `COLUMNS`, or 100 where the stream is a file."""
    import shutil

    stream = stream or sys.stdout
    if not _is_terminal(stream) and not os.environ.get("COLUMNS"):
        return WIDTH_OF_A_FILE
    return max(40, shutil.get_terminal_size((WIDTH_OF_A_FILE, 24)).columns)


def colour_wanted(stream: TextIO | None = None) -> bool:
    """Tell whether the stream is a terminal that may show colour; `NO_COLOR` and `TERM=dumb` say no."""
    if os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb":
        return False
    return _is_terminal(stream or sys.stdout)


def _is_terminal(stream: TextIO) -> bool:
    try:
        return stream.isatty()
    except ValueError:  # closed
        return False


class _Counter:
    """On a terminal, says on standard error how far long work has come, once it takes more than a second."""

    _PATIENCE, _EVERY = 1.0, 0.2  # [s]

    def __init__(self) -> None:
        self._began = self._told = time.monotonic()
        self._open = False

    def __call__(self, what: str, number: int, total: int | None) -> None:
        """Tell the number of what is at work; 0 wipes the line."""
        now = time.monotonic()
        if number == 0:
            if self._open:
                click.echo("\r\x1b[K", nl=False, err=True)
            self._open = False
        elif now - self._began > self._PATIENCE and now - self._told > self._EVERY:
            self._told, self._open = now, True
            click.echo(f"\r\x1b[K{what} {number}{f' of {total}' if total else ''}", nl=False, err=True)


@contextmanager
def counting(*, quiet: bool) -> Iterator[None]:
    """Show how far long work has come, unless asked to be quiet or not on a terminal."""
    if quiet or not _is_terminal(sys.stderr):
        yield
        return
    from flicker.workers import watched_by

    with watched_by(_Counter()):
        yield


def spare_the_captures(captures: Iterable[str | Path], outputs: Iterable[str | None]) -> None:
    """Refuse to write an answer over a capture; `InputError` names it."""
    read = {Path(capture).resolve() for capture in captures}
    for output in outputs:
        if output not in (None, STANDARD_OUTPUT) and Path(str(output)).resolve() in read:
            raise InputError(f"{output} is one of the captures: name another file for the answer")


def command_line() -> str:
    """Give the words with which the program was called, for results that state them."""
    import shlex

    return shlex.join(click.get_current_context().find_root().obj or ())


def make_folder(path: str) -> Path:
    """Make a folder for answers, with its parents; `InputError` if it cannot be had."""
    folder = Path(path)
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except FileExistsError:
        raise InputError(f"{path} is a file: name a folder") from None
    except OSError as error:
        raise InputError(f"{path}: no folder can be made there: {error.strerror or error}") from error
    return folder
