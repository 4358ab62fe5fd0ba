"""Clips whose truth is known: an exact rolling-shutter camera films lights with closed forms."""

from __future__ import annotations

import math
import os
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from fractions import Fraction
from pathlib import Path
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.files import whole_file
from flicker.footage import ReadDirection
from flicker.light import ComplexArray
from flicker.signal.transfer import LUMA_WEIGHTS, to_code
from flicker.trace import FloatArray

_TICKS = 90_000  # time base of the files [1/s]
_TAGS = {  # transfer and matrix as ITU-T H.273 numbers them
    "bt709": 1, "srgb": 13, "linear": 8, "pq": 16, "hlg": 18, "2.2": 4, "2.8": 5,
}  # fmt: skip
_MATRICES = {"bt709": 1, "bt601": 6, "bt2020": 9, "smpte240m": 7}


class PeriodicLight(Protocol):
    """A light of mean 1 whose integral over the phase is known; `flicker.light.Pulse` is one."""

    @property
    def frequency(self) -> float:
        """Repetition rate. [Hz]"""

    def integral(self, phase: npt.ArrayLike) -> FloatArray:
        """Integral over the phase in cycles, any shape; it grows by 1 a cycle."""


@dataclass(frozen=True, slots=True, eq=False)
class HarmonicLight:
    """A light of mean 1 given by its harmonics: `1 + sum Re(amplitudes[h - 1] exp(2j pi h phase))`."""

    frequency: float  # [Hz]
    amplitudes: ComplexArray  # shape (k,)

    def integral(self, phase: npt.ArrayLike) -> FloatArray:
        """Integral over the phase in cycles, any shape; it grows by 1 a cycle."""
        phase = np.asarray(phase, dtype=float)
        total = phase.copy()
        for h, amplitude in enumerate(self.amplitudes, start=1):
            turn = 2j * math.pi * h
            total += (amplitude * (np.exp(turn * phase) - 1.0) / turn).real
        return total


@dataclass(frozen=True, slots=True, eq=False)
class Lit:
    """A part of the scene and the light on it: one light for all colours, or one each for red, green and blue."""

    reflectance: FloatArray  # times the mean light; nominal white is 1; shape (r, w) or (r, w, 3)
    lights: Sequence[PeriodicLight]
    delay: float = 0.0  # [s]


@dataclass(frozen=True, slots=True, eq=False)
class Shot:
    """How a clip is filmed and coded; lines are counted in the order in which they are read."""

    line_time: float  # [s]
    frame_rate: float  # [Hz]
    exposure: float  # [s]
    frames: int
    parts: Sequence[Lit]
    read_direction: ReadDirection = "down"
    times: FloatArray | None = None  # start of each frame where the rate is not constant [s]
    start: float = 0.0  # time of the first line of the first frame [s]
    noise: float = 0.0  # standard deviation of the light at nominal white; it falls with the root of the light
    gain: FloatArray | None = None  # of each frame, as an automatic exposure would set it
    seed: int = 0
    transfer: str = "bt709"
    matrix: str = "bt709"
    full_range: bool = False
    pixel_format: str = "yuv420p"
    tagged: bool = True  # whether the file states its transfer, matrix and range
    rotation: int = 0  # display rotation that the file asks for [degrees]
    options: Mapping[str, str] = field(default_factory=dict)  # of the encoder


def exposed(light: PeriodicLight, times: npt.ArrayLike, exposure: float) -> FloatArray:
    """
    Mean of a light over an exposure that begins at the given times, exactly.

    Parameters
    ----------
    light : PeriodicLight
        Light of mean 1.
    times : array_like
        Begin of each exposure, any shape. [s]
    exposure : float
        [s]

    Returns
    -------
    FloatArray
        Light collected over that of the mean light, shape as `times`.
    """
    begin = np.asarray(times, dtype=float) * light.frequency
    cycles = light.frequency * exposure
    return np.asarray((light.integral(begin + cycles) - light.integral(begin)) / cycles)


def frame_times(shot: Shot) -> FloatArray:
    """Start of every frame, shape (t,). [s]"""
    if shot.times is not None:
        return np.asarray(shot.times, dtype=float)
    return shot.start + np.arange(shot.frames) / shot.frame_rate


def render(shot: Shot) -> Iterator[npt.NDArray[np.float32]]:
    """
    Render the linear light of a shot, frame by frame, in the orientation in which it is stored.

    Yields
    ------
    ndarray
        Light, clipped to 0..1, shape (r, w, 3).
    """
    rng = np.random.default_rng(shot.seed)
    sideways = shot.read_direction in ("left", "right")
    parts = [np.atleast_3d(part.reflectance).astype(np.float32) for part in shot.parts]
    lines = parts[0].shape[1 if sideways else 0]
    order = np.arange(lines)[:: -1 if shot.read_direction in ("up", "left") else 1]
    for number, start in enumerate(frame_times(shot)):
        frame = np.zeros((*parts[0].shape[:2], 3), np.float32)
        for part, reflectance in zip(shot.parts, parts, strict=True):
            times = start - part.delay + order * shot.line_time
            bands = np.stack([exposed(light, times, shot.exposure) for light in part.lights], axis=-1)
            bands = bands.astype(np.float32)
            frame += reflectance * (bands[None, :] if sideways else bands[:, None])
        if shot.gain is not None:
            frame *= np.float32(shot.gain[number])
        if shot.noise:
            frame += rng.standard_normal(frame.shape, np.float32) * np.float32(shot.noise) * np.sqrt(frame)
        yield np.clip(frame, 0.0, 1.0)


