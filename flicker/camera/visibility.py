"""Whether an eye sees the bands: contrast threshold of human vision, and plain words for a contrast."""

from __future__ import annotations

import math

import numpy as np

from flicker.errors import InputError

LUMINANCE = 100.0  # of the picture on a screen [cd/m2]
FLICKER_THRESHOLD = 0.005  # of a whole field at the eye's most sensitive rate, about 10 Hz
WORDS = ("invisible", "faint", "obvious", "unusable")
_FAINT_ENDS, _OBVIOUS_ENDS = 0.03, 0.10  # common practice, no source


def threshold(spatial_frequency: float, field: float = 30.0, luminance: float = LUMINANCE) -> float:
    r"""
    Contrast at which half of the looks find a grating.

    Parameters
    ----------
    spatial_frequency : float
        Cycles per degree of visual angle, above 0.
    field : float
        Width of the square field that the grating fills. [degrees]
    luminance : float
        Mean luminance. [cd/m2]

    Returns
    -------
    float
        Michelson contrast.

    Notes
    -----
    Model of the spatial contrast sensitivity for binocular vision of P. G. J. Barten, Contrast Sensitivity of the
    Human Eye and Its Effects on Image Quality, SPIE Press 1999, with the constants given there for a typical eye
    (from memory). A real picture hides more than the even field of the model, and a moving band is seen earlier
    than a still one.

    Examples
    --------
    >>> round(100 * threshold(2.5), 2)
    0.14
    """
    pupil = 5.0 - 3.0 * math.tanh(0.4 * math.log10(luminance * field**2 / 40.0**2))  # [mm]
    illuminance = math.pi * pupil**2 / 4 * luminance * (1 - (pupil / 9.7) ** 2 + (pupil / 12.4) ** 4)  # [td]
    spread = math.hypot(0.5, 0.08 * pupil) / 60.0  # of the eye's optics [degrees]
    optics = math.exp(-2 * (math.pi * spread * spatial_frequency) ** 2)
    integration = 2 / 0.1 * (1 / field**2 + 1 / 12.0**2 + (spatial_frequency / 15.0) ** 2)
    photons = 1 / (0.03 * 1.2e6 * illuminance)
    neural = 3e-8 / -math.expm1(-((spatial_frequency / 7.0) ** 2))
    return 3.0 / optics * math.sqrt(integration * (photons + neural))


def band_threshold(bands: float | None, viewing_distance: float | None = None) -> float:
    """
    Contrast from which bands are seen.

    Parameters
    ----------
    bands : float or None
        Bands in the height of the picture.
    viewing_distance : float or None
        In picture heights. None: the distance from which an eye sees these bands best, which is the strictest.
    """
    if viewing_distance is not None and not viewing_distance > 0:
        raise InputError(f"a viewing distance must be above 0 picture heights, not {viewing_distance}")
    if bands is None or viewing_distance is None:
        return min(threshold(float(frequency)) for frequency in np.geomspace(0.5, 8.0, 33))
    height = 2 * math.degrees(math.atan(0.5 / viewing_distance))
    return min(1.0, threshold(max(bands, 1.0) / height, height))


def in_words(contrast: float, limit: float) -> str:
    """Call a contrast invisible (below `limit`), faint (below 3 %), obvious (below 10 %) or unusable."""
    if contrast < limit:
        return WORDS[0]
    return WORDS[1] if contrast < _FAINT_ENDS else WORDS[2] if contrast < _OBVIOUS_ENDS else WORDS[3]
