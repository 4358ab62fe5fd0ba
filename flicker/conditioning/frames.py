"""What frames of a video do to light: exposure blurs it, and light that is too fast shows as slower light."""

from __future__ import annotations

import numpy as np

from flicker.light import ComplexArray
from flicker.results import Measure, Note
from flicker.signal.stripes_figures import Samples, figures_of
from flicker.signal.stripes_free import shape_of
from flicker.signal.stripes_shape import Harmonics
from flicker.trace import FloatArray

_CODED = 0.008  # relative standard error that levels of 8 bits leave where the picture is even
_LISTED = 7
ALIASING = "aliasing-possible"


def exposure_undone(amplitudes: ComplexArray, error: float, frequency: float, exposure: float) -> dict[str, Measure]:
    r"""
    Figures of the light behind frames that each averaged it over an exposure.

    Parameters
    ----------
    amplitudes : ndarray
        Of the harmonics 1 to k of the frames' light, relative to the mean, shape (k,).
    error : float
        Standard error of the real part of each.
    frequency : float
        Of the light. [Hz]
    exposure : float
        [s]

    Returns
    -------
    dict
        Measures by name; empty where no harmonic is left to read.

    Notes
    -----
    An exposure :math:`T` leaves :math:`\mathrm{sinc}(h f T)` of harmonic h. A rectangular pulse is fitted where one
    explains the harmonics, else each of them is divided by what was left of it.
    """
    numbers = np.arange(1.0, amplitudes.size + 1)
    variances = np.full(amplitudes.size, error**2 + (_CODED * float(np.abs(amplitudes).max(initial=0.0))) ** 2)
    seen = Harmonics(numbers, amplitudes, variances, frequency, _CODED)
    shape = shape_of(seen, exposure)
    return {} if shape is None else figures_of(Samples.of(shape, frequency, seed=3), frequency, 0.0, 0.0, [])


def possible_frequencies(seen: float, frame_rate: float) -> FloatArray:
    """Frequencies that look like `seen` at a frame rate, the lowest first [Hz]: k times the rate plus or minus it."""
    folded = abs((seen / frame_rate + 0.5) % 1.0 - 0.5) * frame_rate
    wholes = np.arange(_LISTED) * frame_rate
    found = np.unique(np.round(np.concatenate([wholes + folded, wholes[1:] - folded]), 9))
    return np.asarray(found[:_LISTED])


def aliasing(seen: float, frame_rate: float) -> Note:
    """Note which frequencies a light may have that is seen at one of them. [Hz]"""
    listed = ", ".join(f"{one:.6g}" for one in possible_frequencies(seen, frame_rate))
    message = (
        f"at {frame_rate:.6g} frames/s lights of {listed} Hz and so on look the same; of all but the slowest the "
        "frames show less than the light's depth, and so they do where the lines of a frame are read one after "
        "another: read the light with flicker stripes, or settle its frequency by a second clip at another rate with "
        "--same-light"
    )
    return Note("aliasing-possible", "warning", message)
