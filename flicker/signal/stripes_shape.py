"""The light behind blurred harmonics: a rectangular pulse where one fits, else as many harmonics as are left."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import scipy.fft
import scipy.optimize

from flicker.light import ComplexArray
from flicker.signal.stripes_fit import StripeFit
from flicker.trace import FloatArray

BLIND = 0.08  # what the exposure leaves of a harmonic: below this it is blind
FLOOR = 0.003  # of the strongest harmonic: what compression does to every other one, whatever the noise
CHROMA_FLOOR = 0.008  # the same for red and blue, which video codes more coarsely
_FAINT = (0.003, 0.012)  # of the mean: what codecs erase of faint bands in luma, in colour; found on rendered clips
_FAINT_UP_TO = 0.2  # amplitude over the mean at which bands stop being faint
_DUTIES = np.concatenate(
    [np.geomspace(0.004, 0.1, 24, endpoint=False), np.linspace(0.1, 0.9, 41), 1 - np.geomspace(0.1, 0.01, 12)]
)
_PHASES = 1024
_MUCH_WORSE = 4.0  # reduced chi-square above which no rectangle is believed
_GRID = 4096


@dataclass(frozen=True, slots=True, eq=False)
class Harmonics:
    """Harmonics of one channel as the lines show them, with the variance of each complex amplitude."""

    numbers: FloatArray  # shape (k,)
    amplitudes: ComplexArray  # relative to the mean, shape (k,)
    variances: FloatArray  # of the real part, floor included, shape (k,)
    frequency: float  # [Hz]

    @classmethod
    def of(cls, fit: StripeFit, strongest: float, floor: float = FLOOR) -> Harmonics:
        """Take them from a fit; `strongest` is the largest amplitude of any channel."""
        erased = _FAINT[floor > FLOOR] * np.exp(-strongest / _FAINT_UP_TO)
        variances = fit.errors**2 + (floor * strongest) ** 2 + erased**2
        return cls(fit.harmonics, fit.amplitudes, variances, fit.frequency)

    def left_by(self, exposure: float) -> FloatArray:
        """What an exposure [s] leaves of each harmonic, signed, shape (k,)."""
        return np.sinc(self.numbers * self.frequency * exposure)


@dataclass(frozen=True, slots=True)
class PulseShape:
    """
    A rectangular pulse: duty, modulated share B of the mean, phase of its middle; covariance in that order.

    B is (1 - low) D / (low + (1 - low) D): 1 for light that goes out. The harmonics of the light are
    `2 B sinc(h D) exp(-2j pi h middle)`, behind an emitter of decay time tau divided by `1 + 2j pi h f tau`.
    """

    duty: float
    share: float
    middle: float  # [cycles]
    covariance: tuple[tuple[float, ...], ...]
    chi_square: float  # per degree of freedom
    exposure: float  # [s]
    decay: float = 0.0  # [s]
    decay_error: float = 0.0
    duties: tuple[tuple[float, float, float], ...] = ()  # duty, share and probability of all that fit

    @property
    def low_level(self) -> float:
        """Off level over on level."""
        return low_level_of(self.duty, self.share)

    def amplitudes(self, numbers: FloatArray, frequency: float) -> ComplexArray:
        """Harmonics of the light before the exposure, shape (k,)."""
        drive = 2.0 * self.share * np.sinc(numbers * self.duty) * np.exp(-2j * np.pi * numbers * self.middle)
        return np.asarray(drive / (1.0 + 2j * np.pi * numbers * frequency * self.decay))


def low_level_of(duty: float, share: float) -> float:
    """Off level over on level of a pulse of that duty whose modulated share of the mean is `share`."""
    return duty * (1.0 - share) / (share * (1.0 - duty) + duty)


def _coarse(seen: Harmonics, exposure: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Best share, phase and loss (chi-square less that of nothing) for each duty of the grid, each of shape (d,)."""
    left = seen.left_by(exposure)
    weights = 1.0 / seen.variances
    kernels = 2.0 * np.sinc(np.outer(_DUTIES, seen.numbers)) * left
    spectrum = np.zeros((_DUTIES.size, _PHASES // 2 + 1), dtype=complex)
    spectrum[:, seen.numbers.astype(int)] = weights * kernels * seen.amplitudes
    match = scipy.fft.irfft(spectrum, _PHASES, axis=1) * (_PHASES / 2)
    strength = (weights * kernels**2).sum(axis=1)
    phase = match.argmax(axis=1)
    best = match[np.arange(_DUTIES.size), phase]
    share = np.clip(best / np.maximum(strength, 1e-30), 0.0, 1.0)
    return share, phase, strength * share**2 - 2 * best * share


def pulse_loss(seen: Harmonics, exposure: float) -> float:
    """Chi-square of the best pulse less that of no light, on a coarse grid."""
    return float(_coarse(seen, exposure)[2].min())


def fit_pulse(seen: Harmonics, exposure: float) -> PulseShape:
    """
    Fit a rectangular pulse without decay, blurred by an exposure.

    Parameters
    ----------
    seen : Harmonics
        Of one channel, at the start of the exposure.
    exposure : float
        [s]

    Returns
    -------
    PulseShape
        The best pulse, whatever its chi-square; phases refer to the middle of the exposure.
    """
    left = seen.left_by(exposure)
    data = seen.amplitudes
    share, best_phase, loss = _coarse(seen, exposure)
    root = 1.0 / np.sqrt(seen.variances)

    def residual(p: FloatArray) -> FloatArray:
        model = 2.0 * p[1] * np.sinc(seen.numbers * p[0]) * np.exp(-2j * np.pi * seen.numbers * p[2]) * left
        off = (model - data) * root
        return np.concatenate([off.real, off.imag])

    tries = []
    order = np.argsort(loss)
    starts = [order[0]]
    starts += [k for k in order if all(abs(_DUTIES[k] - _DUTIES[s]) > 0.08 for s in starts)][:1]
    for k in starts:
        begin = [_DUTIES[k], max(share[k], 1e-4), -best_phase[k] / _PHASES]
        bounds = ([1e-3, 0.0, -2.0], [0.999, 1.0, 2.0])
        tries.append(
            scipy.optimize.least_squares(residual, np.clip(begin, *bounds), bounds=bounds, x_scale=[0.1, 0.1, 0.1])
        )
    found = min(tries, key=lambda one: one.cost)
    freedom = max(2 * data.size - 3, 1)
    reduced = 2.0 * float(found.cost) / freedom
    covariance = np.linalg.pinv(found.jac.T @ found.jac) * max(reduced, 0.25)
    return PulseShape(
        float(found.x[0]),
        float(found.x[1]),
        float(found.x[2]) % 1.0,
        tuple(tuple(float(c) for c in row) for row in covariance),
        reduced,
        exposure,
        duties=_all_that_fit(seen, exposure, max(reduced, 0.25)),
    )


def _all_that_fit(seen: Harmonics, exposure: float, scale: float) -> tuple[tuple[float, float, float], ...]:
    """Duties and shares that fit nearly as well as the best: few harmonics leave one to trade against the other."""
    share, _, loss = _coarse(seen, exposure)
    probability = np.exp(-0.5 * (loss - loss.min()) / scale) * np.gradient(_DUTIES)
    probability /= probability.sum()
    kept = np.flatnonzero(probability > 1e-3)
    return tuple((float(_DUTIES[k]), float(share[k]), float(probability[k])) for k in kept)


def fit_exposure(seen: Harmonics, longest: float) -> tuple[PulseShape, list[PulseShape]]:
    """
    Fit a pulse and the exposure together.

    Parameters
    ----------
    seen : Harmonics
        Of one channel.
    longest : float
        Longest exposure that can be: one over the frame rate. [s]

    Returns
    -------
    best : PulseShape
        The pulse and exposure that fit best.
    others : list of PulseShape
        Pulses at other exposures that fit within 95 % as well; duty and exposure can trade places.
    """
    turns = np.unique(
        np.concatenate([np.geomspace(0.01, 1.0, 40), np.arange(1.0, min(longest * seen.frequency, 12.0), 0.05)])
    )
    exposures = turns[turns <= longest * seen.frequency] / seen.frequency
    losses = np.array([_coarse(seen, float(exposure))[2].min() for exposure in exposures])
    dips = np.flatnonzero((losses <= np.r_[losses[1:], np.inf]) & (losses <= np.r_[np.inf, losses[:-1]]))
    near = dips[np.argsort(losses[dips])][:3]
    fits = []
    for dip in near:
        lower, upper = exposures[max(dip - 1, 0)], exposures[min(dip + 1, len(exposures) - 1)]
        fits += [fit_pulse(seen, float(exposure)) for exposure in np.linspace(lower, upper, 15)]
    best = min(fits, key=lambda fit: fit.chi_square)
    freedom = max(2 * seen.numbers.size - 4, 1)
    # 95 % of one parameter: chi-square grows by 3.84 times its best reduced value
    allowed = best.chi_square * (1 + 3.84 / freedom) + 1e-9
    return best, [fit for fit in fits if fit.chi_square <= allowed]


def fit_decay(seen: Harmonics, fastest: PulseShape) -> PulseShape:
    """
    Fit the decay time of a channel that is driven like the fastest one.

    Parameters
    ----------
    seen : Harmonics
        Of the slow channel.
    fastest : PulseShape
        Of the fastest channel.

    Returns
    -------
    PulseShape
        The same drive behind an emitter with a decay time; its chi-square says whether that fits.

    Notes
    -----
    One pole divides harmonic h by `1 + 2j pi h f tau`. The exposure is the same for both channels and drops out.
    """
    drive = fastest.amplitudes(seen.numbers, seen.frequency) * seen.left_by(fastest.exposure)
    root = 1.0 / np.sqrt(seen.variances)
    turn = 2j * np.pi * seen.numbers * seen.frequency

    def residual(logarithm: FloatArray) -> FloatArray:
        off = (drive / (1.0 + turn * np.exp(logarithm[0])) - seen.amplitudes) * root
        return np.concatenate([off.real, off.imag])

    decays = np.log(np.geomspace(1e-3, 1e3, 121) / (2 * np.pi * seen.frequency))
    start = min(decays, key=lambda one: float((residual(np.array([one])) ** 2).sum()))
    found = scipy.optimize.least_squares(residual, [start])
    reduced = 2.0 * float(found.cost) / max(2 * seen.numbers.size - 1, 1)
    steep = float((found.jac**2).sum())
    decay = math.exp(float(found.x[0]))
    error = decay * math.sqrt(max(reduced, 1.0) / max(steep, 1e-30))
    return PulseShape(
        fastest.duty,
        fastest.share,
        fastest.middle,
        fastest.covariance,
        reduced,
        fastest.exposure,
        decay,
        error,
        fastest.duties,
    )


def is_rectangle(fit: PulseShape) -> bool:
    """Whether the lines speak for the pulse."""
    return fit.chi_square < _MUCH_WORSE and fit.share > 0


def duty_of(seen: Harmonics, exposure: float) -> tuple[float, float] | None:
    """
    Fit the duty cycle of a pulse that goes out, which even one harmonic tells.

    Parameters
    ----------
    seen : Harmonics
        Of one channel.
    exposure : float
        [s]

    Returns
    -------
    duty, middle : float
        And the phase of the pulse's middle [cycles]; None where the light does not go out.
    """
    left = seen.left_by(exposure)
    middle = -float(np.angle(seen.amplitudes[0] * np.sign(left[0]))) / (2 * np.pi)
    duties = np.linspace(0.005, 0.995, 991)
    turned = np.exp(-2j * np.pi * seen.numbers * middle)
    model = 2.0 * np.sinc(np.outer(duties, seen.numbers)) * left * turned
    losses = (np.abs(model - seen.amplitudes) ** 2 / seen.variances).sum(axis=1)
    best = int(losses.argmin())
    signal = float((np.abs(seen.amplitudes) ** 2 / seen.variances).sum())
    return (float(duties[best]), middle) if losses[best] < max(4.0 * 2 * seen.numbers.size, 1e-2 * signal) else None


@dataclass(frozen=True, slots=True, eq=False)
class FreeShape:
    """Harmonics with the exposure undone; the blind ones, which it left too little of, are named."""

    numbers: FloatArray  # shape (k,)
    amplitudes: ComplexArray  # shape (k,)
    errors: FloatArray  # of the real part, shape (k,)
    blind: FloatArray  # numbers
    blind_bound: float  # largest amplitude that the blind ones may have together


def undo_exposure(seen: Harmonics, exposure: float) -> FreeShape:
    """
    Divide the harmonics by what the exposure left of them, as far up as they stand out of the noise.

    Parameters
    ----------
    seen : Harmonics
        Of one channel, at the start of the exposure.
    exposure : float
        [s]

    Returns
    -------
    FreeShape
        Harmonics of the light about the middle of the exposure.
    """
    left = seen.left_by(exposure)
    blind = np.abs(left) < BLIND
    clear = (np.abs(seen.amplitudes) > 3.0 * np.sqrt(seen.variances)) & ~blind
    highest = float(seen.numbers[clear].max()) if clear.any() else 0.0
    used = (seen.numbers <= highest) & ~blind
    amplitudes = seen.amplitudes[used] / left[used]
    errors = np.sqrt(seen.variances[used]) / np.abs(left[used])
    numbers = seen.numbers[used]
    unseen = np.setdiff1d(np.arange(1.0, highest + 1), numbers)
    bound = 0.0
    for number in unseen:
        beside = np.abs(amplitudes[np.abs(numbers - number) == 1.0])
        bound += float(beside.max()) if beside.size else 0.0
    if numbers.size:  # harmonics above the last one seen, if they fall as those of a cusp do: 1 / h^2
        bound += float(np.abs(amplitudes[-1])) * highest
    return FreeShape(numbers, amplitudes, errors, unseen, bound)


def extremes(numbers: FloatArray, amplitudes: ComplexArray) -> tuple[float, float, FloatArray]:
    """Smallest and largest light of a wave given by its harmonics, and the wave; light below zero is taken as zero."""
    spectrum = np.zeros(_GRID // 2 + 1, dtype=complex)
    spectrum[0] = _GRID
    spectrum[numbers.astype(int)] = amplitudes * (_GRID / 2)
    wave = np.maximum(scipy.fft.irfft(spectrum, _GRID), 0.0)
    return float(wave.min()), float(wave.max()), wave