def _quantised(signal: FloatArray, low: float, span: float, bits: int) -> npt.NDArray[Any]:
    scale = 2 ** (bits - 8)
    code = np.rint((low + span * signal) * scale)
    return np.asarray(np.clip(code, 0, 2**bits - 1), np.uint8 if bits == 8 else np.uint16)


def _planes(light: npt.NDArray[np.float32], shot: Shot, bits: int, chroma: tuple[int, int] | None) -> list[Any]:
    """Code values of luma and, unless `chroma` is None, of both colour differences."""
    red_weight, blue_weight = LUMA_WEIGHTS[shot.matrix]
    table = to_code(np.linspace(0.0, 1.0, 1 << 16) ** 2, shot.transfer).astype(np.float32)
    rgb = table[np.rint(np.sqrt(light) * 65535).astype(np.intp)]
    red, green, blue = rgb[..., 0], rgb[..., 1], rgb[..., 2]
    luma = red_weight * red + (1 - red_weight - blue_weight) * green + blue_weight * blue
    whole = 255.0 * (1 if bits == 8 else (2**bits - 1) / (255 * 2 ** (bits - 8)))
    planes = [_quantised(luma, *((0.0, whole) if shot.full_range else (16.0, 219.0)), bits)]
    if chroma is None:
        return planes
    down, across = chroma
    height, width = luma.shape[0] // down * down, luma.shape[1] // across * across
    for colour, weight in ((blue, blue_weight), (red, red_weight)):
        difference = (colour - luma) / (2 * (1 - weight))
        blocks = difference[:height, :width].reshape(height // down, down, width // across, across).mean(axis=(1, 3))
        planes.append(_quantised(blocks, 128.0, whole if shot.full_range else 224.0, bits))
    return planes


def _frame_of(light: npt.NDArray[np.float32], shot: Shot) -> Any:
    import av

    height, width = light.shape[:2]
    form = av.VideoFormat(shot.pixel_format, width, height)
    luma, *colour = form.components
    chroma = (height // colour[0].height, width // colour[0].width) if colour else None
    frame = av.VideoFrame(width, height, shot.pixel_format)
    for plane, code in zip(frame.planes, _planes(light, shot, luma.bits, chroma), strict=True):
        padded = np.zeros((plane.height, plane.line_size // code.itemsize), code.dtype)
        padded[:, : code.shape[1]] = code
        plane.update(padded)
    return frame


@contextmanager
def _scheduled_as_before() -> Iterator[None]:
    """Give the process back its scheduling: an encoder for AV1 makes it a real-time one, which starves all others."""
    if not hasattr(os, "sched_getscheduler"):
        yield
        return
    policy, parameters = os.sched_getscheduler(0), os.sched_getparam(0)
    try:
        yield
    finally:
        if os.sched_getscheduler(0) != policy:
            os.sched_setscheduler(0, policy, parameters)


def write_clip(path: str | Path, shot: Shot, codec: str = "libx264") -> None:
    """
    Film a shot into a video file; the suffix names the container.

    Parameters
    ----------
    path : str or Path
        File to write.
    shot : Shot
        What is filmed and how.
    codec : str
        Encoder, such as `libx264`, `libx265`, `libsvtav1`, `mjpeg` or `ffv1`.

    Raises
    ------
    InputError
        If width or height do not fit the pixel format.
    """
    import av

    height, width = shot.parts[0].reflectance.shape[:2]
    if "420" in shot.pixel_format and (height % 2 or width % 2):
        raise InputError(f"a picture of {width} x {height} cannot be coded as {shot.pixel_format}: both must be even")
    stamps = np.rint((frame_times(shot) - frame_times(shot)[0]) * _TICKS).astype(int)
    with _scheduled_as_before(), whole_file(path) as temporary, av.open(str(temporary), "w") as container:
        stream: Any = container.add_stream(codec, rate=Fraction(shot.frame_rate).limit_denominator(100_000))
        stream.width, stream.height, stream.pix_fmt = width, height, shot.pixel_format
        stream.codec_context.time_base = Fraction(1, _TICKS)
        stream.options = dict(shot.options)
        if shot.tagged:
            stream.codec_context.color_range = 2 if shot.full_range else 1
            stream.codec_context.color_trc = _TAGS.get(shot.transfer, 2)
            stream.codec_context.colorspace = _MATRICES[shot.matrix]
            stream.codec_context.color_primaries = {"bt2020": 9}.get(shot.matrix, 1)
        if shot.rotation:
            stream.set_display_rotation(shot.rotation)
        for light, stamp in zip(render(shot), stamps, strict=True):
            frame = _frame_of(light, shot)
            frame.pts, frame.time_base = int(stamp), Fraction(1, _TICKS)
            if shot.tagged:
                frame.color_range = 2 if shot.full_range else 1
                frame.colorspace = _MATRICES[shot.matrix]
            container.mux(stream.encode(frame))
        container.mux(stream.encode(None))
