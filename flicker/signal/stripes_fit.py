"""Scene and light separated jointly: lines at their true times, harmonics of one frequency, a level for each line."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import scipy.fft

from flicker.light import ComplexArray
from flicker.trace import FloatArray

_BINS = 2048  # of phase
_MOST_HARMONICS = 80
_HIGHEST_TURN = 0.4  # cycles a line that the highest harmonic may have
STANDING = 0.9  # a harmonic whose phases over the frames agree better than this cannot be told from the scene
_GROUPS = 10
_FEWEST_BANDS = 1.2  # in a frame that is to show all phases of the light by itself
_CLEARLY = 4.0  # mean square over its variance from which a change is believed
_BETWEEN = 0.02  # of the strongest harmonic: lines between the harmonics that speak for a lower frequency
_SHARED_NOISE = 1.5  # by how much noise that neighbouring lines share makes errors larger
_WORSE = 1.02  # growth of what is left that undoes a step
_LIT = 0.03  # of the median level: darker lines are left out


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Lines of one channel, and where they lie: shape (t, r), start of each frame [s], number of each line."""

    values: FloatArray
    times: FloatArray  # shape (t,), zero in the middle of the footage
    numbers: FloatArray  # shape (r,), zero in the middle of the frame

    @classmethod
    def of(cls, values: FloatArray, times: FloatArray, origin: float) -> Rows:
        """Take the lit lines; `origin` is the time that counts as zero [s]."""
        level = values.mean(axis=0)
        lit = np.flatnonzero(level > _LIT * np.median(level[level > 0])) if (level > 0).any() else np.arange(level.size)
        numbers = np.arange(values.shape[1]) - (values.shape[1] - 1) / 2
        return cls(np.ascontiguousarray(values[:, lit], dtype=float), times - origin, numbers[lit])

    def phases(self, frequency: float, turns: float) -> FloatArray:
        """Phase of a tone at each line of each frame, shape (t, r). [cycles]"""
        phase = np.add.outer(self.times * frequency, self.numbers * turns)
        phase -= np.floor(phase)
        return np.asarray(phase)


@dataclass(frozen=True, slots=True, eq=False)
class StripeFit:
    """
    A periodic light as the lines show it: `scene * gain * (1 + sum Re(amplitudes exp(2j pi h phase)))`.

    The phase is `frequency * t + turns_per_line * n`, with t from the middle of the footage and n from the middle line.
    """

    frequency: float  # [Hz]
    frequency_error: float  # standard error [Hz]
    turns_per_line: float  # cycles
    turns_error: float  # standard error
    harmonics: FloatArray  # numbers h, shape (k,)
    amplitudes: ComplexArray  # shape (k,)
    errors: FloatArray  # standard error of each real part, shape (k,)
    standing: FloatArray  # how well the phases of each harmonic agree over the frames, 0..1, shape (k,)
    scene: FloatArray  # level of each lit line, shape (r,)
    gain: FloatArray  # of each frame, shape (t,)
    noise: float  # standard deviation of one line about the fit, over its level
    contrast: float  # (max - min) / (max + min) of the bands
    changed: float = 0.0  # largest change of an amplitude that frames coded without others brought

    def wave(self, size: int = _BINS) -> FloatArray:
        """One cycle at phases b / size, shape (size,)."""
        return evaluate(self.harmonics, self.amplitudes, size)


