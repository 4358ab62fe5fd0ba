"""Readers: a file becomes a `Capture`; each recognises its own first bytes and takes nothing off."""

from __future__ import annotations

import dataclasses
import hashlib
import threading
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from flicker.errors import FlickerError, UnreadableFileError
from flicker.registry import Registry
from flicker.trace import Capture

HEAD = 65536  # bytes that a reader sees to recognise its own
_HASH_BLOCK = 1 << 20


@dataclass(frozen=True, slots=True)
class ReadOptions:
    """
    How to read, for every reader alike; a reader uses what concerns it.

    `others` holds what only one reader knows, by name.
    """

    sample_rate: float | None = None  # of a file that does not state it [Hz]
    columns: tuple[str, ...] = ()  # of a table, by name or by number from 1
    time_column: str | None = None  # by name or by number from 1
    channels: tuple[int, ...] = ()  # of a sound file, from 1
    frame_rate: float | None = None  # at which a video was really shot [Hz]
    start: float | None = None  # of the part that is wanted; a reader may leave out the rest [s]
    duration: float | None = None  # [s]
    others: Mapping[str, Any] = field(default_factory=dict)


ReadFunction = Callable[[Path, ReadOptions], Capture]


@dataclass(frozen=True, slots=True)
class Reader:
    """One kind of file: is it mine, by the first bytes; read it."""

    kind: str  # of the captures it makes
    suffixes: tuple[str, ...]  # usual ones, for messages and the manual only
    recognises: Callable[[bytes], bool]
    read: ReadFunction
    order: int  # readers with small numbers are asked first


READERS: Registry[Reader] = Registry("flicker.readers", "reader")


def reader(
    kind: str, *, suffixes: tuple[str, ...], recognises: Callable[[bytes], bool], order: int = 0
) -> Callable[[ReadFunction], ReadFunction]:
    """
    Register the decorated function as the reader of one kind of file.

    Parameters
    ----------
    kind : str
        Name of the reader and `Capture.kind` of what it reads.
    suffixes : tuple of str
        Usual endings of the file name; they do not decide.
    recognises : callable
        Whether a file is of this kind, from its first `HEAD` bytes.
    order : int
        Readers with small numbers are asked first; one that takes almost anything has a large one.
    """

    def register(function: ReadFunction) -> ReadFunction:
        READERS.add(kind, Reader(kind, suffixes, recognises, function, order))
        return function

    return register


def read(
    path: str | Path,
    *,
    sample_rate: float | None = None,
    columns: Sequence[str | int] = (),
    time_column: str | int | None = None,
    channels: Sequence[int] = (),
    frame_rate: float | None = None,
    start: float | None = None,
    duration: float | None = None,
    **others: Any,
) -> Capture:
    """
    Read a capture; its kind is told from its first bytes, whatever its name.

    Parameters
    ----------
    path : str or Path
        The file.
    sample_rate : float, optional
        Sample rate of a table that does not state it. [Hz]
    columns : sequence of str or int
        Columns of a table to read as channels, by name or by number from 1; all numeric ones if empty.
    time_column : str or int, optional
        Column of a table that holds the time; found if not given.
    channels : sequence of int
        Channels of a sound file, from 1; all if empty.
    frame_rate : float, optional
        Frame rate at which a video was really shot. [Hz]
    start, duration : float, optional
        Part that is wanted: of a sound file only that is read. `flicker.conditioning.condition` cuts exactly. [s]
    **others
        What only one reader knows, such as the options for video.

    Returns
    -------
    Capture
        What was recorded, nothing taken off; every trace says in its history what was understood.

    Raises
    ------
    UnreadableFileError
        If there is no such file, or its content is none that can be read.
    InputError
        If an option does not fit the file, or the file leaves something open that an option must state.
    """
    path = Path(path)
    head = _head(path)
    options = ReadOptions(
        sample_rate,
        tuple(str(column) for column in columns),
        None if time_column is None else str(time_column),
        tuple(channels),
        frame_rate,
        start,
        duration,
        others,
    )
    mine = next((entry for entry in _in_order() if entry.recognises(head)), None)
    if mine is None:
        known = ", ".join(suffix for entry in _in_order() for suffix in entry.suffixes)
        raise UnreadableFileError(
            f"{path}: its content is of no kind that can be read; save the capture as one of {known}"
        )
    with _Fingerprint(path) as fingerprint:
        try:
            capture = mine.read(path, options)
        except FlickerError:
            raise
        except OSError as error:
            raise UnreadableFileError(f"{path}: cannot be read: {error.strerror or error}") from error
        except MemoryError as error:
            raise UnreadableFileError(
                f"{path}: does not fit into memory; read fewer channels or record less"
            ) from error
        return dataclasses.replace(capture, path=path, sha256=fingerprint.hexdigest())


def kind_of(path: str | Path) -> str | None:
    """Name the kind of a capture by its first bytes; None where no reader knows it."""
    head = _head(Path(path))
    return next((entry.kind for entry in _in_order() if entry.recognises(head)), None)


def _in_order() -> list[Reader]:
    return sorted(READERS.values(), key=lambda entry: entry.order)


def _head(path: Path) -> bytes:
    """Give the first bytes of a file that is there and holds something."""
    try:
        if path.is_dir():
            raise UnreadableFileError(f"{path}: is a folder; name the capture inside it")
        if not path.exists():
            raise UnreadableFileError(f"{path}: there is no such file; check the name and the folder")
        if not path.is_file():
            raise UnreadableFileError(f"{path}: is no ordinary file; save the capture to one first")
        with path.open("rb") as file:
            head = file.read(HEAD)
    except UnreadableFileError:
        raise
    except (OSError, ValueError) as error:
        raise UnreadableFileError(f"{path}: cannot be opened: {getattr(error, 'strerror', None) or error}") from error
    if not head:
        raise UnreadableFileError(f"{path}: is empty; record or copy it again")
    return head


class _Fingerprint:
    """SHA-256 of a file, computed beside the reading of it."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._hash = hashlib.sha256()
        self._stop = False
        self._problem: OSError | None = None
        self._thread = threading.Thread(target=self._run, daemon=True)

    def __enter__(self) -> _Fingerprint:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._stop = True
        self._thread.join()

    def _run(self) -> None:
        try:
            with self._path.open("rb", buffering=0) as file:
                while not self._stop and (block := file.read(_HASH_BLOCK)):
                    self._hash.update(block)
        except OSError as error:
            self._problem = error

    def hexdigest(self) -> str:
        """Wait for the end and give the digits."""
        self._thread.join()
        if self._problem:
            raise UnreadableFileError(f"{self._path}: cannot be read: {self._problem.strerror or self._problem}")
        return self._hash.hexdigest()
