"""Two lights in one video: the bands of each with those of the other taken off."""

from __future__ import annotations

import dataclasses

import numpy as np

from flicker.camera.stripes_found import find_bands, frames_of, rows_of
from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.signal.stripes_fit import StripeFit, fit_wave, taken_off
from flicker.signal.stripes_search import Deviation, search_frequency

_LEAST = 0.004  # amplitude over the mean of a second light
_LEAST_LOSSY = 0.012  # the same where compression makes bands of its own
_SHARE = 0.02  # of the first light's amplitude
_EXPLAINED = 0.3  # share of what is no noise that a second light explains; movement is no tone
_GHOSTS = 5  # lines of the first light whose ghosts, shifted by shares of the frame rate, compression may leave


def tell_apart(footage: Footage, bands: StripeFit, line_time: float | None) -> tuple[Footage, Footage] | None:
    """
    Look for a second light in what the first one leaves.

    Parameters
    ----------
    footage : Footage
        Lines of the video.
    bands : StripeFit
        Of the light that was found first.
    line_time : float or None
        Without it nothing is looked for. [s]

    Returns
    -------
    first, second : Footage
        The video with the other light's bands taken off; None where there is no second light.
    """
    if line_time is None:
        return None
    few = frames_of(footage, first=True)
    rows = rows_of(footage, "all", few)
    if bands.scene.size != rows.numbers.size:
        return None
    rest = taken_off(rows, dataclasses.replace(bands, gain=np.ones(few.size)))
    deviation = Deviation.of(rest, rows.times)
    strongest = float(np.abs(bands.amplitudes).max())
    least = max(_LEAST if footage.lossless else _LEAST_LOSSY, _SHARE * strongest)
    seen = 2 / deviation.lines * np.sqrt((np.abs(deviation.spectrum) ** 2).mean(axis=0).max())
    if seen < least:  # in no frame by itself is there enough for a second light
        return None
    tones = [
        tone for tone in search_frequency(deviation, line_time) if not _of_the_first(tone.frequency, bands, footage)
    ]
    white = 0.5 * float(np.mean(np.diff(rest / rest.mean(axis=0), axis=1) ** 2)) * deviation.cells
    tones = [t for t in tones if t.power * deviation.total > _EXPLAINED * (deviation.total - white)]
    height = np.sqrt(2 * max((tone.power for tone in tones), default=0.0) * deviation.total / deviation.cells)
    if height < least:
        return None
    second = _without(footage, bands, footage.channels, np.arange(footage.frames))
    try:
        others = find_bands(second, line_time)
    except NotMeasurable:
        return None
    if np.abs(others.amplitudes).max() < least or _of_the_first(others.frequency, bands, footage):
        return None
    return _without(footage, others, footage.channels, np.arange(footage.frames)), second


def _of_the_first(frequency: float, bands: StripeFit, footage: Footage) -> bool:
    """Whether a tone is a line of the first light, or the ghost of one that frames coded from others leave."""
    lines = np.arange(1, 41) * bands.frequency
    near = 2.0 / footage.duration
    if (np.abs(lines - frequency) < near).any():
        return True
    if footage.lossless:
        return False
    apart = np.abs(frequency - lines[:_GHOSTS, None]) / footage.frame_rate
    shares = np.array([1, 2, 3, 4, 5])
    return bool((np.abs(apart * shares - np.rint(apart * shares)) / shares * footage.frame_rate < near / 4).any())


def _without(footage: Footage, bands: StripeFit, names: tuple[str, ...], chosen: np.ndarray) -> Footage:
    """Footage of some frames and channels with the bands of a light taken off."""
    light = np.empty((chosen.size, footage.lines, 1, len(names)), np.float32)
    for place, name in enumerate(names):
        light[..., 0, place] = footage.lines_of(name)[chosen]
        rows = rows_of(footage, name, chosen)
        lit = np.rint(rows.numbers + (footage.lines - 1) / 2).astype(int)
        light[:, lit, 0, place] = taken_off(rows, fit_wave(rows, bands))
    return dataclasses.replace(
        footage,
        light=light,
        channels=names,
        times=footage.times[chosen],
        weight=np.ones((footage.lines, 1)),
        alone=None if footage.alone is None else footage.alone[chosen],
    )
