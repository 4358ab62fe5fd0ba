"""Camera: when each line of each frame collects light."""

from __future__ import annotations

import dataclasses
import math
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flicker.errors import InputError, UnreadableFileError
from flicker.quantities import parse_quantity
from flicker.registry import did_you_mean

SHUTTERS = ("rolling", "global")
READ_DIRECTIONS = ("down", "up", "left", "right")

HOW_TO_LEARN = {
    "line_time": "give --line-time, --line-rate or --readout-time (line_time_s in the camera file); to measure it, "
    "film a light of known frequency and run flicker line-time",
    "lines": "give --lines (lines in the camera file): the rows of the picture, or its columns where a phone was held "
    "upright",
    "frame_rate": "give --frame-rate (frame_rate_hz in the camera file): the rate at which the camera really shoots",
    "exposure": "give --exposure (exposures_s in the camera file): a shutter of A degrees at F frames/s is A/360/F "
    "seconds",
}
_WORDS = {"line_time": "line time", "lines": "number of lines", "frame_rate": "frame rate", "exposure": "exposure"}


def unknown(what: str) -> str:
    """Say that something about the camera is not known, and how to learn it."""
    return f"the camera's {_WORDS[what]} is unknown: {HOW_TO_LEARN[what]}"


@dataclass(frozen=True, slots=True)
class Camera:
    """
    One mode of a camera: how it walks over its lines, and how often.

    Line time and readout time follow from each other once the number of lines is known. Whatever is None is
    unknown: predictions that need it say so, the others are made.

    Raises
    ------
    InputError
        If a value cannot be right, or line time, lines and readout time contradict each other.

    Notes
    -----
    The line time belongs to a mode, not to a model: crop, binning, bit depth and frame rate change it. A mechanical
    curtain is a rolling shutter whose readout time is the travel of the curtain.

    Examples
    --------
    >>> Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0).readout_time
    0.015984
    >>> Camera(lines=1000, readout_time=20e-3).line_time
    2e-05
    """

    lines: int | None = None  # of a frame
    line_time: float | None = None  # from the start of one line to that of the next [s]
    frame_rate: float | None = None  # [Hz]
    shutter: str = "rolling"
    read_direction: str = "down"  # the way the lines are read in the picture as stored
    exposures: tuple[float, ...] = ()  # what can be dialled in [s]
    name: str = ""
    readout_time: float | None = None  # of all lines of a frame [s]
    line_binning: int = 1  # sensor lines, read one after the other, that make one line of the picture

    def __post_init__(self) -> None:
        if self.lines is not None and not (self.lines == int(self.lines) and self.lines >= 1):
            raise InputError(f"a frame has a whole number of lines, at least 1, not {self.lines}")
        if not (self.line_binning == int(self.line_binning) and self.line_binning >= 1):
            raise InputError(f"a whole number of sensor lines makes one line, at least 1, not {self.line_binning}")
        for value, what, unit in (
            (self.line_time, "line time", " s"),
            (self.readout_time, "readout time", " s"),
            (self.frame_rate, "frame rate", " Hz"),
            *((exposure, "exposure", " s") for exposure in self.exposures),
        ):
            if value is not None and not (math.isfinite(value) and value > 0):
                raise InputError(f"a camera's {what} must be above 0, not {value}{unit}")
        if self.shutter not in SHUTTERS:
            raise InputError(did_you_mean("shutter", self.shutter, list(SHUTTERS)))
        if self.read_direction not in READ_DIRECTIONS:
            raise InputError(did_you_mean("read direction", self.read_direction, list(READ_DIRECTIONS)))
        object.__setattr__(self, "exposures", tuple(float(exposure) for exposure in self.exposures))
        self._settle_times()

    def _settle_times(self) -> None:
        if self.lines is None:
            return
        if self.line_time is None and self.readout_time is not None:
            object.__setattr__(self, "line_time", self.readout_time / self.lines)
        elif self.line_time is not None:
            readout = self.lines * self.line_time
            if self.readout_time is not None and abs(self.readout_time / readout - 1) > 1e-3:
                raise InputError(
                    f"{self.lines} lines of {self.line_time:g} s take {readout:g} s, not the readout time of "
                    f"{self.readout_time:g} s: leave one of the three out"
                )
            object.__setattr__(self, "readout_time", readout)

    def changed(self, **values: Any) -> Camera:
        """
        Give the same camera with other values; a new line time or readout time replaces both.

        `line_rate` [lines/s] may be given in place of `line_time`; values of None change nothing.
        """
        values = {name: value for name, value in values.items() if value is not None}
        times = [name for name in ("line_time", "line_rate", "readout_time") if name in values]
        if len(times) > 1:
            raise InputError(f"give one of line time, line rate and readout time, not {len(times)}")
        if "line_rate" in values:
            rate = values.pop("line_rate")
            if not (math.isfinite(rate) and rate > 0):
                raise InputError(f"a camera's line rate must be above 0, not {rate} lines/s")
            values["line_time"] = 1.0 / rate
        if times:
            values = {"line_time": None, "readout_time": None, **values}
        elif "lines" in values and self.line_time is not None:
            values["readout_time"] = None
        return dataclasses.replace(self, **values)

    @classmethod
    def load(cls, path: str | Path) -> Camera:
        """
        Read a camera file.

        Raises
        ------
        UnreadableFileError
            If there is no such file, or it is no TOML.
        InputError
            If a key is unknown or a value cannot be right; the text names file and key.
        """
        return camera_from(read_toml(path, "camera file"), where=Path(path).name)

    def to_dict(self) -> dict[str, Any]:
        """Give what was used, as JSON with the keys of a camera file."""
        return {
            "name": self.name,
            "lines": self.lines,
            "line_time_s": self.line_time,
            "readout_time_s": self.readout_time,
            "frame_rate_hz": self.frame_rate,
            "shutter": self.shutter,
            "read_direction": self.read_direction,
            "line_binning": self.line_binning,
            "exposures_s": list(self.exposures),
        }