def evaluate(harmonics: FloatArray, amplitudes: ComplexArray, size: int) -> FloatArray:
    """Evaluate `1 + sum Re(amplitudes exp(2j pi h p))` at p = b / size, shape (size,)."""
    spectrum = np.zeros(size // 2 + 1, dtype=complex)
    spectrum[0] = size
    spectrum[harmonics.astype(int)] = amplitudes * (size / 2)
    return np.asarray(scipy.fft.irfft(spectrum, size))


def standing_of(harmonics: FloatArray, frequency: float, times: FloatArray) -> FloatArray:
    """How well the phases of harmonics agree over the frames: 1 where they stand still, shape (k,)."""
    return np.asarray(np.abs(np.exp(2j * np.pi * np.outer(harmonics * frequency, times)).mean(axis=1)))


def harmonic_numbers(turns: float, samples: int, most: int = _MOST_HARMONICS) -> FloatArray:
    """Harmonics that the lines can carry, shape (k,)."""
    carried = int(_HIGHEST_TURN / max(abs(turns), 1e-9))
    return np.arange(1.0, max(1, min(most, carried, samples // 40)) + 1)


def _right(bins: Any, values: FloatArray, harmonics: FloatArray) -> ComplexArray:
    """Right-hand side of the normal equations for weighted values, shape (2 k + 1,)."""
    total = np.bincount(bins, values, minlength=_BINS)
    one_side = scipy.fft.rfft(total)[harmonics.astype(int)] * np.exp(-1j * np.pi * harmonics / _BINS)
    return np.concatenate([one_side[::-1].conj(), [total.sum()], one_side])


def _amplitudes(bins: Any, weights: FloatArray, harmonics: FloatArray, right: ComplexArray) -> ComplexArray:
    """
    Least squares: peak amplitudes of the positive harmonics, shape (k,) or (k, g).

    The normal matrix of harmonics -k..-1, 0, 1..k, with phases in bins, holds moments of the differences of their
    numbers: a Toeplitz matrix. Harmonics left out are held at zero by multipliers.
    """
    highest = int(harmonics[-1]) if harmonics.size else 0
    count = np.bincount(bins, weights, minlength=_BINS)
    moments = scipy.fft.rfft(count)[: 2 * highest + 1] * np.exp(-1j * np.pi * np.arange(2 * highest + 1) / _BINS)
    moments[0] += 1e-9 * float(count.sum())
    wanted = np.concatenate([-harmonics[::-1], [0.0], harmonics]).astype(int) + highest
    unwanted = np.setdiff1d(np.arange(2 * highest + 1), wanted)
    columns = right.reshape(wanted.size, -1)
    whole = np.zeros((2 * highest + 1, columns.shape[1] + unwanted.size), dtype=complex)
    whole[wanted, : columns.shape[1]] = columns
    whole[unwanted, columns.shape[1] + np.arange(unwanted.size)] = 1.0
    from scipy.linalg import solve_toeplitz

    solved = solve_toeplitz(moments, whole)
    found, held = solved[:, : columns.shape[1]], solved[:, columns.shape[1] :]
    if unwanted.size:
        found = found - held @ np.linalg.solve(held[unwanted], found[unwanted])
    return np.asarray(2.0 * found[wanted][harmonics.size + 1 :].reshape(harmonics.size, *right.shape[1:]))


@dataclass(slots=True)
class _Work:
    rows: Rows
    frequency: float
    turns: float
    harmonics: FloatArray
    amplitudes: ComplexArray
    scene: FloatArray
    gain: FloatArray
    free: FloatArray  # share of each harmonic that the scene cannot take up
    damping: float = 1.0  # of the steps: where the scene holds much of the bands, whole steps run away
    least: float = np.inf  # smallest mean square that was left
    kept: ComplexArray | None = None  # the amplitudes that left it

    @classmethod
    def begin(cls, rows: Rows, frequency: float, turns: float, most: int = _MOST_HARMONICS) -> _Work:
        harmonics = harmonic_numbers(turns, rows.values.size, most)
        standing = standing_of(harmonics, frequency, rows.times)
        harmonics, standing = harmonics[standing < STANDING], standing[standing < STANDING]
        scene, gain = rows.values.mean(axis=0), np.ones(len(rows.times))
        nothing = np.zeros(harmonics.size, dtype=complex)
        return cls(rows, frequency, turns, harmonics, nothing, scene, gain, 1 - standing**2)

    def model(self) -> tuple[Any, FloatArray]:
        """Bins of phase and modelled light over its scene, both shape (t, r)."""
        bins = (self.rows.phases(self.frequency, self.turns) * _BINS).astype(np.intp)
        wave = evaluate(self.harmonics, self.amplitudes * np.exp(1j * np.pi * self.harmonics / _BINS), _BINS)
        return bins, wave[bins]

    def relative(self) -> FloatArray:
        """Lines over their scene and gain, shape (t, r)."""
        return np.asarray(self.rows.values / (self.scene * self.gain[:, None]))

    def update(self, *, clock: bool) -> None:
        """One round: the level of each line, the wave, and the frequency with the cycles a line."""
        bins, left, weights = self.weighed()
        lost = float((weights * left**2).mean())
        if self.kept is not None and not lost <= self.least * _WORSE:
            self.amplitudes, self.damping = self.kept, 0.3 * self.damping
            bins, left, weights = self.weighed()
        else:
            self.least, self.kept = lost, self.amplitudes
        right = _right(bins.ravel(), (weights * left).ravel(), self.harmonics)
        step = _amplitudes(bins.ravel(), weights.ravel(), self.harmonics, right)
        self.amplitudes = self.amplitudes + self.damping * step / self.free
        if clock:
            frequency, turns, *_ = self.clock(bins, left, weights)
            self.frequency += frequency
            self.turns += turns

    def weighed(self) -> tuple[Any, FloatArray, FloatArray]:
        """Bins of phase, what the best scene for these amplitudes leaves, and weights, each of shape (t, r)."""
        bins, light = self.model()
        seen = light * self.gain[:, None]
        self.scene = (self.rows.values * seen).sum(axis=0) / (seen**2).sum(axis=0)
        return bins, self.relative() - light, np.broadcast_to(self.scene**2 / np.mean(self.scene**2), light.shape)

    def clock(self, bins: Any, left: FloatArray, weights: FloatArray) -> tuple[float, float, float, float]:
        """Corrections of frequency and of cycles a line by Gauss-Newton, each with its standard error."""
        turned = 2j * np.pi * self.harmonics * self.amplitudes
        slope = evaluate(self.harmonics, turned * np.exp(1j * np.pi * self.harmonics / _BINS), _BINS) - 1.0
        slope = slope[bins]
        by_phase = weights * slope
        along, across = self.rows.times[:, None], self.rows.numbers[None, :]
        strength = by_phase * slope
        pull = by_phase * left
        whole = strength.sum()
        along = along - (strength * along).sum() / whole
        across = across - (strength * across).sum() / whole
        gram = np.array(
            [
                [(strength * along**2).sum(), (strength * along * across).sum()],
                [0.0, (strength * across**2).sum()],
            ]
        )
        gram[1, 0] = gram[0, 1]
        pulls = np.stack([(pull * along).sum(axis=1), (pull * across).sum(axis=1)])  # of each frame
        inverse = np.linalg.pinv(gram)
        step = inverse @ pulls.sum(axis=1)
        # a codec carries errors on from frame to frame: whole runs of frames are what scatters
        runs = np.add.reduceat(pulls, np.unique(np.linspace(0, pulls.shape[1], 11)[:-1].astype(int)), axis=1)
        spread = inverse @ (runs @ runs.T) @ inverse * 6.0
        return float(step[0]), float(step[1]), float(np.sqrt(spread[0, 0])), float(np.sqrt(spread[1, 1]))

    def finish(self) -> StripeFit:
        """Standard errors from groups of frames, and what is left."""
        bins, left, weights = self.weighed()
        if self.kept is not None and not float((weights * left**2).mean()) <= self.least * _WORSE:
            self.amplitudes = self.kept
            bins, left, weights = self.weighed()
        _, _, frequency_error, turns_error = self.clock(bins, left, weights)
        groups = np.array_split(np.arange(len(left)), max(2, min(_GROUPS, len(left) // 3)))
        pull = weights * left
        rights = np.stack([_right(bins[g].ravel(), pull[g].ravel(), self.harmonics) for g in groups], axis=1)
        parts = _amplitudes(bins.ravel(), weights.ravel(), self.harmonics, rights)
        spread = (np.abs(parts) ** 2).sum(axis=1) * len(groups) / (2 * (len(groups) - 1))
        noise = float(np.sqrt((weights * left**2).mean()))
        least = noise * np.sqrt(2.0 / left.size)
        # groups are few: an error is held against those of the harmonics around it
        errors = np.sqrt(np.maximum(spread, _running_median(spread)) + least**2 * 0.25) / np.sqrt(self.free)
        wave = evaluate(self.harmonics, self.amplitudes, _BINS)
        standing = standing_of(harmonic_numbers(self.turns, left.size), self.frequency, self.rows.times)
        return StripeFit(
            self.frequency,
            frequency_error,
            self.turns,
            turns_error,
            self.harmonics,
            self.amplitudes,
            errors,
            standing,
            self.scene,
            self.gain,
            noise,
            _contrast(wave),
        )

    def put_right(self, found: StripeFit, alone: npt.NDArray[np.bool_], always: bool) -> StripeFit:
        """
        Take the amplitudes from the frames that are coded without others, always or where these say something else.

        Frames coded from others keep a faint band only where coding its change was worth the bits.
        """
        bands = abs(self.turns) * np.ptp(self.rows.numbers)
        if alone.all() or not alone.any() or bands < _FEWEST_BANDS or not self.harmonics.size:
            return found
        bins, light = self.model()
        left = (self.relative() - light)[alone]
        weights = np.broadcast_to(self.scene**2 / np.mean(self.scene**2), left.shape)
        bins = bins[alone].ravel()
        right = _right(bins, (weights * left).ravel(), self.harmonics)
        step = _amplitudes(bins, weights.ravel(), self.harmonics, right)
        wave = evaluate(self.harmonics, step * np.exp(1j * np.pi * self.harmonics / _BINS), _BINS) - 1.0
        rest = float(np.sqrt((weights.ravel() * (left.ravel() - wave[bins]) ** 2).mean()))
        errors = np.full(step.shape, _SHARED_NOISE * rest * np.sqrt(2.0 / left.size))
        clear = np.abs(found.amplitudes) > 5 * errors
        if not always and (not clear.any() or np.mean(np.abs(step / errors)[clear] ** 2) < 2 * _CLEARLY):
            return found
        amplitudes = found.amplitudes + step
        return dataclasses.replace(
            found,
            amplitudes=amplitudes,
            errors=errors,
            changed=float(np.abs(step)[clear].max(initial=0.0)),
            contrast=_contrast(evaluate(self.harmonics, amplitudes, _BINS)),
        )


def _contrast(wave: FloatArray) -> float:
    return float((wave.max() - wave.min()) / (wave.max() + wave.min()))


def _running_median(spread: FloatArray) -> FloatArray:
    """Running median over seven harmonics, shape (k,)."""
    from scipy.ndimage import median_filter

    return np.asarray(median_filter(spread, 7, mode="nearest"))


def fit_stripes(rows: Rows, frequency: float, turns: float, *, rounds: int = 6) -> StripeFit:
    """
    Fit harmonics of one frequency to all lines of all frames at once, with a level of its own for every line.

    Parameters
    ----------
    rows : Rows
        Lines at their true times.
    frequency : float
        Start, within a fraction of a cycle over the footage. [Hz]
    turns : float
        Cycles a line to start from; negative for lines counted against the reading.
    rounds : int
        Rounds of alternation after the first coarse ones.

    Returns
    -------
    StripeFit
        The light and the scene. What stands still, and so cannot be told from the scene, is left out.

    Notes
    -----
    Scene and wave are fitted in turn; a step of a harmonic is divided by the share of it that the scene could not
    take up, 1 - D^2 with D the agreement of its phases over the frames, so that the alternation arrives as fast for
    slow bands as for quick ones. Frequency and cycles a line by Gauss-Newton: what the model leaves, regressed on
    the model's own derivative. Their errors come from the scatter of the frames, those of the amplitudes from
    groups of frames, so that noise that neighbouring lines share is counted.
    """
    work = _Work.begin(rows, frequency, turns, most=3)
    for _ in range(4):
        work.update(clock=bool(np.abs(work.amplitudes).max(initial=0.0) > 0))
    return _refined(work, rounds)


def _refined(work: _Work, rounds: int) -> StripeFit:
    full = _Work.begin(work.rows, work.frequency, work.turns)
    kept = np.isin(full.harmonics, work.harmonics)
    full.amplitudes[kept] = work.amplitudes[np.isin(work.harmonics, full.harmonics)]
    full.scene, full.gain = work.scene, work.gain
    for number in range(rounds):
        full.update(clock=number > 0)
    return full.finish()


def shows_between(rows: Rows, fit: StripeFit, divisor: int) -> bool:
    """Whether what a fit leaves holds lines of a whole fraction of its frequency; `rows` are those that were fitted."""
    known = _Work(
        rows, fit.frequency, fit.turns_per_line, fit.harmonics, fit.amplitudes, fit.scene, fit.gain, fit.errors
    )
    left = known.relative() - known.model()[1]
    slower = _Work.begin(rows, fit.frequency / divisor, fit.turns_per_line / divisor)
    bins = (rows.phases(slower.frequency, slower.turns) * _BINS).astype(np.intp).ravel()
    weights = np.broadcast_to(fit.scene**2 / np.mean(fit.scene**2), left.shape)
    right = _right(bins, (weights * left).ravel(), slower.harmonics)
    found = np.abs(_amplitudes(bins, weights.ravel(), slower.harmonics, right) / slower.free)
    least = max(4 * _SHARED_NOISE * fit.noise * np.sqrt(2 / left.size), _BETWEEN * float(np.abs(fit.amplitudes).max()))
    return bool((found[slower.harmonics % divisor != 0] > least).any())


def taken_off(rows: Rows, fit: StripeFit) -> FloatArray:
    """Lines with the bands of a fit to them taken off, but for their mean, shape (t, r)."""
    known = _Work(
        rows, fit.frequency, fit.turns_per_line, fit.harmonics, fit.amplitudes, fit.scene, fit.gain, fit.errors
    )
    return np.asarray(rows.values - fit.scene * fit.gain[:, None] * (known.model()[1] - 1.0))


def fit_wave(
    rows: Rows,
    known: StripeFit,
    *,
    alone: npt.NDArray[np.bool_] | None = None,
    always: bool = False,
    rounds: int = 5,
) -> StripeFit:
    """
    Fit the wave and the scene of another channel, with frequency, cycles a line and gain as known.

    `alone` marks the frames that are coded without others, shape (t,): where they say something else, or `always`,
    the amplitudes are theirs.
    """
    work = _Work.begin(rows, known.frequency, known.turns_per_line)
    work.gain = known.gain
    for _ in range(rounds):
        work.update(clock=False)
    found = work.finish() if alone is None else work.put_right(work.finish(), alone, always)
    return dataclasses.replace(found, frequency_error=known.frequency_error, turns_error=known.turns_error)


def fit_at(
    rows: Rows, frequency: float, turns: float, *, frame_rate: float | None = None, rounds: int = 3
) -> StripeFit:
    """
    Fit the wave of a few lines at a known frequency.

    Parameters
    ----------
    rows : Rows
        Lines at their true times.
    frequency, turns : float
        Of the light. [Hz], [cycles a line]
    frame_rate : float, optional
        Where each frame counts as one sample: harmonics that meet in the alias are left out. [Hz]
    rounds : int
        Rounds of alternation.

    Returns
    -------
    StripeFit
        See `fit_stripes`.
    """
    work = _Work.begin(rows, frequency, turns, most=24)
    if frame_rate is not None:
        apart = 1.5 / float(rows.times[-1] - rows.times[0]) / frame_rate
        kept: list[int] = []
        taken: list[float] = []
        for place, number in enumerate(work.harmonics):
            alias = abs((number * frequency / frame_rate + 0.5) % 1.0 - 0.5)
            if apart < alias < 0.5 - apart and all(abs(alias - other) > apart for other in taken):
                kept.append(place)
                taken.append(alias)
        work.harmonics, work.amplitudes, work.free = work.harmonics[kept], work.amplitudes[kept], work.free[kept]
    for _ in range(rounds):
        work.update(clock=False)
    return work.finish()
