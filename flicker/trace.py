"""Trace and Capture: what was recorded, and what is known about it."""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.results import Note

FloatArray = npt.NDArray[np.float64]


def sample_at(moment: float, sample_rate: float, samples: int) -> int:
    """Give the number of the first of `samples` that is not before a moment [s] after the first one."""
    return int(min(max(math.ceil(min(moment * sample_rate - 1e-6, 1e18)), 0), samples))


@dataclass(frozen=True, slots=True)
class Segment:
    """A run of evenly spaced samples: index of its first sample, and that sample's time [s]."""

    first: int
    start: float


@dataclass(frozen=True, slots=True, eq=False)
class Whole:
    """
    A recording too long to be kept, of which a trace holds an excerpt.

    It holds slow light, for what the eye sees, and the extremes of each part, for whether the light stayed the same.
    """

    samples: int  # that were recorded
    duration: float  # [s]
    light: npt.NDArray[np.float32]  # readings up to 80 Hz, shape (m,)
    sample_rate: float  # of `light` [Hz]
    start: float  # time of its first value [s]
    lowest: FloatArray  # reading of each part, shape (p,)
    highest: FloatArray  # shape (p,)
    mean: FloatArray  # shape (p,)
    part: float  # length of each part [s]
    first_part: float  # time at which the first part begins [s]

    def negated(self) -> Whole:
        """Give the same with all readings negated."""
        return dataclasses.replace(self, light=-self.light, lowest=-self.highest, highest=-self.lowest, mean=-self.mean)

    def shifted(self, by: float) -> Whole:
        """Give the same with all readings raised."""
        raised = {name: getattr(self, name) + by for name in ("lowest", "highest", "mean")}
        return dataclasses.replace(self, light=self.light + np.float32(by), **raised)


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """
    Light of one channel against time, evenly sampled, as one sensor saw it.

    `light` holds the readings; the dark level is kept beside them and is taken off by `above_dark`. A capture
    with gaps has several segments: evenly sampled inside, at their own true times, never joined.

    Raises
    ------
    InputError
        If the shape, the sample rate, the exposure or a reading can never be right.
    """

    light: FloatArray  # readings, shape (n,), made read-only
    sample_rate: float  # [Hz]
    name: str = "light"
    unit: str = ""  # of the readings; empty when unknown
    dark_level: float | None = None  # same unit as light; None: not stated, taken as 0
    mean_known: bool = True  # False: AC coupling has lost the mean level
    exposure: float = 0.0  # time each sample averages over; 0 for a photodiode [s]
    segments: tuple[Segment, ...] = (Segment(0, 0.0),)  # at least one, in order of time
    whole: Whole | None = None  # of a recording so long that `light` is an excerpt of it
    notes: tuple[Note, ...] = ()  # doubts found so far
    history: tuple[str, ...] = ()  # what was done so far, oldest first

    def __post_init__(self) -> None:
        light = np.asarray(self.light, dtype=np.float64)
        if light.ndim != 1 or light.size == 0:
            raise InputError(f"a trace needs readings of shape (n,) with n > 0, not {light.shape}")
        if not (math.isfinite(self.sample_rate) and self.sample_rate > 0):
            raise InputError(f"the sample rate must be above 0 Hz, not {self.sample_rate}")
        if not (math.isfinite(self.exposure) and self.exposure >= 0):
            raise InputError(f"the exposure of a sample cannot be {self.exposure} s")
        if self.dark_level is not None and not math.isfinite(self.dark_level):
            raise InputError(f"the dark level must be a number, not {self.dark_level}")
        if not np.isfinite(light.sum()) and not np.isfinite(light).all():
            raise InputError("a trace cannot hold readings that are not finite")
        if light is self.light or light.base is not None:
            light = light.view()
        light.flags.writeable = False
        object.__setattr__(self, "light", light)

    @property
    def samples(self) -> int:
        """Number of readings n."""
        return int(self.light.size)

    @property
    def duration(self) -> float:
        """Recorded time, gaps left out. [s]"""
        return self.samples / self.sample_rate

    @property
    def start(self) -> float:
        """Time of the first reading. [s]"""
        return self.segments[0].start

    @property
    def above_dark(self) -> FloatArray:
        """Readings with the dark level taken off, shape (n,)."""
        return self.light - self.dark_level if self.dark_level else self.light

    def times(self) -> FloatArray:
        """True time of every reading, shape (n,). [s]"""
        times = np.arange(self.samples) / self.sample_rate
        for here, after in zip(self.segments, (*self.segments[1:], None), strict=True):
            part = slice(here.first, after.first if after else None)
            times[part] += here.start - here.first / self.sample_rate
        return times

    def replace(self, *, done: str = "", note: Note | None = None, **changes: Any) -> Trace:
        """Copy with some fields changed, a line added to the history and a note to the notes."""
        changes.setdefault("history", self.history + ((done,) if done else ()))
        changes.setdefault("notes", self.notes + ((note,) if note else ()))
        return dataclasses.replace(self, **changes)


@dataclass(frozen=True, slots=True, eq=False)
class Capture:
    """A file as it came from an instrument or a camera, with the traces read from it, one a channel."""

    traces: tuple[Trace, ...]
    path: Path | None = None
    kind: str = "csv"  # csv, wav or video
    sha256: str | None = None
    details: dict[str, Any] = field(default_factory=dict)  # further keys of the JSON's `capture`

    def __post_init__(self) -> None:
        if not self.traces:
            raise InputError("a capture needs at least one trace")
