"""First search for a light in the lines of a video: within a frame, between frames, both at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.fft

from flicker.trace import FloatArray

_SEARCHED = 64  # frames that the search looks at
_PEAKS = 8  # candidates within a frame that are looked at between frames
_FINER = 4  # steps of the scan between frames per resolution cell


@dataclass(frozen=True, slots=True)
class Found:
    """A candidate: frequency [Hz], cycles a line, and the share of the variation that it explains."""

    frequency: float
    turns_per_line: float
    power: float


@dataclass(frozen=True, slots=True, eq=False)
class Deviation:
    """Relative deviation of each line from its own mean over the frames, and its spectrum within each frame."""

    spectrum: npt.NDArray[np.complex64]  # shape (t, bins), one bin is 1 / size cycles a line
    size: int
    lines: int
    times: FloatArray  # shape (t,) [s]
    total: float  # sum of squares of the deviation

    @classmethod
    def of(cls, lines: FloatArray, times: FloatArray) -> Deviation:
        """Look at the first frames of lines of shape (t, r); lines without light count as 0."""
        lines, times = lines[:_SEARCHED], times[:_SEARCHED]
        mean = lines.mean(axis=0)
        lit = mean > 0.05 * np.median(mean)
        deviation = np.where(lit, lines / np.where(lit, mean, 1.0) - 1.0, 0.0).astype(np.float32)
        size = 4 * scipy.fft.next_fast_len(lines.shape[1])
        spectrum = scipy.fft.rfft(deviation, size, axis=1)
        return cls(spectrum, size, lines.shape[1], times, float((deviation.astype(float) ** 2).sum()))

    @property
    def cells(self) -> int:
        """Number of lines of all frames."""
        return self.lines * len(self.times)

    def peaks(self) -> list[int]:
        """Bins of the strongest separate peaks within the frames, all frames taken together."""
        power = (np.abs(self.spectrum) ** 2).sum(axis=0)
        apart = 2 * self.size // self.lines
        found: list[int] = []
        for bin_ in np.argsort(power)[::-1]:
            if all(abs(bin_ - other) >= apart for other in found):
                found.append(int(bin_))
                if len(found) == _PEAKS:
                    break
        return found

    def at(self, turns: FloatArray) -> npt.NDArray[np.complex64]:
        """Spectrum at any cycles a line, shape (t, q), between the two nearest bins."""
        position = np.clip(turns * self.size, 0, self.spectrum.shape[1] - 1.001)
        lower = position.astype(int)
        share = (position - lower).astype(np.float32)
        half = 1j * np.pi * (self.lines - 1) / self.size  # phase of one bin about the middle line
        below = self.spectrum[:, lower] * ((1 - share) * np.exp(-half * share))
        return np.asarray(
            below + self.spectrum[:, lower + 1] * (share * np.exp(half * (1 - share))), dtype=np.complex64
        )

    def coherent(self, frequencies: FloatArray, line_time: float) -> FloatArray:
        """Power of a tone that runs through lines and frames at their true times, shape (q,)."""
        seen = self.at(frequencies * line_time)
        turned = np.exp(-2j * np.pi * np.outer(self.times - self.times[0], frequencies)).astype(np.complex64)
        tone = np.abs((seen * turned).sum(axis=0)) ** 2
        return np.asarray(2.0 * tone / (self.lines * len(self.times)) / max(self.total, 1e-30), dtype=float)


def search_frequency(
    deviation: Deviation, line_time: float, *, tolerance: float = 0.0, lowest: float = 0.0
) -> list[Found]:
    """
    Find the tones in lines whose line time is known.

    Parameters
    ----------
    deviation : Deviation
        Of the lines.
    line_time : float
        [s]
    tolerance : float
        Relative uncertainty of the line time.
    lowest : float
        Frequency below which nothing is looked for. [Hz]

    Returns
    -------
    list of Found
        Strongest first; each is one tone at its best frequency.
    """
    span = float(deviation.times[-1] - deviation.times[0]) or deviation.lines * line_time
    step = 1.0 / (_FINER * span)
    cell = 1.0 / (deviation.lines * line_time)
    found: list[Found] = []
    for bin_ in deviation.peaks():
        centre = bin_ / deviation.size / line_time
        reach = cell + tolerance * centre
        frequencies = np.arange(max(centre - reach, lowest, step), centre + reach, step)
        if frequencies.size == 0:
            continue
        power = deviation.coherent(frequencies, line_time)
        best = int(np.argmax(power))
        found.append(Found(float(frequencies[best]), float(frequencies[best] * line_time), float(power[best])))
    return sorted(found, key=lambda one: -one.power)


def search_turns(deviation: Deviation, frame_rate: float) -> list[tuple[float, float, float]]:
    """
    Find the tones in lines whose line time is unknown: cycles a line and, linked to it, cycles a frame.

    Parameters
    ----------
    deviation : Deviation
        Of the lines.
    frame_rate : float
        [Hz]

    Returns
    -------
    list of (turns_per_line, turns_per_frame, power)
        Strongest first; cycles a line lie between 0 and 1/2, cycles a frame between -1/2 and 1/2 and belong to
        lines that are read in the order given; power is the share of the variation explained.
    """
    frames = len(deviation.times)
    turns = np.arange(-_FINER * frames // 2, _FINER * frames // 2 + 1) / (_FINER * frames)
    clock = (deviation.times - deviation.times[0]) * frame_rate
    turned = np.exp(-2j * np.pi * np.outer(turns, clock)).astype(np.complex64)
    found = []
    for bin_ in deviation.peaks():
        near = np.arange(max(bin_ - 4, 1), min(bin_ + 5, deviation.spectrum.shape[1]))
        tone = np.abs(turned @ deviation.spectrum[:, near]) ** 2
        row, column = np.unravel_index(int(np.argmax(tone)), tone.shape)
        power = 2.0 * float(tone[row, column]) / (deviation.lines * frames) / max(deviation.total, 1e-30)
        found.append((float(near[column]) / deviation.size, float(turns[row]), power))
    return sorted(found, key=lambda one: -one[2])
