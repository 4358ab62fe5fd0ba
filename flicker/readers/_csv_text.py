"""The text of a table, whatever its encoding, in pieces that end where lines end."""

from __future__ import annotations

import codecs
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from flicker.errors import UnreadableFileError
from flicker.readers._csv_numbers import Bytes

_PIECE = 1 << 22
_LONGEST_LINE = 1 << 24
_TAIL = b"\x00\x1a"  # what some instruments and old systems leave behind the text
_BOMS = ((codecs.BOM_UTF8, "utf-8"), (codecs.BOM_UTF16_LE, "utf-16-le"), (codecs.BOM_UTF16_BE, "utf-16-be"))


@dataclass(frozen=True, slots=True)
class TextFile:
    """A file of text: where it begins behind a byte order mark, how it is encoded, how its lines end."""

    path: Path
    begin: int
    encoding: str  # utf-8 stands for all that agree with ASCII
    old_line_ends: bool  # carriage returns alone

    @classmethod
    def opened(cls, path: Path, head: bytes) -> TextFile:
        """Recognise encoding and line ends from the first bytes."""
        begin, encoding = encoding_of(head)
        text = head[begin:].decode(encoding, "replace")
        return cls(path, begin, encoding, "\r" in text and "\n" not in text)

    @property
    def wide(self) -> bool:
        """Whether a character takes two bytes."""
        return self.encoding != "utf-8"

    def pieces(self, *, start: int = 0, size: int = _PIECE) -> Iterator[Bytes]:
        """
        Read the text as UTF-8 or an 8-bit code, in pieces of whole lines.

        Parameters
        ----------
        start : int
            First byte of the file to read, at least `begin`; where it lies within a line, its rest is dropped.
        size : int
            About how long a piece is.

        Yields
        ------
        ndarray
            Bytes, ending with a line feed; the last piece may be one line that lacks it.
        """
        decoder = codecs.getincrementaldecoder(self.encoding)("replace") if self.wide else None
        rest = b""
        inside = start > self.begin
        start = max(start, self.begin)
        with self.path.open("rb", buffering=0) as file:
            file.seek(start - (start - self.begin) % 2 if self.wide else start)
            while raw := file.read(size):
                text = raw if decoder is None else decoder.decode(raw).encode("utf-8", "replace")
                if self.old_line_ends:
                    text = text.replace(b"\r", b"\n")
                if text[-1:] == b"\x00":
                    text = text.rstrip(_TAIL)
                cut = text.rfind(b"\n") + 1
                if cut == 0:
                    rest += text
                    if len(rest) > _LONGEST_LINE:
                        raise UnreadableFileError(
                            f"{self.path}: has a line of over 16 million characters; export it as a table"
                        )
                    continue
                whole = rest + text[:cut] if rest else text[:cut]
                rest = text[cut:]
                if inside:
                    whole, inside = whole[whole.find(b"\n") + 1 :], False
                if whole:
                    yield np.frombuffer(whole, dtype=np.uint8)
        rest = rest.rstrip(_TAIL)
        if rest and not inside:
            yield np.frombuffer(rest, dtype=np.uint8)

    def sample(self, start: int, size: int) -> list[bytes]:
        """Give the whole lines that lie between two places of the file."""
        piece = next(self.pieces(start=start, size=size), np.zeros(0, np.uint8))
        return piece.tobytes().removesuffix(b"\n").split(b"\n") if piece.size else []


def encoding_of(head: bytes) -> tuple[int, str]:
    """
    Tell where the text begins and how it is encoded.

    Examples
    --------
    >>> encoding_of("time".encode("utf-16"))
    (2, 'utf-16-le')
    """
    for mark, encoding in _BOMS:
        if head.startswith(mark):
            return len(mark), encoding
    pairs = np.frombuffer(head[: len(head) // 2 * 2], dtype=np.uint8).reshape(-1, 2)
    if len(pairs):
        first_zero, second_zero = (pairs == 0).mean(axis=0)
        if second_zero > 0.7 and first_zero < 0.3:
            return 0, "utf-16-le"
        if first_zero > 0.7 and second_zero < 0.3:
            return 0, "utf-16-be"
    return 0, "utf-8"


def as_words(line: bytes) -> str:
    """Decode a line of a header: UTF-8, or else Latin-1."""
    try:
        return line.decode("utf-8").strip("\r\x00\x1a")
    except UnicodeDecodeError:
        return line.decode("latin-1").strip("\r\x00\x1a")


def is_text(head: bytes) -> bool:
    """Whether a file that begins like this is text."""
    begin, encoding = encoding_of(head)
    text = head[begin:].decode(encoding, "replace") if encoding != "utf-8" else head[begin:].decode("latin-1")
    text = text.rstrip("\x00\x1a")
    strange = sum(text.count(chr(code)) for code in (*range(9), *range(14, 26), *range(28, 32)))
    return bool(text) and strange <= len(text) // 50 + 2
