"""A clip that rolls as the real one will, and never flashes faster than is held safe."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from flicker.camera.filmed import decoded, encoded, highlights_kept, line_light, on_scene, plain_scene
from flicker.camera.sensor import unknown
from flicker.errors import InputError, UnreadableFileError
from flicker.files import whole_file

if TYPE_CHECKING:
    from flicker.camera.answer import Answer
    from flicker.trace import FloatArray

_HEIGHT, _WIDTH = 360, 480
_LONGEST, _FRAMES_MOST = 6.0, 240  # [s], frames
_FLASH = 0.10  # of the brightest possible light: opposing changes of at least this are a flash ...
_DARK_ENOUGH = 0.80  # ... if its darker side is below this
_FLASHES_ALLOWED = 3  # in any second, over a quarter of the picture
_AREA = 0.25
_LUMINANCE = np.array([0.2126, 0.7152, 0.0722])  # of red, green, blue: ITU-R BT.709
_SUFFIXES = (".mp4", ".gif")


@dataclass(frozen=True, slots=True)
class Clip:
    """What was written: the file, and how much slower than life it plays (1: as the camera records)."""

    path: Path
    slowed: float
    duration: float  # [s]


def read_scene(path: str | Path) -> FloatArray:
    """Read a still as linear light, shape (height, width, 3), at most 1280 wide; `UnreadableFileError` if none."""
    import cv2

    path = Path(path)
    try:
        data = np.frombuffer(path.read_bytes(), dtype=np.uint8)
    except OSError as error:
        raise UnreadableFileError(f"{path}: no picture can be read there: {error.strerror or error}") from error
    image = cv2.imdecode(data, cv2.IMREAD_COLOR) if data.size else None
    if image is None:
        raise UnreadableFileError(f"{path}: is no picture that can be read: give a PNG or a JPEG")
    height, width = image.shape[:2]
    if width > 1280:
        image = cv2.resize(image, (1280, max(2, round(height * 1280 / width))), interpolation=cv2.INTER_AREA)
    return decoded(np.asarray(image[:, :, ::-1]))


def flashes(luminance: FloatArray, frame_rate: float) -> float:
    """
    Largest number of flashes within a second that a quarter of the picture reaches.

    Parameters
    ----------
    luminance : ndarray
        Of the picture's rows in each frame, 1 the brightest that can be shown, shape (t, r).
    frame_rate : float
        At which the frames are shown. [Hz]

    Notes
    -----
    A flash is a pair of opposing changes of at least 10 % of the largest luminance whose darker side lies below 80 %;
    three a second over a quarter of the picture are the most that is allowed (WCAG 2.2, general flash threshold, from
    memory; without its allowance for small pictures).
    """
    return _most_in_a_second(_changes(luminance), frame_rate)


def _changes(luminance: FloatArray) -> npt.NDArray[np.bool_]:
    """Mark where a row completes a change that counts, opposite to the one before; shape (t, r)."""
    marks = np.zeros(luminance.shape, dtype=bool)
    high, low = luminance[0].copy(), luminance[0].copy()
    falls_next = np.ones(high.size, dtype=bool)
    rises_next = np.ones(high.size, dtype=bool)
    for mark, now in zip(marks, luminance, strict=True):
        high, low = np.maximum(high, now), np.minimum(low, now)
        falls = falls_next & (high - now >= _FLASH) & (now < _DARK_ENOUGH)
        rises = rises_next & ~falls & (now - low >= _FLASH) & (low < _DARK_ENOUGH)
        mark[:] = falls | rises
        high, low = np.where(rises, now, high), np.where(falls, now, low)
        falls_next, rises_next = (falls_next & ~falls) | rises, (rises_next & ~rises) | falls
    return marks


def _most_in_a_second(marks: npt.NDArray[np.bool_], frame_rate: float) -> float:
    """Flashes, which are pairs of changes, that at least a quarter of the rows see within some second."""
    window = max(1, math.ceil(frame_rate))
    sums = np.cumsum(np.pad(marks, ((1, 0), (0, 0))), axis=0)
    last = np.arange(1, len(marks) + 1)
    inside = (sums[last] - sums[np.maximum(last - window, 0)]) / 2.0
    return float(np.sort(inside, axis=1)[:, ::-1][:, int(_AREA * marks.shape[1])].max())


def write_clip(answer: Answer, path: str | Path, number: int = 0, scene: FloatArray | None = None) -> Clip:
    """
    Write a clip of prediction `number` as MP4 or GIF, slowed down as far as its flashing makes it necessary.

    Raises
    ------
    InputError
        If the suffix is another, or frame rate, lines or line time are unknown.
    UnreadableFileError
        If the file cannot be written.
    """
    path = Path(path)
    if path.suffix.lower() not in _SUFFIXES:
        raise InputError(f"{path.name}: a clip is written as .mp4 or .gif")
    rate = answer.camera.frame_rate
    if rate is None:
        raise InputError(unknown("frame_rate"))
    scene = _even(plain_scene(_HEIGHT, _WIDTH, answer.camera.read_direction) if scene is None else scene)
    frames = min(_FRAMES_MOST, math.ceil(_LONGEST * rate))
    sideways = answer.camera.read_direction in ("left", "right")
    lit = line_light(
        answer.light,
        answer.camera,
        answer.predictions[number].exposure_s,
        lines=scene.shape[1 if sideways else 0],
        frame_starts=np.arange(frames) / rate,
        light_scan=answer.light_scan,
    )
    gain = highlights_kept(lit, scene)
    slowed = _slowing(lit * gain * float(scene.max()), rate)
    shown_rate = Fraction(rate / slowed).limit_denominator(1001)
    frames = max(2, min(frames, math.ceil(_LONGEST * float(shown_rate))))
    pictures = (encoded(on_scene(scene, one, answer.camera.read_direction), gain) for one in lit[:frames])
    with whole_file(path) as temporary:
        (_write_gif if path.suffix.lower() == ".gif" else _write_mp4)(temporary, pictures, shown_rate, scene.shape)
    return Clip(path, slowed, frames / float(shown_rate))


def _slowing(lit: FloatArray, rate: float) -> float:
    """By how much the clip must play slower so that it stays within the flashes allowed."""
    weights = _LUMINANCE if lit.shape[2] == 3 else np.ones(1)
    marks = _changes(np.clip(lit, 0.0, 1.0) @ weights)
    slowed = 1.0
    while _most_in_a_second(marks, rate / slowed) > _FLASHES_ALLOWED:
        slowed *= 1.25
    return slowed


def _even(scene: FloatArray) -> FloatArray:
    """Cut a scene to even height and width, as the encoder needs."""
    height, width = scene.shape[:2]
    if height < 2 or width < 2:
        raise InputError(f"a scene of {width} x {height} pixels is too small")
    return scene[: height // 2 * 2, : width // 2 * 2]


def _write_mp4(path: Path, pictures: Iterator[npt.NDArray[np.uint8]], rate: Fraction, shape: tuple[int, ...]) -> None:
    import av

    with av.open(str(path), "w", format="mp4") as container:
        stream: Any = container.add_stream("libx264", rate=rate)
        stream.height, stream.width, stream.pix_fmt = shape[0], shape[1], "yuv420p"
        stream.options = {"crf": "14", "preset": "fast"}
        for picture in pictures:
            container.mux(stream.encode(av.VideoFrame.from_ndarray(np.ascontiguousarray(picture), format="rgb24")))
        container.mux(stream.encode(None))


def _write_gif(path: Path, pictures: Iterator[npt.NDArray[np.uint8]], rate: Fraction, shape: tuple[int, ...]) -> None:
    import av

    graph = av.filter.Graph()
    source: Any = graph.add_buffer(width=shape[1], height=shape[0], format=av.VideoFormat("rgb24"), time_base=1 / rate)
    split, palette, use, sink = (graph.add(name) for name in ("split", "palettegen", "paletteuse", "buffersink"))
    source.link_to(split)
    split.link_to(use, 0, 0)
    split.link_to(palette, 1, 0)
    palette.link_to(use, 0, 1)
    use.link_to(sink)
    graph.configure()
    with av.open(str(path), "w", format="gif") as container:
        stream: Any = container.add_stream("gif", rate=rate)
        stream.height, stream.width, stream.pix_fmt = shape[0], shape[1], "pal8"
        for number, picture in enumerate(pictures):
            frame = av.VideoFrame.from_ndarray(np.ascontiguousarray(picture), format="rgb24")
            frame.pts, frame.time_base = number, 1 / rate
            source.push(frame)
        source.push(None)
        while True:
            try:
                frame = sink.pull()
            except (av.error.BlockingIOError, av.error.EOFError):
                break
            container.mux(stream.encode(frame))
        container.mux(stream.encode(None))
