"""Footage: the light that a video holds, line by line or cell by cell, at true times."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.results import Note
from flicker.trace import FloatArray

ReadDirection = Literal["down", "up", "left", "right"]
CHANNELS = ("red", "green", "blue", "all")


@dataclass(frozen=True, slots=True, eq=False)
class Footage:
    """
    Mean light above black of every line of every frame, with the true time of each frame.

    A line is a row of the picture as stored, or a column where the sensor reads sideways; it may be cut into
    several blocks side by side. Frames have gaps between them and are never joined into one even trace.

    Raises
    ------
    InputError
        If the shapes do not belong together.
    """

    light: npt.NDArray[np.float32]  # linear light, nominal white is 1, shape (t, r, b, c)
    channels: tuple[str, ...]  # names of the c channels: `red`, `green`, `blue` and `all`, or `all` alone
    times: FloatArray  # start of each frame, shape (t,), ascending [s]
    frame_rate: float  # mean over the footage [Hz]
    read_direction: ReadDirection = "down"  # lines are numbered as they are read
    weight: FloatArray = field(default_factory=lambda: np.ones((1, 1)))  # usable share of each line, shape (r, b)
    first_line: int = 0  # number of the first line of the region, in the order in which lines are read
    lines_of_frame: int = 0  # lines of the whole picture
    pixels: int = 1  # across a line
    code_step: float = 1 / 219  # one code value of the file, nominal white is 1
    transfer: str = "bt709"
    matrix: str = "bt709"
    full_range: bool = False
    lossless: bool = True
    alone: npt.NDArray[np.bool_] | None = None  # frames that are coded without others, shape (t,); None: all
    path: Path | None = None
    sha256: str | None = None
    notes: tuple[Note, ...] = ()
    history: tuple[str, ...] = ()
    details: dict[str, Any] = field(default_factory=dict)

    def __post_init__(self) -> None:
        if self.light.ndim != 4 or self.light.shape[3] != len(self.channels):
            raise InputError(
                f"footage needs light of shape (t, r, b, c) with its channel names, not {self.light.shape}"
            )
        if self.times.shape != self.light.shape[:1]:
            raise InputError(f"footage needs one time a frame: {self.times.shape} times, {self.light.shape[0]} frames")
        if self.weight.shape != self.light.shape[1:3]:
            object.__setattr__(self, "weight", np.broadcast_to(self.weight, self.light.shape[1:3]).copy())

    @property
    def frames(self) -> int:
        """Number of frames t."""
        return int(self.light.shape[0])

    @property
    def lines(self) -> int:
        """Number of lines r of the region."""
        return int(self.light.shape[1])

    @property
    def duration(self) -> float:
        """Time from the first frame to the end of the last. [s]"""
        return float(self.times[-1] - self.times[0]) + 1.0 / self.frame_rate

    def lines_of(self, channel: str) -> FloatArray:
        """Mean of each line of a channel over its blocks, shape (t, r)."""
        light = self.light[..., self.channels.index(channel)]
        total = self.weight.sum(axis=1)
        share = self.weight / np.where(total > 0, total, 1.0)[:, None]
        return np.asarray(np.einsum("trb,rb->tr", light, share, dtype=float))
