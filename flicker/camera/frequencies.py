"""Which PWM frequencies leave no bands on any of several cameras and exposures."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.camera.rectangle import contrast, worst_contrast
from flicker.camera.sensor import Camera
from flicker.errors import InputError
from flicker.light import Pulse
from flicker.trace import FloatArray

_STEP = 1e-3  # between neighbouring frequencies that are tried, as a share of them
_ROUND = 50.0  # multiples of this are tried as well [Hz]
_DUTIES = 33  # tried over the duty range where light is left in the pauses
_MOST = 50_000  # frequencies tried


@dataclass(frozen=True, slots=True)
class Choice:
    """A PWM frequency [Hz], and the deepest bands it leaves: contrast 0..1, on which camera, at which exposure [s]."""

    frequency: float
    worst_contrast: float
    camera: str
    exposure: float

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form."""
        return {
            "frequency_hz": self.frequency,
            "worst_contrast_percent": 100.0 * self.worst_contrast,
            "worst_camera": self.camera,
            "worst_exposure_s": self.exposure,
        }


@dataclass(frozen=True, slots=True)
class CleanFrequencies:
    """Frequencies that keep a contrast on every camera, best first, and the frequency from which on all do [Hz]."""

    choices: tuple[Choice, ...]
    all_from: float


def clean_frequencies(
    settings: Sequence[tuple[Camera, float]],
    limit: float,
    *,
    duties: tuple[float, float],
    low_level: float = 0.0,
    tolerance: float = 0.0,
    lowest: float = 50.0,
    most: int = 12,
) -> CleanFrequencies:
    """
    Find PWM frequencies whose bands stay below a contrast on every camera and exposure.

    Parameters
    ----------
    settings : sequence of (Camera, exposure)
        What must stay clean; exposures in s.
    limit : float
        Largest band contrast, 0..1.
    duties : (float, float)
        Range of the duty cycle over which the light is dimmed.
    low_level : float
        Off level over on level.
    tolerance : float
        How far the oscillator may be off, as a share of the frequency.
    lowest : float
        Frequency from which on to look. [Hz]
    most : int
        How many to give.

    Returns
    -------
    CleanFrequencies
        The best of each clean stretch: the faintest bands first, of equally faint ones the lowest frequency.

    Raises
    ------
    InputError
        If there is no camera, or a number lies outside its range.

    Notes
    -----
    The contrast is that of an ideal rectangle at the worst frequency within the tolerance, the worst duty cycle
    tried and any phase; an emitter that decays slowly leaves fainter bands. Tried are all frequencies at which an
    exposure holds whole cycles, the places between, and steps of 0.1 %. Once an exposure holds N cycles no duty cycle
    leaves more than 1 / (2 N + 1) (by hand): from some frequency on every one is clean. Where the light goes out in
    the pauses the narrowest pulse leaves the deepest bands; else the whole duty range is tried.
    """
    if not settings:
        raise InputError("no camera: give --camera, with exposures_s in its file or --exposure")
    if not 0 < limit < 1:
        raise InputError(f"a contrast limit lies between 0 and 100 %, not {100 * limit:g} %")
    if not 0 < duties[0] <= duties[1] <= 1:
        raise InputError(f"a duty range runs upward between 0 and 1, not from {duties[0]:g} to {duties[1]:g}")
    exposures = np.array([exposure for _, exposure in settings])
    cycles = math.ceil((1.0 / limit - 1.0) / 2.0 - 1e-9)
    all_from = cycles / float(exposures.min()) / (1.0 - tolerance)
    tried = _tried(exposures, lowest, all_from)
    widths = np.linspace(*duties, _DUTIES) if low_level > 0.0 else np.array(duties[:1])
    at_centre = np.max(
        [contrast(tried * exposure, duty, low_level) for exposure in np.unique(exposures) for duty in widths], axis=0
    )
    found: list[Choice] = []
    stretch: list[Choice] = []
    for frequency, deepest in zip(tried.tolist(), at_centre.tolist(), strict=True):
        choice = _judged(frequency, settings, widths, low_level, tolerance) if deepest <= limit else None
        if choice is not None and choice.worst_contrast <= limit:
            stretch.append(choice)
        elif stretch:
            found.append(min(stretch, key=_merit))
            stretch = []
    if stretch:
        found.append(min(stretch, key=_merit))
    return CleanFrequencies(tuple(sorted(found, key=_merit)[:most]), all_from)


def _merit(choice: Choice) -> tuple[float, float]:
    return round(choice.worst_contrast, 4), choice.frequency


def _tried(exposures: FloatArray, lowest: float, highest: float) -> FloatArray:
    """Frequencies to look at, ascending: whole cycles of each exposure, places between, small and round steps."""
    if highest <= lowest:
        return np.array([lowest])
    count = math.ceil(math.log(highest / lowest) / _STEP) + 1
    wholes = [np.arange(1, math.floor(highest * exposure) + 1) / exposure for exposure in np.unique(exposures)]
    if count + sum(whole.size for whole in wholes) > _MOST:
        raise InputError(
            f"from {lowest:g} Hz to {highest:.4g} Hz there are too many frequencies to try: raise --contrast"
        )
    nulls = np.unique(np.concatenate(wholes))
    between = (nulls[1:] + nulls[:-1]) / 2.0
    steps = np.geomspace(lowest, highest, count)
    rounds = np.arange(math.ceil(lowest / _ROUND), math.floor(highest / _ROUND) + 1) * _ROUND
    tried = np.unique(np.concatenate([nulls, between, steps, rounds]))
    return np.asarray(tried[(tried >= lowest) & (tried <= highest)])


def _judged(
    frequency: float,
    settings: Sequence[tuple[Camera, float]],
    duties: FloatArray,
    low_level: float,
    tolerance: float,
) -> Choice:
    """Find the camera and exposure on which a frequency leaves its deepest bands."""
    deepest = {
        exposure: max(
            worst_contrast(Pulse(frequency, float(duty), low_level), exposure, None, tolerance)
            for duty in _with_kinks(duties, frequency * exposure, tolerance)
        )
        for exposure in {exposure for _, exposure in settings}
    }
    camera, exposure = max(settings, key=lambda setting: deepest[setting[1]])
    return Choice(frequency, deepest[exposure], camera.name, exposure)


def _with_kinks(duties: FloatArray, cycles: float, tolerance: float) -> FloatArray:
    """Add the duty cycles within the range at which the contrast of so many cycles changes its course (by hand)."""
    rests = np.array([cycles * (1 - tolerance), cycles, cycles * (1 + tolerance)]) % 1.0
    kinks = np.concatenate([rests, 1.0 - rests, [0.5]])
    return np.concatenate([duties, kinks[(kinks > duties[0]) & (kinks < duties[-1])]])
