"""Files that are either written whole or not at all."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from flicker.errors import UnreadableFileError


@contextmanager
def whole_file(path: str | Path) -> Iterator[Path]:
    """
    Lend a temporary path beside `path`; what stands there at the end takes its name, after an error nothing is left.

    Raises
    ------
    UnreadableFileError
        If the folder is missing or cannot be written to.
    """
    path = Path(path)
    try:
        handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.stem}-", suffix=path.suffix)
        os.close(handle)
    except OSError as error:
        raise UnreadableFileError(f"{path}: cannot be written: {error.strerror or error}") from error
    temporary = Path(name)
    try:
        yield temporary
        temporary.chmod(0o644)
        temporary.replace(path)
    except OSError as error:
        raise UnreadableFileError(f"{path}: cannot be written: {error.strerror or error}") from error
    finally:
        temporary.unlink(missing_ok=True)


def write_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text, whole or not at all; `UnreadableFileError` if the place cannot be written to."""
    with whole_file(path) as temporary:
        temporary.write_text(text, encoding="utf-8", newline="\n")
