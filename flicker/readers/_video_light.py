"""Pictures turned into linear light: planes without a detour over RGB pictures, in blocks across each line."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.signal.transfer import LUMA_WEIGHTS, to_light
from flicker.trace import FloatArray

_MOST_BLOCKS = 48
_STEPS = 4096  # entries of the table from code to light between black and white
_HEADROOM = 1.1  # codes above nominal white that the table still knows
_CLIPPED = 0.98

# Value a quarter of a chroma row above the middle of the third of five rows, from their means.
_UPPER = np.array([-0.02379557, 0.16028646, 1.0264974, -0.18867187, 0.02568359], np.float32)


Block = npt.NDArray[np.float32]


def block_count(width: int) -> int:
    """Number of equal blocks that a line of `width` pixels is cut into; a divisor of it if there is a good one."""
    most = min(_MOST_BLOCKS, width)
    return next((m for m in range(most, most // 2, -1) if width % m == 0), most)


@dataclass(slots=True)
class LightMeter:
    """
    Gives the linear light of a frame in blocks across its lines.

    Parameters
    ----------
    region : x, y, width, height
        Part of the picture as stored. [pixels]
    sideways : bool
        Whether the sensor's lines are columns of the picture.
    bits : int
        Of a code value.
    full_range : bool
        Whether codes run from 0 to the highest, not from 16 to 235 (8 bits).
    matrix : str
        See `flicker.signal.transfer`; `rgb` where the planes are the colours themselves.
    colour : bool
        Whether there are red, green and blue beside `all`.
    formats : str
        Pixel format that frames are converted to first, empty for none.
    blocks : int
        Number m of blocks that a line is cut into.
    table : ndarray
        Light at evenly spaced codes.
    chroma : lines, columns
        Of luma for one of chroma.
    """

    region: tuple[int, int, int, int]
    sideways: bool
    bits: int
    full_range: bool
    matrix: str
    colour: bool
    formats: str
    blocks: int
    table: Block
    chroma: tuple[int, int]

    @classmethod
    def of(
        cls,
        frame: Any,
        region: tuple[int, int, int, int] | None,
        sideways: bool,
        transfer: str,
        matrix: str,
    ) -> LightMeter:
        """Look at the first frame; `InputError` if the region does not lie in the picture."""
        x, y, width, height = region or (0, 0, frame.width, frame.height)
        if width < 2 or height < 2 or x < 0 or y < 0 or x + width > frame.width or y + height > frame.height:
            raise InputError(
                f"the region {x},{y},{width},{height} does not lie in the picture of {frame.width} x "
                f"{frame.height} pixels"
            )
        target = _readable_format(frame.format)
        form = frame.format if not target else type(frame.format)(target, frame.width, frame.height)
        luma, *others = [part for part in form.components if not part.is_alpha]
        down, across = (
            (round(frame.height / others[0].height), round(frame.width / others[0].width)) if others else (1, 1)
        )
        x, y, width, height = x // across * across, y // down * down, width // across * across, height // down * down
        steps = np.linspace(0.0, _HEADROOM, _STEPS)
        return cls(
            (x, y, width, height),
            sideways,
            luma.bits,
            int(frame.color_range) == 2 or frame.format.name.startswith("yuvj") or frame.format.is_rgb,
            "rgb" if form.is_rgb else matrix,
            bool(others),
            target,
            block_count(height if sideways else width),
            to_light(steps, transfer).astype(np.float32),
            (down, across),
        )

    @property
    def channels(self) -> tuple[str, ...]:
        """Names of the channels after `add_all`."""
        return ("red", "green", "blue", "all") if self.colour else ("all",)

    @property
    def shape(self) -> tuple[int, int]:
        """Lines r and blocks m across each."""
        _, _, width, height = self.region
        return (width if self.sideways else height), self.blocks

    @property
    def code_step(self) -> float:
        """One code value, where nominal white is 1."""
        return 1.0 / ((255.0 if self.full_range else 219.0) * 2.0 ** (self.bits - 8))

    def light(self, frame: Any) -> Block:
        """Linear light above black of red, green and blue, or of luma alone, shape (c, r, m)."""
        signals = self._signals([self._blocks(plane, part) for part, plane in enumerate(self._planes(frame))])
        light = np.empty((len(signals), *signals[0].shape), np.float32)
        scale = np.float32((_STEPS - 1) / _HEADROOM)
        for number, signal in enumerate(signals):
            signal *= scale
            signal += np.float32(0.5)
            np.clip(signal, 0, _STEPS - 1, out=signal)
            np.take(self.table, signal.astype(np.uint16), out=light[number], mode="clip")
        return light

    def add_all(self, light: FloatArray) -> FloatArray:
        """Add the luminance `all` to red, green and blue on the last axis; light of luma alone is that already."""
        if not self.colour:
            return light
        red, blue = LUMA_WEIGHTS["bt709" if self.matrix == "rgb" else self.matrix]
        weights = np.array([red, 1 - red - blue, blue], light.dtype)
        return np.concatenate([light, (light @ weights)[..., None]], axis=-1)

    def clipped(self, frame: Any) -> npt.NDArray[np.bool_]:
        """Blocks in which more than a hundredth of the pixels stand at the upper end of their range, shape (r, m)."""
        import cv2

        black, span = self._range(0)
        limit = black + _CLIPPED * span
        high = np.zeros(self.shape, np.float32)
        for plane in self._planes(frame)[: 3 if self.matrix == "rgb" else 1]:
            pixels = self._cut(plane, 0)
            if pixels.max() >= limit:
                high = np.maximum(high, self._averaged(cv2.compare(pixels, limit, cv2.CMP_GE)))
        return np.asarray(high > 2.55)

    def _planes(self, frame: Any) -> list[npt.NDArray[Any]]:
        if self.formats:
            frame = frame.reformat(format=self.formats)
        kind = np.uint8 if self.bits <= 8 else np.dtype("<u2")
        planes = []
        for part in frame.format.components:
            if part.is_alpha:
                continue
            plane = frame.planes[part.plane]
            pixels = np.frombuffer(plane, kind).reshape(plane.height, -1)
            planes.append(pixels[: part.height, : part.width])
        return planes if self.colour else planes[:1]

    def _cut(self, plane: npt.NDArray[Any], part: int) -> npt.NDArray[Any]:
        x, y, width, height = self.region
        if part and self.matrix != "rgb":
            down, across = self.chroma
            x, y, width, height = x // across, y // down, width // across, height // down
        pixels = plane[y : y + height, x : x + width]
        if self.sideways:
            import cv2

            pixels = cv2.transpose(np.ascontiguousarray(pixels))
        return pixels

    def _blocks(self, plane: npt.NDArray[Any], part: int) -> Block:
        """Mean code of each block, shape (rows of the plane, m)."""
        return self._averaged(self._cut(plane, part))

    def _averaged(self, pixels: npt.NDArray[Any]) -> Block:
        import cv2

        if pixels.shape[1] < self.blocks:
            return np.asarray(cv2.resize(np.float32(pixels), (self.blocks, pixels.shape[0])))
        share = pixels.shape[1] // self.blocks
        pixels = np.ascontiguousarray(pixels[:, : share * self.blocks])
        sums = cv2.CV_32S if pixels.dtype == np.uint8 else cv2.CV_32F
        total = cv2.reduce(pixels.reshape(-1, share), 1, cv2.REDUCE_SUM, dtype=sums)
        return np.asarray(np.multiply(total.reshape(-1, self.blocks), np.float32(1 / share), dtype=np.float32))

    def _range(self, part: int) -> tuple[float, float]:
        """Code of black (of no colour), and the span up to white."""
        scale = 2 ** (self.bits - 8)
        if self.matrix == "rgb" or part == 0:
            return (0.0, 2.0**self.bits - 1) if self.full_range else (16.0 * scale, 219.0 * scale)
        return 128.0 * scale, (2.0**self.bits - 1 if self.full_range else 224.0 * scale)

    def _signals(self, codes: list[Block]) -> list[Block]:
        """Non-linear red, green and blue (or luma alone), black 0 and white 1, each of shape (r, m)."""
        for part, code in enumerate(codes):
            black, span = self._range(part)
            code -= np.float32(black)
            code *= np.float32(1 / span)
        if self.matrix == "rgb":
            green, blue, red = codes  # the order of the planes of gbrp
            return [red, green, blue]
        if not self.colour:
            return codes
        luma, blueness, redness = codes
        rows = luma.shape[0]
        finer = self.chroma[1 if self.sideways else 0] == 2
        blueness, redness = (_finer(part)[:rows] if finer else part for part in (blueness, redness))
        red_weight, blue_weight = LUMA_WEIGHTS[self.matrix]
        green_weight = 1 - red_weight - blue_weight
        red = luma + np.float32(2 * (1 - red_weight)) * redness
        blue = luma + np.float32(2 * (1 - blue_weight)) * blueness
        return [
            red,
            (luma - np.float32(red_weight) * red - np.float32(blue_weight) * blue) / np.float32(green_weight),
            blue,
        ]


def _finer(chroma: Block) -> Block:
    """Twice as many rows from rows that each hold the mean of two, without losing the fine bands."""
    padded = np.pad(chroma, ((2, 2), (0, 0)), mode="edge")
    rows = chroma.shape[0]
    doubled = np.empty((2 * rows, chroma.shape[1]), np.float32)
    for half, weights in enumerate((_UPPER, _UPPER[::-1])):
        doubled[half::2] = sum(weight * padded[k : k + rows] for k, weight in enumerate(weights))
    return doubled


def _readable_format(form: Any) -> str:
    """Planar format of 8 bits or more to convert to; empty where the planes can be read as they are."""
    planar = form.is_planar or len(form.components) == 1
    depths = {part.bits for part in form.components}
    separate = len({part.plane for part in form.components}) == len(form.components)
    simple = planar and separate and not form.is_big_endian and not form.has_palette and not form.is_bit_stream
    if simple and len(depths) == 1 and min(depths) >= 8 and max(depths) <= 16:
        return ""
    if form.is_rgb or form.has_palette:
        return "gbrp" if max(depths) <= 8 else "gbrp16le"
    return "yuv444p" if max(depths) <= 8 else "yuv444p16le"
