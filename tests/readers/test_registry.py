"""Which reader takes a file, and what is refused before any reader sees it."""

import hashlib
import os

import pytest

from flicker.errors import UnreadableFileError
from flicker.readers import READERS, read


@pytest.mark.parametrize(
    ("head", "kind"),
    [
        (b"RIFF\x00\x00\x00\x00WAVEfmt ", "wav"),
        (b"RF64\xff\xff\xff\xffWAVEds64", "wav"),
        (b"fLaC\x00\x00\x00\x22", "wav"),
        (b"FORM\x00\x00\x00\x00AIFFCOMM", "wav"),
        (b"time,light\n0,1\n", "csv"),
        ("time;light µs\n".encode("latin-1"), "csv"),
        ("time\n".encode("utf-16"), "csv"),
        (bytes(range(256)) * 4, None),
        (b"\x89PNG\r\n\x1a\n\x00\x00\x00\rIHDR" + bytes(range(200)), None),
    ],
)
def test_readers_are_told_by_the_first_bytes(head, kind):
    entries = sorted(READERS.values(), key=lambda entry: entry.order)
    assert next((entry.kind for entry in entries if entry.recognises(head)), None) == kind


def test_the_name_of_the_file_does_not_matter(tmp_path):
    path = tmp_path / "display.wav"
    path.write_text("Time (s),light (V)\n" + "".join(f"{i / 1000},{i % 7}\n" for i in range(50)))
    assert read(path).kind == "csv"


def test_the_fingerprint_is_that_of_the_file(tmp_path):
    """SHA-256 (FIPS 180-4) of the content as it stands on the disk."""
    path = tmp_path / "display.csv"
    content = b"Time (s),light (V)\n" + b"".join(b"%.3f,%d\n" % (i / 1000, i % 7) for i in range(300_000))
    path.write_bytes(content)
    assert read(path).sha256 == hashlib.sha256(content).hexdigest()


def test_what_is_no_file_is_refused(tmp_path):
    empty = tmp_path / "empty.csv"
    empty.touch()
    binary = tmp_path / "picture.png"
    binary.write_bytes(b"\x89PNG\r\n\x1a\n" + bytes(range(256)) * 8)
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    for path, words in (
        (tmp_path / "missing.csv", "there is no such file"),
        (tmp_path, "is a folder"),
        (empty, "is empty"),
        (binary, "of no kind that can be read"),
        (pipe, "no ordinary file"),
        (tmp_path / ("n" * 300), "name"),
    ):
        with pytest.raises(UnreadableFileError, match=words) as caught:
            read(path)
        assert "\n" not in str(caught.value)
