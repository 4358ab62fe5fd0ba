"""WAV and whatever else the sound library opens: full scale is 1."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from contextlib import ExitStack, contextmanager, suppress
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError, UnreadableFileError
from flicker.readers import ReadOptions, reader
from flicker.readers._riff import PatchedFile, inspect
from flicker.results import Note
from flicker.trace import Capture, FloatArray, Segment, Trace, Whole, sample_at

if TYPE_CHECKING:
    import soundfile

_BLOCK = 1 << 18  # frames
_MOST_KEPT = 1 << 25  # samples of all channels together; of longer recordings an excerpt is kept
_MOST_A_BYTE = 20_000  # frames that the best packing of silence puts into a byte
_UNSTATED = 1 << 62  # frames of a FLAC whose head was never finished
_SUBTYPES = {
    "PCM_S8": "8-bit",
    "PCM_U8": "8-bit",
    "PCM_16": "16-bit",
    "PCM_24": "24-bit",
    "PCM_32": "32-bit",
    "FLOAT": "32-bit floating point",
    "DOUBLE": "64-bit floating point",
}


def _is_sound(head: bytes) -> bool:
    form, kind = head[:4], head[8:12]
    return (
        (form in (b"RIFF", b"RIFX", b"RF64", b"BW64") and kind == b"WAVE")
        or (form == b"FORM" and kind in (b"AIFF", b"AIFC"))
        or form in (b"fLaC", b"caff", b".snd")
        or head[:16] == b"riff\x2e\x91\xcf\x11\xa5\xd6\x28\xdb\x04\xc1\x00\x00"
    )


@dataclass(frozen=True, slots=True)
class SoundFacts:
    """What the head of a sound file states."""

    sample_rate: float  # [Hz]
    frames: int
    channels: int
    sample_format: str


@contextmanager
def _opened(path: Path) -> Iterator[soundfile.SoundFile]:
    import soundfile

    patches = inspect(path).patches
    try:
        with ExitStack() as opened:
            source = opened.enter_context(PatchedFile(path, patches)) if patches else str(path)
            yield opened.enter_context(soundfile.SoundFile(source))
    except soundfile.LibsndfileError as error:
        reason = str(error.error_string).removeprefix("Error : ").strip().rstrip(".")
        raise UnreadableFileError(
            f"{path}: is no sound file that can be read: damaged, cut short or of an unknown kind ({reason}); copy it "
            "again, or export it as WAV"
        ) from error


def _facts(sound: Any) -> SoundFacts:
    return SoundFacts(
        float(sound.samplerate), int(sound.frames), int(sound.channels), _SUBTYPES.get(sound.subtype, sound.subtype)
    )


def facts(path: str | Path) -> SoundFacts:
    """Give sample rate, length and channels of a sound file; `UnreadableFileError` if it is none."""
    with _opened(Path(path)) as sound:
        return _facts(sound)


def _chosen(path: Path, channels: Sequence[int], available: int) -> list[int]:
    """Give indices from 0 of the wanted channels; all if none is named."""
    for number in channels:
        if not 1 <= number <= available:
            raise InputError(f"{path}: has no channel {number}; --channel takes 1 to {available}")
    return [number - 1 for number in dict.fromkeys(channels)] or list(range(available))


def blocks(
    path: str | Path,
    *,
    channels: Sequence[int] = (),
    frames: int = _BLOCK,
    first: int = 0,
    after: int | None = None,
    dtype: Literal["float32", "float64"] = "float64",
) -> Iterator[npt.NDArray[Any]]:
    """
    Read a sound file of any length piece by piece.

    Parameters
    ----------
    path : str or Path
        The file.
    channels : sequence of int
        Channels from 1; all if empty.
    frames : int
        Length of a block; the last one may be shorter.
    first, after : int
        Number of the first frame, and of that after the last one; all of the file if left out.
    dtype : {"float64", "float32"}
        Of the blocks; float32 holds up to 24 bits exactly and reads faster.

    Yields
    ------
    ndarray
        The next samples, shape (n, c), full scale 1. Each block is the caller's own.

    Raises
    ------
    UnreadableFileError
        If it is no sound file, or ends before its head says.
    InputError
        If it has no such channel.
    """
    path = Path(path)
    with _opened(path) as sound:
        chosen = _chosen(path, channels, sound.channels)
        everything = chosen == list(range(sound.channels))
        if first:
            sound.seek(first)
        missing = (sound.frames if after is None else after) - first
        while missing > 0:
            block = sound.read(min(frames, missing), dtype=dtype, always_2d=True)
            if len(block) == 0:
                raise _cut_short(path, sound.frames, sound.tell())
            missing -= len(block)
            yield block if everything else block[:, chosen]


def _cut_short(path: Path, promised: int, found: int) -> UnreadableFileError:
    return UnreadableFileError(
        f"{path}: its head promises {promised} samples, but it ends after {found}; copy it again"
    )


@reader(
    "wav",
    suffixes=(".wav", ".flac", ".aiff", ".caf"),
    recognises=_is_sound,
)
def read_wav(path: Path, options: ReadOptions) -> Capture:
    """Read the channels of a sound file; full scale is 1."""
    known = facts(path)
    if known.frames == 0:
        raise UnreadableFileError(f"{path}: holds no samples; record it again")
    chosen = _chosen(path, options.channels, known.channels)
    share = inspect(path).share
    if known.frames > _MOST_A_BYTE * path.stat().st_size:
        known, share = _readable(path, known)
    try:
        first, after, found = _samples(path, chosen, known, options)
    except UnreadableFileError:
        shorter, share = _readable(path, known)
        if shorter.frames == known.frames:
            raise
        known = shorter
        first, after, found = _samples(path, chosen, known, options)
    read_as = f"{known.sample_format} samples, full scale is 1, {known.sample_rate:g} Hz from the file's head"
    used = (
        [f"used {after - first} of them, from {first / known.sample_rate:.6g} s on"]
        if after - first < known.frames
        else []
    )
    traces = tuple(
        Trace(
            light,
            known.sample_rate,
            name=f"channel {number + 1}",
            segments=(Segment(0, begin / known.sample_rate),),
            notes=() if share == 1 else (_cut(known, share),),
            whole=whole,
            history=(f"channel {number + 1} of {known.channels}: {known.frames} {read_as}", *used),
        )
        for number, (light, begin, whole) in zip(chosen, found, strict=True)
    )
    return Capture(traces, kind="wav")


def _readable(path: Path, known: SoundFacts) -> tuple[SoundFacts, float]:
    """Go through a file whose head or samples are damaged; give what can be read, and the share that it is."""
    frames, step = 0, _BLOCK
    while step:
        frames = _read_on(path, frames, step)
        step //= 8
    if frames == 0:
        raise UnreadableFileError(
            f"{path}: is damaged or cut short, and none of its samples can be read; copy it again, or export it as WAV"
        )
    return replace(known, frames=frames), frames / known.frames if known.frames < _UNSTATED else 1.0


def _read_on(path: Path, frames: int, step: int) -> int:
    """Read step by step from a frame on, as far as the sound library comes; give the frame where it fails."""
    import soundfile

    with _opened(path) as sound, suppress(soundfile.LibsndfileError):
        sound.seek(frames)
        while length := len(sound.read(step, dtype="float32")):
            frames += length
    return frames


def _cut(known: SoundFacts, share: float) -> Note:
    return Note(
        "cut-short",
        "warning",
        f"the file is cut short or damaged: only its first {known.frames / known.sample_rate:.4g} s, "
        f"{100 * share:.3g} % of what its head promises, could be read; copy it again, or export it as WAV",
    )


_Found = list[tuple[FloatArray, int, Whole | None]]  # light, number of its first sample, and of what it is an excerpt


def _part(known: SoundFacts, options: ReadOptions) -> tuple[int, int]:
    """Give number of the first frame that is wanted, and of that after the last one; of none that is there, all."""
    begin = options.start or 0.0
    end = math.inf if options.duration is None else begin + options.duration
    first, after = (sample_at(moment, known.sample_rate, known.frames) for moment in (begin, end))
    return (first, after) if first < after else (0, known.frames)


def _samples(path: Path, chosen: list[int], known: SoundFacts, options: ReadOptions) -> tuple[int, int, _Found]:
    """Read the wanted part; give its first frame too, and the one after its last."""
    first, after = _part(known, options)
    long = (after - first) * len(chosen) > _MOST_KEPT
    return first, after, (_excerpts if long else _all_samples)(path, chosen, known, first, after)


def _all_samples(path: Path, chosen: list[int], known: SoundFacts, first: int, after: int) -> _Found:
    light = [np.empty(after - first) for _ in chosen]
    done = 0
    for block in blocks(path, channels=[number + 1 for number in chosen], first=first, after=after):
        for readings, column in zip(light, block.T, strict=True):
            readings[done : done + len(block)] = column
        done += len(block)
    if not all(np.isfinite(readings.sum()) or np.isfinite(readings).all() for readings in light):
        raise _no_numbers(path)
    return [(readings, first, None) for readings in light]


def _excerpts(path: Path, chosen: list[int], known: SoundFacts, first: int, after: int) -> _Found:
    from flicker.readers._long import NotFinite, block_frames, read_long

    numbers, rate = [number + 1 for number in chosen], known.sample_rate
    stream = blocks(path, channels=numbers, frames=block_frames(rate), first=first, after=after, dtype="float32")
    try:
        found = read_long(stream, after - first, len(chosen), rate, first / rate)
    except NotFinite:
        raise _no_numbers(path) from None
    return [(one.excerpt, first + one.first, one.whole) for one in found]


def _no_numbers(path: Path) -> UnreadableFileError:
    return UnreadableFileError(f"{path}: holds samples that are no numbers; record or export it again")
