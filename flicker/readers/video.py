"""Video: the mean light of each frame as traces, or of each line as footage."""

from __future__ import annotations

import dataclasses
import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError, UnreadableFileError
from flicker.footage import Footage, ReadDirection
from flicker.readers import ReadOptions, reader
from flicker.readers._video_decode import VideoFile, true_times
from flicker.readers._video_light import Block, LightMeter
from flicker.registry import did_you_mean
from flicker.results import Note
from flicker.signal.transfer import transfer_gamma
from flicker.trace import Capture, Segment, Trace
from flicker.workers import counted

Region = tuple[int, int, int, int]

_PROBED = 24  # frames that decide which parts of the picture are usable
_LOOK_AGAIN = 16  # frames between later looks for clipped highlights
_MOST_VALUES = 1 << 24  # kept of a long video: 64 MB
_MUCH_CLIPPED = 0.02


@dataclass(slots=True)
class _Clipping:
    """Which blocks of the picture stay below the upper end of the range."""

    usable: npt.NDArray[np.float32]  # 1 or 0, shape (r, m)
    share: float  # of the picture that is left out
    later: float = 0.0  # share that clips later although it did not at first

    @classmethod
    def among(cls, pictures: list[npt.NDArray[np.bool_]]) -> _Clipping:
        ever = np.any(pictures, axis=0)
        share = float(ever.mean())
        if share > 0.97:
            ever = np.zeros_like(ever)
        return cls((~ever).astype(np.float32), share)

    def look(self, clipped: npt.NDArray[np.bool_]) -> None:
        self.later = max(self.later, float((clipped & (self.usable > 0)).mean()))

    def notes(self) -> list[Note]:
        if self.share > 0.97:
            message = (
                "nearly the whole picture stands at the upper end of its range at times: the brightest "
                "light is cut off and "
                "depths come out too small; film again with less exposure or gain"
            )
            return [Note("clipped", "error", message)]
        if self.later > _MUCH_CLIPPED:
            message = (
                f"{self.later:.0%} of the picture that is used clips at times: depths come out too small; "
                "film again with less exposure or gain, or choose a darker --region"
            )
            return [Note("clipped", "warning", message)]
        if self.share > 0.0005:
            return [
                Note("clipped", "info", f"{self.share:.1%} of the picture is overexposed at times and was left out")
            ]
        return []


@dataclass(slots=True)
class _Film:
    """A video being read: the open file, how light is taken from it, and what was found out on the way."""

    file: VideoFile
    meter: LightMeter
    transfer: str
    first: list[Any]
    rest: Iterator[Any]
    clipping: _Clipping
    notes: list[Note]

    @classmethod
    def begin(cls, file: VideoFile, region: Region | None, sideways: bool, transfer: str | None) -> _Film:
        rest = file.frames()
        head = next(rest, None)
        if head is None:
            raise UnreadableFileError(
                f"{file.path}: not one picture can be "
                f"decoded{': ' + file.failure if file.failure else ''}; it is damaged"
            )
        notes = []
        if transfer is not None:
            transfer_gamma(transfer)
        elif (transfer := file.stated_transfer(head)) is None:
            transfer = "bt709"
            message = (
                "the file does not say how its code values relate to light; BT.709 is assumed, which "
                "can be off by a tenth "
                "and more of a shallow depth: state --transfer"
            )
            notes.append(Note("transfer-assumed", "warning", message))
        matrix, stated = file.matrix(head)
        meter = LightMeter.of(head, region, sideways, transfer, matrix)
        if not stated and meter.matrix not in ("rgb",) and meter.colour:
            message = (
                f"the file does not state its colour matrix; that of {matrix.upper().replace('BT', 'BT.')} is assumed"
            )
            notes.append(Note("matrix-assumed", "info", message))
        if head.interlaced_frame:
            message = (
                "the video is interlaced: two fields of different times stand in one frame, and times "
                "within a frame are "
                "wrong; film progressively"
            )
            notes.append(Note("interlaced", "error", message))
        first = [(meter.light(head), meter.clipped(head))]
        for frame in rest:
            first.append((meter.light(frame), meter.clipped(frame)))
            if len(first) == _PROBED:
                break
        return cls(
            file, meter, transfer, [light for light, _ in first], rest, _Clipping.among([c for _, c in first]), notes
        )

    def __iter__(self) -> Iterator[Block]:
        """Give the light of every frame in blocks, shape (c, r, m)."""
        yield from self.first
        self.first = []
        for number, frame in enumerate(counted(self.rest, "frame")):
            if frame.width != self.file.details["width"] or frame.height != self.file.details["height"]:
                raise UnreadableFileError(f"{self.file.path}: the picture changes its size on the way; cut it there")
            if number % _LOOK_AGAIN == 0:
                self.clipping.look(self.meter.clipped(frame))
            yield self.meter.light(frame)

    def end(self, frame_rate: float | None) -> tuple[npt.NDArray[np.float64], float, tuple[Note, ...]]:
        """Give the times of the frames, their mean rate and all notes."""
        base = float(self.file.stream.time_base)
        times, rate, more = true_times(self.file.stamps, base, self.file.stated_rate, frame_rate, self.file.path)
        return times, rate, (*self.notes, *self.clipping.notes(), *more, *self.file.missing(len(times)))


