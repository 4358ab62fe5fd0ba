"""Frames as the camera will record them: the light of every line, and that light on a scene."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from flicker.camera.bands import apparent_line_time
from flicker.camera.colour import PRIMARIES
from flicker.camera.exposed import families_of, windows
from flicker.camera.sensor import Camera, unknown
from flicker.errors import InputError
from flicker.light import Light
from flicker.trace import FloatArray

_GREYS = (0.09, 0.18, 0.36, 0.7)  # reflectance of the fields of the plain scene


def shown_channels(light: Light) -> tuple[str, ...]:
    """Channels that make the picture: red, green and blue where the light has them, else the deepest one alone."""
    names = [channel.name for channel in light]
    if set(PRIMARIES) <= set(names):
        return PRIMARIES
    deepest = max(light, key=lambda channel: float(np.sum(np.abs(channel.amplitudes) ** 2)))
    return (deepest.name,)


def need_lines(camera: Camera) -> None:
    """Refuse a camera whose picture cannot be drawn; `InputError` says what is missing."""
    line_time, lines = apparent_line_time(camera)
    if line_time is None:
        raise InputError(unknown("line_time"))
    if lines is None:
        raise InputError(unknown("lines"))


def line_light(
    light: Light,
    camera: Camera,
    exposure: float | Sequence[float],
    *,
    lines: int | None = None,
    frame_starts: npt.ArrayLike = 0.0,
    light_scan: float = 0.0,
) -> FloatArray:
    """
    Light that each line of some frames collects, over its mean.

    Parameters
    ----------
    light, camera, exposure, light_scan
        As in `predict_bands`.
    lines : int or None
        How many lines, spread evenly over the readout; None: those of the camera.
    frame_starts : array_like
        When the first line of each frame starts, shape (t,). [s]

    Returns
    -------
    ndarray
        Shape (t, lines, channels), lines in the order in which they are read, channels as in `shown_channels`.

    Raises
    ------
    InputError
        If the readout time of a rolling shutter is unknown, or the number of lines.
    """
    need_lines(camera)
    line_time, own = apparent_line_time(camera, light_scan)
    line_time, own = line_time or 0.0, own or 1
    lines = lines or own
    seen = windows(exposure, binning=camera.line_binning, line_time=camera.line_time)
    begins = np.atleast_1d(np.asarray(frame_starts, dtype=float))
    times = begins[:, None] + (np.arange(lines) + 0.5) * (line_time * own / lines) - line_time / 2
    names = shown_channels(light)
    result = np.ones((*times.shape, len(names)))
    for number, name in enumerate(names):
        for family in families_of(light[name]):
            blurred = family.blurred(seen)
            for frame, moments in enumerate(times):
                result[frame, :, number] += blurred.at(moments * family.frequency)
    return np.maximum(result, 0.0)


def plain_scene(height: int, width: int, read_direction: str = "down") -> FloatArray:
    """Four even fields from dark to light that the bands cross, shape (height, width, 3)."""
    lying = read_direction in ("left", "right")
    across = height if lying else width
    fields = np.asarray(_GREYS)[np.arange(across) * len(_GREYS) // across]
    scene = fields[:, None, None] if lying else fields[None, :, None]
    return np.array(np.broadcast_to(scene, (height, width, 3)))


def on_scene(scene: FloatArray, lit: FloatArray, read_direction: str) -> FloatArray:
    """
    Put the light of a frame's lines on a scene.

    Parameters
    ----------
    scene : ndarray
        Linear reflectance, shape (height, width, 3).
    lit : ndarray
        Light of as many lines as the scene has along the read direction, shape (lines, 1 or 3).
    read_direction : str
        The way the lines are read.

    Returns
    -------
    ndarray
        Linear light, shape (height, width, 3).
    """
    ordered = lit[::-1] if read_direction in ("up", "left") else lit
    return scene * (ordered[None, :, :] if read_direction in ("left", "right") else ordered[:, None, :])


def encoded(linear: FloatArray, exposure_gain: float = 1.0) -> npt.NDArray[np.uint8]:
    """Code values 0..255 of linear light by the sRGB curve (IEC 61966-2-1), clipped at white, shape as given."""
    light = np.clip(linear * exposure_gain, 0.0, 1.0)
    curve = np.where(light <= 0.0031308, 12.92 * light, 1.055 * light ** (1 / 2.4) - 0.055)
    return np.asarray(np.rint(255 * curve), dtype=np.uint8)


def decoded(code: npt.NDArray[np.uint8]) -> FloatArray:
    """Linear light 0..1 of sRGB code values, shape as given."""
    signal = code / 255.0
    return np.asarray(np.where(signal <= 0.04045, signal / 12.92, ((signal + 0.055) / 1.055) ** 2.4))


def highlights_kept(lit: FloatArray, scene: FloatArray) -> float:
    """Gain, at most 1, that keeps the brightest line on the brightest part of the scene from clipping."""
    return float(min(1.0, 1.0 / max(lit.max() * scene.max(), 1e-9)))
