"""Families that one light paints beside another: sums and differences of two frequencies, in words."""

from __future__ import annotations

import math
from collections.abc import Sequence

_HIGHEST = 5  # multiple of either parent that is looked for
_CLOSE = 3.0  # standard errors by which a sum may miss
_BLUR = 1e-5  # relative, where no error is known


def sideband_words(
    frequency: float, parents: Sequence[float], error: float = 0.0, parent_errors: Sequence[float] = ()
) -> str:
    """
    Say of which two lights a line is a sideband.

    Parameters
    ----------
    frequency : float
        Of the line or the family. [Hz]
    parents : sequence of float
        Fundamentals of the deeper families, deepest first. [Hz]
    error, parent_errors : float, sequence of float
        Their standard errors; 0 where not known. [Hz]

    Returns
    -------
    str
        `sideband of 240 Hz by 100 Hz`, or empty where no pair explains it.

    Notes
    -----
    A light of frequency :math:`f` whose height follows another of frequency :math:`g` shows lines at
    :math:`n f \\pm m g` (product of two Fourier series). Multiples up to five are looked for, and the pair with the
    smallest :math:`n + m` is named; the carrier is the faster of the two. With many parents and large errors some pair
    fits by chance, so that a line is only called a sideband where the fit is as close as the errors say.
    """
    errors = tuple(parent_errors) or (0.0,) * len(parents)
    best: tuple[int, str] | None = None
    for carrier, carrier_error in zip(parents, errors, strict=True):
        for modulator, modulator_error in zip(parents, errors, strict=True):
            if not modulator < carrier:
                continue
            for n in range(1, _HIGHEST + 1):
                for m in range(1, _HIGHEST + 1):
                    allowed = math.hypot(error, n * carrier_error, m * modulator_error)
                    allowed = _CLOSE * allowed + _BLUR * frequency
                    off = min(abs(abs(n * carrier + sign * m * modulator) - frequency) for sign in (-1, 1))
                    if off <= allowed and (best is None or n + m < best[0]):
                        best = (n + m, f"sideband of {n * carrier:.4g} Hz by {m * modulator:.4g} Hz")
    return best[1] if best else ""