def read_toml(path: str | Path, what: str) -> dict[str, Any]:
    """Read a TOML file; `UnreadableFileError` says why it could not be had."""
    path = Path(path)
    try:
        with path.open("rb") as file:
            return tomllib.load(file)
    except OSError as error:
        raise UnreadableFileError(f"{path}: no {what} can be read there: {error.strerror or error}") from error
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise UnreadableFileError(f"{path}: is no {what} in TOML: {error}") from error


_KEYS: dict[str, tuple[str, str]] = {
    "name": ("name", "text"),
    "lines": ("lines", "count"),
    "line_time_s": ("line_time", "time"),
    "line_rate_hz": ("line_rate", "frequency"),
    "readout_time_s": ("readout_time", "time"),
    "frame_rate_hz": ("frame_rate", "frequency"),
    "shutter": ("shutter", "text"),
    "read_direction": ("read_direction", "text"),
    "line_binning": ("line_binning", "count"),
    "exposures_s": ("exposures", "times"),
}


def camera_from(table: Mapping[str, Any], *, where: str) -> Camera:
    """Make a camera of the keys of a camera file; `InputError` begins with `where`."""
    values: dict[str, Any] = {}
    for key, value in table.items():
        if key not in _KEYS:
            raise InputError(f"{where}: {did_you_mean('key of a camera', key, list(_KEYS))}")
        name, kind = _KEYS[key]
        values[name] = typed(value, kind, key, where)
    try:
        return Camera().changed(**values)
    except InputError as error:
        raise InputError(f"{where}: {error}") from None


def typed(value: Any, kind: str, key: str, where: str) -> Any:
    """Read a value of a TOML table as text, count, time, frequency, number, or a list of times or frequencies."""
    plural = {"times": "time", "frequencies": "frequency"}
    if kind in plural:
        if not isinstance(value, list) or not value:
            example = '["1/48", "1/50"]' if kind == "times" else "[24.0, 25.0]"
            raise InputError(f"{where}: {key} must be a list, such as {example}")
        return tuple(typed(one, plural[kind], key, where) for one in value)
    wanted = {
        "text": str,
        "count": int,
        "number": (int, float),
        "time": (int, float, str),
        "frequency": (int, float, str),
    }
    if not isinstance(value, wanted[kind]) or isinstance(value, bool):  # type: ignore[arg-type]
        raise InputError(f"{where}: {key} = {value!r} is no {kind}")
    try:
        return parse_quantity(value, kind) if kind in ("time", "frequency") else value
    except InputError as error:
        raise InputError(f"{where}: {key}: {error}") from None
