"""Heads of sound files that are unfinished or cut short, so that the sound library reads what is really there."""

from __future__ import annotations

import io
import struct
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


def patches_for(path: Path) -> dict[int, bytes]:
    """
    Give what must be changed in a WAV head to make it true, by offset; nothing for a sound one and for other files.

    Raises
    ------
    UnreadableFileError
        If the head promises more samples than there are: the file was cut short.
    """
    total = path.stat().st_size
    with path.open("rb") as file:
        form = file.read(12)
        if form[:4] not in _WAVES or form[8:] != b"WAVE":
            promised = _promised(form + file.read(12))
            if promised > total:
                raise _cut_short(path, promised, total)
            return {}
        patches = {0: b"RF64"} if form[:4] == b"BW64" else {}
        long_size, long_place = None, 0
        offset = 12
        while len(head := file.read(8)) == 8:
            size = struct.unpack("<I", head[4:])[0]
            if head[:4] == b"ds64":
                body = file.read(16)
                long_size, long_place = struct.unpack("<Q", body[8:])[0] if len(body) == 16 else None, offset + 16
            if head[:4] == b"data":
                return patches | _data_patch(path, file, offset, size, long_size, long_place, total)
            offset += 8 + size + size % 2
            if offset >= total:
                break
            file.seek(offset)
    raise UnreadableFileError(f"{path}: ends before its samples begin; copy or record it again")


def _data_patch(
    path: Path, file: Any, offset: int, size: int, long_size: int | None, long_place: int, total: int
) -> dict[int, bytes]:
    available = total - offset - 8
    promised = long_size if long_size is not None and size == _UNKNOWN else size
    if promised == 0 and available and not _is_chunk(file.read(8), available):
        if long_size is not None:
            return {long_place: struct.pack("<Q", available)}
        return {offset + 4: struct.pack("<I", min(available, _UNKNOWN))}
    if promised > available and promised != _UNKNOWN:
        raise _cut_short(path, promised, available)
    return {}


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


def _cut_short(path: Path, promised: int, found: int) -> UnreadableFileError:
    return UnreadableFileError(f"{path}: its head promises {promised} bytes, but it ends after {found}; copy it again")


def _is_chunk(head: bytes, available: int) -> bool:
    """Whether bytes behind an empty chunk are the head of the next one."""
    return len(head) == 8 and head[:4].isalnum() and struct.unpack("<I", head[4:])[0] + 8 <= available
