"""What the coding of a video leaves unsure of faint bands: errors of luma and of colour, carried to the channels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from flicker.light import ComplexArray
from flicker.signal.transfer import LUMA_WEIGHTS, to_code
from flicker.trace import FloatArray

# Standard error of a band's amplitude over what noise and coding do to a pixel, and the wave length in lines below
# which it grows in proportion: found on clips of the exact renderer, H.264, HEVC and MJPEG of many qualities. Colour
# differences are coded more coarsely.
_LUMA, _LUMA_LENGTH = 0.016, 5.0
_COLOUR, _COLOUR_LENGTH = 0.022, 28.0
_LEAST_NOISE = 1.0  # of a pixel: less does not dither [codes]
_ERASED_COLOUR = 0.35  # bands of colour fainter than this may be erased as a whole where nothing dithers them
_CHANGED = 0.3  # share of what frames coded without others put right that stays unsure
_NO_FRAME_ALONE = 3.0  # times the error where no frame was coded without others
_ALIKE = 2e-3  # relative standard error that all amplitudes share: levels and times
_ERASED = 0.5  # share of the error of luma that lowers all harmonics alike
_KEPT = 0.02  # where the codec keeps every code value: what rounding does


@dataclass(frozen=True, slots=True, eq=False)
class Coding:
    """How a video is coded, as far as faint bands suffer from it."""

    matrix: str  # see `flicker.signal.transfer`; `rgb` where the colours themselves are coded
    full_range: bool
    lossless: bool
    levels: FloatArray  # codes of luma that a relative change of the light is worth, of each channel, shape (c,)
    noise: float = _LEAST_NOISE  # of a pixel, what coding does to it included [codes]
    bands_lost: bool = False  # all frames are coded from others

    @staticmethod
    def levels_of(means: FloatArray, transfer: str, *, full_range: bool) -> FloatArray:
        """Codes that a relative change of each mean light is worth, shape (c,); nominal white is 1."""
        means = np.maximum(means, 1e-4)
        slope = (to_code(1.01 * means, transfer) - to_code(0.99 * means, transfer)) / 0.02
        return np.asarray(slope * (255.0 if full_range else 219.0))

    def to_codes(self) -> FloatArray:
        """Matrix from relative amplitudes of red, green and blue to luma and two colour differences in codes."""
        if self.levels.size == 1 or self.matrix == "rgb":
            return np.diag(self.levels)
        red, blue = LUMA_WEIGHTS[self.matrix]
        luma = np.array([red, 1 - red - blue, blue]) * self.levels
        wider = 1.0 if self.full_range else 224 / 219
        differences = [
            wider * (np.eye(3)[place] * self.levels - luma) / (2 * (1 - weight))
            for place, weight in ((2, blue), (0, red))
        ]
        return np.array([luma, *differences])

    @property
    def luma(self) -> float:
        """Codes of luma that a relative change of all channels alike is worth."""
        return float(self.to_codes()[0].sum())

    def common(self, strongest: float, changed: float) -> float:
        """Relative standard error that all amplitudes share; relative amplitude of the strongest, and its change."""
        return float(np.hypot(_ALIKE, _ERASED * self._luma_error(changed) / max(self.luma * strongest, 1e-9)))

    def _luma_error(self, changed: float) -> float:
        if self.lossless:
            return _KEPT
        least = _LUMA * max(self.noise, _LEAST_NOISE)
        return (_NO_FRAME_ALONE if self.bands_lost else 1.0) * max(least, _CHANGED * changed * self.luma)

    def covariances(self, amplitudes: ComplexArray, lengths: FloatArray, changed: float = 0.0) -> FloatArray:
        """
        Covariance that coding leaves between the amplitudes of the channels.

        Parameters
        ----------
        amplitudes : ndarray
            Relative, of each channel, shape (c, k).
        lengths : ndarray
            Wave length of each harmonic, shape (k,). [lines]
        changed : float
            By how much frames coded without others put a relative amplitude right.

        Returns
        -------
        ndarray
            Of the real parts of the relative amplitudes, shape (k, c, c).
        """
        back = np.linalg.inv(self.to_codes())
        luma = self._luma_error(changed)
        errors = np.full((lengths.size, back.shape[0]), luma)
        if not self.lossless:
            errors *= 1 + _LUMA_LENGTH / lengths[:, None]
            if self.matrix != "rgb":
                kept = np.abs(self.to_codes() @ amplitudes)[1:].T
                errors[:, 1:] = luma * _COLOUR / _LUMA * (1 + _COLOUR_LENGTH / lengths[:, None])
                errors[:, 1:] = np.hypot(errors[:, 1:], _ERASED_COLOUR * np.exp(-((kept / _ERASED_COLOUR) ** 2)))
        return np.asarray(np.einsum("ij,kj,lj->kil", back, errors**2, back))