def read_footage(
    path: str | Path,
    *,
    read_direction: ReadDirection = "down",
    blocks: int = 1,
    colour: bool = True,
    frame_rate: float | None = None,
    region: Region | None = None,
    transfer: str | None = None,
    start: float = 0.0,
    duration: float | None = None,
) -> Footage:
    """
    Read the light of every line of every frame.

    Parameters
    ----------
    path : str or Path
        The video.
    read_direction : {"down", "up", "left", "right"}
        The way in which the sensor reads its lines, in the picture as stored; lines are columns for the last two.
    blocks : int
        Number of parts side by side into which each line is cut, at most 64.
    colour : bool
        Whether red, green and blue are kept beside `all`.
    frame_rate : float, optional
        Rate at which the video was really shot, where the file says something else. [Hz]
    region : x, y, width, height, optional
        Part of the picture as stored. [pixels]
    transfer : str, optional
        See `flicker.signal.transfer.to_light`; taken from the file if not given.
    start, duration : float, optional
        Part of the video, in real time. [s]

    Returns
    -------
    Footage
        Light above black, shape (t, r, b, c). Of a video that would fill more than 64 MB the beginning is kept,
        and a note says so.

    Raises
    ------
    UnreadableFileError
        If no picture can be decoded.
    InputError
        If the region or a name does not fit, or fewer than three frames are left.
    """
    path = Path(path)
    if read_direction not in ("down", "up", "left", "right"):
        raise InputError(did_you_mean("read direction", read_direction, ["down", "up", "left", "right"]))
    sideways = read_direction in ("left", "right")
    kept: list[npt.NDArray[Any]] = []
    with VideoFile(path) as file:
        film = _Film.begin(file, region, sideways, transfer)
        weight, gather = _gathering(film.clipping.usable, blocks)
        channels = film.meter.channels if colour else ("all",)
        red_to_all = slice(None) if colour else slice(-1, None)
        first = last = 0
        cut = False
        for number, light in enumerate(film):
            moment = _moment(file, number, frame_rate)
            if moment < start:
                first = number + 1
                continue
            if duration is not None and moment >= start + duration:
                break
            lines = film.meter.add_all(gather(light))[..., red_to_all]
            if (len(kept) + 1) * lines.size > _MOST_VALUES:
                cut = True
                break
            kept.append(lines)
            last = number + 1
        times, _, notes = film.end(frame_rate)
    times = times[first:last]
    if len(kept) < 3:
        raise InputError(f"{path.name}: {len(kept)} frames are left between --start and the end; at least 3 are needed")
    if cut or duration is not None:
        notes = tuple(note for note in notes if note.code != "truncated")
    if cut:
        seconds = float(times[-1] - times[0])
        notes += (Note("part-used", "info", f"the first {seconds:.4g} s are used; choose others with --start"),)
    backwards = read_direction in ("up", "left")
    light = np.stack(kept)[:, :: -1 if backwards else 1]
    whole = file.details["width" if sideways else "height"]
    x, y, width, height = film.meter.region
    begin, extent = (x, width) if sideways else (y, height)
    return Footage(
        light,
        channels,
        times,
        (len(times) - 1) / float(times[-1] - times[0]),
        read_direction,
        weight[:: -1 if backwards else 1].astype(float),
        whole - begin - extent if backwards else begin,
        whole,
        height if sideways else width,
        film.meter.code_step,
        film.transfer,
        film.meter.matrix,
        film.meter.full_range,
        film.file.lossless,
        np.array(film.file.alone[first:last]),
        path,
        _sha256(path),
        notes,
        (_understood(film),),
        dict(file.details),
    )


