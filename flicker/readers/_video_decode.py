"""Video files opened and decoded: frames with their stamps, what the file states, and what it failed to deliver."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from types import TracebackType
from typing import Any

import numpy as np

from flicker.errors import InputError, UnreadableFileError
from flicker.results import Note
from flicker.trace import FloatArray

_TRANSFER_TAGS = {1: "bt709", 4: "2.2", 5: "2.8", 6: "bt709", 8: "linear", 13: "srgb", 14: "bt709", 15: "bt709"}
_TRANSFER_TAGS |= {16: "pq", 18: "hlg"}  # ITU-T H.273
_MATRIX_TAGS = {1: "bt709", 4: "bt601", 5: "bt601", 6: "bt601", 7: "smpte240m", 9: "bt2020", 10: "bt2020"}
_LOSSLESS = {"ffv1", "huffyuv", "ffvhuff", "utvideo", "magicyuv", "lagarith", "png", "rawvideo", "v210", "v410", "r210"}
_ROUNDED = 1.25  # spread of stamps of a constant rate: one step of the time base, and what the fit is off
_ALONE = 1  # picture type of a frame that is coded without others
_HIGH_DEFINITION = 720  # lines from which untagged video is taken as BT.709: common practice, no source


@dataclass(slots=True)
class VideoFile:
    """
    An open video: what it states of itself, and its frames.

    Raises
    ------
    UnreadableFileError
        If no picture can be decoded from the file.
    """

    path: Path
    container: Any = None
    stream: Any = None
    broken: int = 0  # pieces that could not be decoded
    failure: str = ""  # what ended the reading too early
    stamps: list[int] = field(default_factory=list)  # of the frames handed out, in units of the time base
    alone: list[bool] = field(default_factory=list)  # which of them are coded without others

    def __enter__(self) -> VideoFile:
        import av

        if not self.path.is_file():
            raise UnreadableFileError(f"{self.path}: there is no such file; check the name and the folder")
        # damage is noticed here; without this, the decoders' own remarks go to standard error
        av.logging.set_level(av.logging.PANIC)
        try:
            self.container = av.open(str(self.path))
        except (av.FFmpegError, OSError, ValueError) as error:
            raise UnreadableFileError(
                f"{self.path}: cannot be opened as video ({_plain(error)}): it may have been cut off before its index "
                "was written; copy it from the camera again"
            ) from error
        if not self.container.streams.video:
            self.container.close()
            raise UnreadableFileError(f"{self.path}: holds no picture, only sound or data")
        self.stream = self.container.streams.video[0]
        self.stream.thread_type = "AUTO"
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.container.close()

    @property
    def rotation(self) -> int:
        """Rotation that a player applies, not done here: lines keep the order of the sensor. [degrees]"""
        return int(self.details.get("rotation_deg", 0))

    details: dict[str, Any] = field(default_factory=dict)

    def frames(self) -> Iterator[Any]:
        """Decode all frames in order; what cannot be decoded is counted, never skipped in silence."""
        import av

        step = (
            1 if not self.stream.average_rate else max(1, round(1 / (self.stream.average_rate * self.stream.time_base)))
        )
        packets = self.container.demux(self.stream)
        while True:
            try:
                packet = next(packets)
            except StopIteration:
                return
            except (av.FFmpegError, OSError) as error:
                self.failure = _plain(error)
                return
            try:
                decoded = packet.decode()
            except (av.FFmpegError, OSError):
                self.broken += 1
                continue
            for frame in decoded:
                if frame.is_corrupt:
                    self.broken += 1
                if not self.stamps:
                    self._remember(frame)
                stamp = frame.pts if frame.pts is not None else (self.stamps[-1] + step if self.stamps else 0)
                self.stamps.append(int(stamp))
                self.alone.append(int(frame.pict_type) == _ALONE)
                yield frame

    def _remember(self, frame: Any) -> None:
        self.details = {
            "width": frame.width,
            "height": frame.height,
            "codec": self.stream.codec_context.name,
            "pixel_format": frame.format.name,
            "rotation_deg": int(frame.rotation or 0),
        }

    @property
    def lossless(self) -> bool:
        """Whether the codec keeps every code value."""
        return self.stream.codec_context.name in _LOSSLESS

    @property
    def stated_rate(self) -> float | None:
        """Mean frame rate that the file states. [Hz]"""
        return float(self.stream.average_rate) if self.stream.average_rate else None

    def stated_transfer(self, frame: Any) -> str | None:
        """Transfer function that the file is tagged with."""
        return _TRANSFER_TAGS.get(int(frame.color_trc))

    def matrix(self, frame: Any) -> tuple[str, bool]:
        """Colour matrix, and whether the file states it."""
        stated = _MATRIX_TAGS.get(int(frame.colorspace))
        if stated:
            return stated, True
        return ("bt709" if max(frame.height, frame.width * 9 // 16) >= _HIGH_DEFINITION else "bt601"), False

    def missing(self, frames_kept: int) -> list[Note]:
        """Say what the file promised and did not deliver; call it when all frames are read."""
        notes = []
        base = float(self.stream.time_base)
        typical = float(np.median(np.diff(self.stamps))) * base if len(self.stamps) > 1 else 0.0
        delivered = (self.stamps[-1] - self.stamps[0]) * base + typical if self.stamps else 0.0
        promised = float(self.stream.duration) * base if self.stream.duration else (self.container.duration or 0) / 1e6
        told = ""
        if promised and delivered < promised - max(2.5 * typical, 0.01 * promised):
            frames = round(promised / typical) if typical else self.stream.frames
            told = f"{len(self.stamps)} frames were delivered of about {frames} promised"
        elif self.failure:
            told = f"reading ended after {len(self.stamps)} frames: {self.failure}"
        if told:
            message = f"the file was cut or damaged: {told}; the figures rest on what is there"
            notes.append(Note("truncated", "warning", message))
        if self.broken:
            message = (
                f"{self.broken} pieces of the video could not be decoded cleanly; the frames around them may be wrong"
            )
            notes.append(Note("damaged", "warning", message))
        return notes


def _plain(error: BaseException) -> str:
    return str(getattr(error, "strerror", None) or error).split("\n")[0].rstrip(".").lower()


def true_times(
    stamps: list[int], time_base: float, stated_rate: float | None, frame_rate: float | None, path: Path
) -> tuple[FloatArray, float, list[Note]]:
    """
    Work out when each frame was really shot.

    Parameters
    ----------
    stamps : list of int
        Presentation stamps in units of the time base, as many as frames.
    time_base : float
        [s]
    stated_rate, frame_rate : float, optional
        Mean rate that the file states, and the rate at which it was really shot if the user says. [Hz]
    path : Path
        Of the file, for messages.

    Returns
    -------
    times : FloatArray
        From the first frame, shape (t,). [s]
    rate : float
        Mean frame rate. [Hz]
    notes : list of Note
        Variable rate, dropped frames, a rate that the user changed.

    Notes
    -----
    Stamps are rounded to the time base, at worst to a millisecond. Where one constant rate explains every stamp
    within that rounding, the constant rate is used; else the stamps as they are.
    """
    ticks = np.asarray(stamps, dtype=float)
    ticks -= ticks[0]
    if ticks.size < 3:
        raise InputError(f"{path.name}: {ticks.size} frames are too few: film at least some tenths of a second")
    if not (np.diff(ticks) > 0).all():
        raise UnreadableFileError(
            f"{path}: the time stamps of its frames run backwards; rewrite the file with a video tool"
        )
    notes: list[Note] = []
    median = float(np.median(np.diff(ticks)))
    mean = ticks[-1] / (ticks.size - 1)
    stated = 1 / (stated_rate * time_base) if stated_rate else mean
    regular = next((found for step in (mean, median) if (found := _regular(ticks, step, stated))), None)
    if regular is not None:
        number = np.rint(ticks / regular)
        rate = frame_rate or 1 / (regular * time_base)
        lost = int(number[-1]) + 1 - ticks.size
        if lost:
            notes.append(
                Note(
                    "dropped-frames",
                    "warning",
                    f"{lost} frames were dropped while filming; the others keep their true times",
                )
            )
        times = number / rate
    else:
        scale = 1.0 if frame_rate is None else 1 / (mean * time_base * frame_rate)
        times = ticks * time_base * scale
        spread = np.diff(times)
        message = (
            f"the frame rate varies between {1 / spread.max():.4g} and {1 / spread.min():.4g} Hz; "
            "each frame keeps its own time"
        )
        notes.append(Note("variable-frame-rate", "info", message))
        rate = (ticks.size - 1) / times[-1]
    if frame_rate is not None:
        played = 1 / (mean * time_base)
        if abs(played / frame_rate - 1) > 1e-3:
            message = f"the file plays at {played:.6g} Hz; it is taken as shot at {frame_rate:.6g} Hz, as told"
            notes.append(Note("frame-rate-told", "info", message))
    return times, float(rate), notes


def _regular(ticks: FloatArray, step: float, stated: float) -> float | None:
    """Interval near `step` that explains every stamp within its rounding, the stated one first; None without one."""
    candidates = [stated] if abs(stated / step - 1) < 0.02 else []
    number = np.rint(ticks / step)
    if number[-1] > 0:
        candidates.append(float(np.polyfit(number, ticks, 1)[0]))
    for interval in candidates:
        number = np.rint(ticks / interval)
        if np.ptp(ticks - number * interval) <= _ROUNDED and (np.diff(number) >= 1).all():
            return interval
    return None
