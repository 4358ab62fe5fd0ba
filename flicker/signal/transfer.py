"""Transfer functions of video: light to code values and back, and the luma weights of the colour matrices."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from flicker.errors import InputError
from flicker.trace import FloatArray

TRANSFERS = ("srgb", "bt709", "linear", "hlg", "pq")

# (weight of red, of blue) in luma; green has the rest. ITU-R BT.601-7, BT.709-6, BT.2020-2, SMPTE 240M.
LUMA_WEIGHTS = {
    "bt601": (0.299, 0.114),
    "bt709": (0.2126, 0.0722),
    "bt2020": (0.2627, 0.0593),
    "smpte240m": (0.212, 0.087),
}

_HLG_A = 0.17883277
_HLG_B = 1.0 - 4.0 * _HLG_A
_HLG_C = 0.5 - _HLG_A * math.log(4.0 * _HLG_A)
_PQ_M1, _PQ_M2 = 2610.0 / 16384.0, 2523.0 / 4096.0 * 128.0
_PQ_C1, _PQ_C2, _PQ_C3 = 3424.0 / 4096.0, 2413.0 / 4096.0 * 32.0, 2392.0 / 4096.0 * 32.0


def transfer_gamma(name: str) -> float | None:
    """
    Give the exponent of a transfer that is written as a plain number, None for a named one.

    Raises
    ------
    InputError
        If it is neither a known name nor an exponent between 0.3 and 5.
    """
    if name in TRANSFERS:
        return None
    try:
        gamma = float(name)
    except ValueError:
        gamma = math.nan
    if not 0.3 <= gamma <= 5.0:
        raise InputError(f"'{name}' is no transfer function: give {', '.join(TRANSFERS)} or an exponent such as 2.2")
    return gamma


def to_light(code: npt.ArrayLike, transfer: str) -> FloatArray:
    """
    Turn code values into linear light.

    Parameters
    ----------
    code : array_like
        Non-linear signal, 0 at black and 1 at nominal white, any shape; below 0 it is taken as 0.
    transfer : str
        `srgb`, `bt709`, `linear`, `hlg`, `pq`, or an exponent such as `2.2`.

    Returns
    -------
    FloatArray
        Light, 1 at nominal white (for `pq`: at 10 000 cd/m2), shape as given.

    Notes
    -----
    `bt709` is the inverse of the camera's curve of ITU-R BT.709-6 (the same in BT.601 and BT.2020), `srgb` that of
    IEC 61966-2-1, `hlg` the inverse of the camera's curve and `pq` the display's curve of ITU-R BT.2100-2. `pq`
    video has gone through a rendering that a camera chooses; its light is the display's, not the scene's.
    """
    signal = np.asarray(np.maximum(np.asarray(code, dtype=float), 0.0))
    gamma = transfer_gamma(transfer)
    if gamma is not None:
        return np.asarray(signal**gamma)
    if transfer == "linear":
        return signal
    if transfer == "srgb":
        return np.where(signal <= 0.04045, signal / 12.92, ((signal + 0.055) / 1.055) ** 2.4)
    if transfer == "bt709":
        return np.where(signal < 0.081, signal / 4.5, ((signal + 0.099) / 1.099) ** (1 / 0.45))
    if transfer == "hlg":
        high = (np.exp((np.maximum(signal, 0.5) - _HLG_C) / _HLG_A) + _HLG_B) / 12.0
        return np.where(signal <= 0.5, signal**2 / 3.0, high)
    root = np.minimum(signal, 1.1) ** (1 / _PQ_M2)
    return np.asarray((np.maximum(root - _PQ_C1, 0.0) / (_PQ_C2 - _PQ_C3 * root)) ** (1 / _PQ_M1))


def to_code(light: npt.ArrayLike, transfer: str) -> FloatArray:
    """
    Turn linear light into code values: the inverse of `to_light`.

    Parameters
    ----------
    light : array_like
        Light, 1 at nominal white, any shape; below 0 it is taken as 0.
    transfer : str
        As for `to_light`.

    Returns
    -------
    FloatArray
        Non-linear signal, 0 at black and 1 at nominal white, shape as given.
    """
    linear = np.asarray(np.maximum(np.asarray(light, dtype=float), 0.0))
    gamma = transfer_gamma(transfer)
    if gamma is not None:
        return np.asarray(linear ** (1 / gamma))
    if transfer == "linear":
        return linear
    if transfer == "srgb":
        return np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    if transfer == "bt709":
        return np.where(linear < 0.018, 4.5 * linear, 1.099 * linear**0.45 - 0.099)
    if transfer == "hlg":
        high = _HLG_A * np.log(np.maximum(12.0 * linear - _HLG_B, 1e-12)) + _HLG_C
        return np.where(linear <= 1 / 12, np.sqrt(3.0 * linear), high)
    power = linear**_PQ_M1
    return np.asarray(((_PQ_C1 + _PQ_C2 * power) / (1.0 + _PQ_C3 * power)) ** _PQ_M2)