def _gathering(usable: npt.NDArray[np.float32], blocks: int) -> tuple[npt.NDArray[np.float64], Any]:
    """Weights of `blocks` parts of each line, shape (r, b), and what averages (c, r, m) into (r, b, c)."""
    finer = usable.shape[1]
    blocks = max(1, min(blocks, finer))
    edges = np.linspace(0, finer, blocks + 1).astype(int)
    parts = [slice(a, b) for a, b in pairwise(edges)]
    weight = np.stack([usable[:, part].mean(axis=1) for part in parts], axis=1)
    shares = [usable[:, part] / np.maximum(usable[:, part].sum(axis=1, keepdims=True), 1e-6) for part in parts]

    def gather(light: Block) -> Block:
        means = [np.einsum("crm,rm->rc", light[:, :, part], share) for part, share in zip(parts, shares, strict=True)]
        return np.stack(means, axis=1)

    return weight.astype(float), gather


def _sha256(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _moment(file: VideoFile, number: int, frame_rate: float | None) -> float:
    if frame_rate is not None:
        return number / frame_rate
    return float((file.stamps[number] - file.stamps[0]) * file.stream.time_base)


def _understood(film: _Film) -> str:
    details = film.file.details
    reach = "full" if film.meter.full_range else "limited"
    return (
        f"read {details['width']} x {details['height']} {details['codec']} video "
        f"({details['pixel_format']}, {reach} range, "
        f"transfer {film.transfer}, matrix {film.meter.matrix}) as linear light above black"
    )


def _is_video(head: bytes) -> bool:
    transport = head[:1] == b"G" and all(head[at : at + 1] == b"G" for at in (188, 376, 564) if at < len(head))
    return (
        head[4:8] in (b"ftyp", b"moov", b"mdat", b"wide", b"free", b"skip")
        or head[:4] in (b"\x1aE\xdf\xa3", b"\x00\x00\x01\xba", b"FLV\x01", b"OggS")
        or (head[:4] == b"RIFF" and head[8:12] == b"AVI ")
        or head[:16] == bytes.fromhex("3026b2758e66cf11a6d900aa0062ce6c")
        or head[:9] == b"YUV4MPEG2"
        or (transport and len(head) > 188)
    )


@reader("video", suffixes=(".mp4", ".mov", ".mkv", ".avi", ".webm"), recognises=_is_video)
def read_video(path: Path, options: ReadOptions) -> Capture:
    """
    Read the mean light of the region in each frame, as traces `red`, `green`, `blue` and `all`.

    Of `options.others` it uses `region`, `transfer` and `exposure` [s].
    """
    others = options.others
    with VideoFile(path) as file:
        film = _Film.begin(file, others.get("region"), False, others.get("transfer"))
        usable = film.clipping.usable
        share = (usable / max(float(usable.sum()), 1e-6)).ravel()
        means = film.meter.add_all(np.array([light.reshape(len(light), -1) @ share for light in film], dtype=float))
        times, rate, notes = film.end(options.frame_rate)
    exposure = float(others.get("exposure") or 0.0)
    if exposure * rate > 1.001:
        raise InputError(
            f"an exposure of {exposure:.4g} s does not fit between frames at {rate:.5g} Hz; check --exposure"
        )
    notes += (_aliasing(rate, exposure),)
    segments = _segments(times, rate)
    base = Trace(
        np.ones(len(times)),
        rate,
        dark_level=None,
        exposure=exposure,
        segments=segments,
        notes=notes,
        history=(_understood(film), "averaged the region over each frame"),
    )
    traces = tuple(
        dataclasses.replace(base, light=means[:, number], name=name, unit="of white")
        for number, name in enumerate(film.meter.channels)
    )
    return Capture(traces, path, "video", None, {"frame_rate_hz": rate, **file.details})


def _segments(times: npt.NDArray[np.float64], rate: float) -> tuple[Segment, ...]:
    """Runs of frames that keep the rate; every frame alone where the rate varies."""
    expected = np.arange(len(times)) / rate
    if np.abs(times - expected).max() < 1e-3 / rate:
        return (Segment(0, 0.0),)
    steps = np.diff(times) * rate
    breaks = np.flatnonzero(np.abs(steps - 1) > 1e-3) + 1
    return (Segment(0, 0.0), *(Segment(int(at), float(times[at])) for at in breaks))


def _aliasing(rate: float, exposure: float) -> Note:
    known = "" if exposure else "; state --exposure to undo what it takes from the depth"
    message = (
        f"frames at {rate:.6g} Hz cannot tell a light of frequency f from one of k times {rate:.6g} Hz "
        "plus or minus f; a second clip at another rate with --same-light settles it, flicker stripes reads beyond "
        f"it{known}"
    )
    return Note("aliasing-possible", "info", message)
