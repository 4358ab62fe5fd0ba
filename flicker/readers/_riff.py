"""Heads of sound files that are unfinished or cut short, so that the sound library reads what is really there."""

from __future__ import annotations

import io
import struct
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from flicker.errors import UnreadableFileError

_UNKNOWN = 0xFFFFFFFF  # a size that the recorder never came to write
_WAVES = (b"RIFF", b"RF64", b"BW64")


class PatchedFile(io.FileIO):
    """A file of which some bytes read as others."""

    def __init__(self, path: Path, patches: dict[int, bytes]) -> None:
        super().__init__(path)
        self._patches = patches

    def readinto(self, buffer: Any, /) -> int:
        """Read into a buffer, as `io.RawIOBase` does."""
        here = self.tell()
        count = super().readinto(buffer) or 0
        view = memoryview(buffer).cast("B")
        for offset, patch in self._patches.items():
            for index, byte in enumerate(patch, start=offset - here):
                if 0 <= index < count:
                    view[index] = byte
        return count

    def read(self, size: int | None = -1, /) -> bytes:
        """Read some bytes, as `io.RawIOBase` does."""
        if size is None or size < 0:
            return self.readall()
        buffer = bytearray(size)
        return bytes(buffer[: self.readinto(buffer)])


@dataclass(frozen=True, slots=True)
class Head:
    """What must be changed in the head of a sound file to make it true, and how much of the file is there."""

    patches: dict[int, bytes] = field(default_factory=dict)  # by offset
    share: float = 1.0  # of the bytes that the head promises; less than 1 if the file was cut short


def inspect(path: Path) -> Head:
    """
    Look at the head of a sound file.

    Raises
    ------
    UnreadableFileError
        If the file ends before its samples begin.
    """
    total = path.stat().st_size
    with path.open("rb") as file:
        form = file.read(12)
        if form[:4] not in _WAVES or form[8:] != b"WAVE":
            if form[:4] == b"caff":
                return _core_audio(path, file, total)
            promised = _promised(form + file.read(12))
            return Head(share=total / promised if promised > total else 1.0)
        patches = {0: b"RF64"} if form[:4] == b"BW64" else {}
        long_size, long_place = None, 0
        offset = 12
        while len(head := file.read(8)) == 8:
            size = struct.unpack("<I", head[4:])[0]
            if head[:4] == b"ds64":
                body = file.read(16)
                long_size, long_place = struct.unpack("<Q", body[8:])[0] if len(body) == 16 else None, offset + 16
            if head[:4] == b"data":
                return _wave(patches, file, offset, size, long_size, long_place, total)
            offset += 8 + size + size % 2
            if offset >= total:
                break
            file.seek(offset)
    raise _too_short(path)


def _wave(
    patches: dict[int, bytes], file: Any, offset: int, size: int, long_size: int | None, long_place: int, total: int
) -> Head:
    available = total - offset - 8
    promised = long_size if long_size is not None and size == _UNKNOWN else size
    if promised == 0 and available and not _is_chunk(file.read(8), available):
        if long_size is not None:
            return Head(patches | {long_place: struct.pack("<Q", available)})
        return Head(patches | {offset + 4: struct.pack("<I", min(available, _UNKNOWN))})
    cut = promised > available and promised != _UNKNOWN
    return Head(patches, available / promised if cut else 1.0)


def _core_audio(path: Path, file: Any, total: int) -> Head:
    """Make the size of the samples in a CAF true: the sound library refuses one that is too large."""
    offset = 8
    while offset < total:
        file.seek(offset)
        head = file.read(12)
        if len(head) < 12:
            break
        size = struct.unpack(">q", head[4:])[0]
        available = total - offset - 12
        if head[:4] == b"data":
            if size <= available:
                return Head()
            return Head({offset + 4: struct.pack(">q", available)}, available / size)
        if size < 0:
            break
        offset += 12 + size
    raise _too_short(path)


def _promised(head: bytes) -> int:
    """Bytes that the first 24 of another sound file promise; 0 if they promise nothing."""
    if head[:4] == b"FORM" and len(head) >= 8:
        return int(struct.unpack(">I", head[4:8])[0]) + 8
    if head[:4] == b"riff" and len(head) == 24:
        return int(struct.unpack("<Q", head[16:])[0])
    if head[:4] == b".snd" and len(head) >= 12:
        offset, size = struct.unpack(">II", head[4:12])
        return 0 if size == _UNKNOWN else int(offset) + int(size)
    return 0


def _too_short(path: Path) -> UnreadableFileError:
    return UnreadableFileError(f"{path}: ends before its samples begin; copy or record it again")


def _is_chunk(head: bytes, available: int) -> bool:
    """Whether bytes behind an empty chunk are the head of the next one."""
    return len(head) == 8 and head[:4].isalnum() and struct.unpack("<I", head[4:])[0] + 8 <= available
