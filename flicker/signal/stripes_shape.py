"""The light behind blurred harmonics where it is a rectangular pulse, and the exposure that blurred them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.fft

from flicker.light import ComplexArray
from flicker.signal.stripes_fit import StripeFit
from flicker.trace import FloatArray

_DUTIES = np.concatenate(
    [np.geomspace(0.004, 0.1, 24, endpoint=False), np.linspace(0.1, 0.9, 41), 1 - np.geomspace(0.1, 0.01, 12)]
)
_FINER_DUTIES = np.concatenate(
    [np.geomspace(0.002, 0.05, 30, endpoint=False), np.linspace(0.05, 0.95, 181), 1 - np.geomspace(0.05, 0.002, 31)[1:]]
)
_NEAR = 25.0  # chi-square above the least one up to which a duty cycle is looked at more finely
_MOST_DUTIES = 1000
_FINE, _COARSE = 128, 32  # phases for each cycle of the highest harmonic
_MUCH_WORSE = 4.0  # reduced chi-square above which no rectangle is believed


@dataclass(frozen=True, slots=True, eq=False)
class Harmonics:
    """Harmonics of one channel as the lines show them, with the variance of each complex amplitude."""

    numbers: FloatArray  # shape (k,)
    amplitudes: ComplexArray  # relative to the mean, shape (k,)
    variances: FloatArray  # of the real part, what coding does included, shape (k,)
    frequency: float  # [Hz]
    common: float = 0.0  # relative standard error that all amplitudes share

    @classmethod
    def of(cls, fit: StripeFit, coding: FloatArray | float, common: float = 0.0) -> Harmonics:
        """Take them from a fit; `coding` is the variance that coding leaves."""
        return cls(fit.harmonics, fit.amplitudes, fit.errors**2 + coding, fit.frequency, common)

    @property
    def clear(self) -> npt.NDArray[np.bool_]:
        """Which stand out of their errors, shape (k,)."""
        return np.asarray(np.abs(self.amplitudes) > 3.0 * np.sqrt(self.variances))

    def left_by(self, exposure: float) -> FloatArray:
        """What an exposure [s] leaves of each harmonic, signed, shape (k,)."""
        return np.sinc(self.numbers * self.frequency * exposure)


@dataclass(frozen=True, slots=True, eq=False)
class PulseShape:
    """
    A rectangular pulse: duty, modulated share B of the mean, phase of its middle, and what else fits.

    B is (1 - low) D / (low + (1 - low) D): 1 for light that goes out. The harmonics of the light are
    `2 B sinc(h D) exp(-2j pi h middle)`, behind an emitter of decay time tau divided by `1 + 2j pi h f tau`.
    """

    duty: float
    share: float
    middle: float  # [cycles]
    chi_square: float  # per degree of freedom
    exposure: float  # [s]
    duties: FloatArray  # all that fit, shape (d,)
    shares: FloatArray  # best share for each; above 1 where noise says so, shape (d,)
    share_errors: FloatArray  # standard error for each, shape (d,)
    chances: FloatArray  # probability of each, shape (d,)
    out: FloatArray  # probability for each that the light goes out, shape (d,)
    decay: float = 0.0  # [s]
    decay_errors: tuple[float, float] = (0.0, 0.0)  # standard errors downward and upward [s]

    @property
    def low_level(self) -> float:
        """Off level over on level."""
        return low_level_of(self.duty, self.share)


def low_level_of(duty: float, share: float) -> float:
    """Off level over on level of a pulse of that duty whose modulated share of the mean is `share`."""
    return duty * (1.0 - share) / (share * (1.0 - duty) + duty)


@dataclass(frozen=True, slots=True, eq=False)
class _Profile:
    """Best share and phase for each duty cycle, and the loss: chi-square less that of no light; each of shape (d,)."""

    duties: FloatArray
    shares: FloatArray
    errors: FloatArray
    middles: FloatArray
    losses: FloatArray
    free_losses: FloatArray  # with shares outside 0 to 1 as well

    @classmethod
    def of(cls, seen: Harmonics, exposure: float, duties: FloatArray, fineness: int = _FINE) -> _Profile:
        phases = 1 << int(fineness * seen.numbers.max()).bit_length()
        kernels = 2.0 * np.sinc(np.outer(duties, seen.numbers)) * (seen.left_by(exposure) / seen.variances)
        spectrum = np.zeros((duties.size, phases // 2 + 1), dtype=complex)
        spectrum[:, seen.numbers.astype(int)] = kernels * seen.amplitudes
        match = scipy.fft.irfft(spectrum, phases, axis=1) * (phases / 2)
        strength = np.maximum((kernels**2 * seen.variances).sum(axis=1), 1e-30)
        place, each = match.argmax(axis=1), np.arange(duties.size)
        before, best, after = (match[each, (place + step) % phases] for step in (-1, 0, 1))
        bend = before - 2 * best + after
        offset = np.where(bend < 0, 0.5 * (before - after) / np.where(bend < 0, bend, 1.0), 0.0)
        best = best - 0.25 * (before - after) * offset
        shares = best / strength
        used = np.clip(shares, 0.0, 1.0)
        losses = strength * used**2 - 2 * best * used
        return cls(duties, shares, 1 / np.sqrt(strength), (place + offset) / phases % 1.0, losses, -best * shares)

    def finer(self, seen: Harmonics, exposure: float, scale: float) -> _Profile:
        """Look at the duty cycles that fit nearly as well as the best, eight times as finely."""
        near = self.losses < self.losses.min() + _NEAR * scale
        near |= np.r_[near[1:], False] | np.r_[False, near[:-1]]
        ends = np.flatnonzero(near[:-1] & near[1:])
        if 8 * ends.size > _MOST_DUTIES:  # so many fit that finer steps tell nothing
            return self
        between = [np.linspace(self.duties[k], self.duties[k + 1], 8, endpoint=False) for k in ends]
        return _Profile.of(seen, exposure, np.unique(np.concatenate([*between, self.duties[near]])))


def pulse_loss(seen: Harmonics, exposure: float) -> float:
    """Chi-square of the best pulse less that of no light, on a coarse grid."""
    return float(_Profile.of(seen, exposure, _DUTIES, _COARSE).losses.min())


def fit_pulse(seen: Harmonics, exposure: float, *, rounds: int = 2) -> PulseShape:
    """
    Fit a rectangular pulse without decay, blurred by an exposure.

    Parameters
    ----------
    seen : Harmonics
        At the start of the exposure.
    exposure : float
        [s]
    rounds : int
        How often the duty cycles that fit are looked at more finely.

    Returns
    -------
    PulseShape
        The best pulse, whatever its chi-square; phases refer to the middle of the exposure.

    Notes
    -----
    For each duty cycle the best share is linear and the best phase the peak of a correlation, so that the whole
    range is looked through: few harmonics leave one duty cycle to trade against another, far from it as well.
    """
    profile = _Profile.of(seen, exposure, _FINER_DUTIES)
    nothing = float((np.abs(seen.amplitudes) ** 2 / seen.variances).sum())
    freedom = max(2 * seen.numbers.size - 3, 1)
    for _ in range(rounds):
        profile = profile.finer(seen, exposure, max((profile.losses.min() + nothing) / freedom, 1.0))
    best = int(profile.losses.argmin())
    reduced = max(float(profile.losses[best]) + nothing, 0.0) / freedom
    scale = max(reduced, 1.0)
    errors = np.hypot(profile.errors * np.sqrt(scale), seen.common * np.abs(profile.shares))
    off, on = _evidence(profile, errors, scale)
    width = _widths(profile.duties)
    whole = (off + on) * width
    goes_out = float((off * width).sum() / whole.sum())
    if goes_out > 0.5:
        best = int(off.argmax())
    kept = whole > 1e-5 * whole.sum()
    return PulseShape(
        float(profile.duties[best]),
        1.0 if goes_out > 0.5 else float(np.clip(profile.shares[best], 0.0, 1.0)),
        float(profile.middles[best]),
        reduced,
        exposure,
        profile.duties[kept],
        profile.shares[kept],
        errors[kept],
        whole[kept] / whole[kept].sum(),
        off[kept] / (off + on)[kept],
    )


def _evidence(profile: _Profile, errors: FloatArray, scale: float) -> tuple[FloatArray, FloatArray]:
    """
    Evidence for each duty cycle that the pulse goes out, and that some light is left in the pauses, shape (d,) each.

    Both are held for as likely beforehand (PWM mostly switches off altogether: common practice, no source), and so is
    every share of those that do not go out.
    """
    from scipy.special import ndtr

    fit = np.exp(-0.5 * (profile.free_losses - profile.free_losses.min()) / scale)
    away = (1.0 - profile.shares) / errors
    spread = errors * np.sqrt(2 * np.pi) * (ndtr(away) - ndtr(-profile.shares / errors))
    off = fit * np.exp(-0.5 * np.clip(away, -38.0, 38.0) ** 2)
    return off + 1e-300, fit * spread + 1e-300


def _widths(points: FloatArray) -> FloatArray:
    return np.gradient(points) if points.size > 1 else np.ones(1)


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
    losses = np.array([pulse_loss(seen, float(exposure)) for exposure in exposures])
    dips = np.flatnonzero((losses <= np.r_[losses[1:], np.inf]) & (losses <= np.r_[np.inf, losses[:-1]]))
    near = dips[np.argsort(losses[dips])][:3]
    fits = []
    for dip in near:
        lower, upper = exposures[max(dip - 1, 0)], exposures[min(dip + 1, len(exposures) - 1)]
        fits += [fit_pulse(seen, float(exposure), rounds=1) for exposure in np.linspace(lower, upper, 15)]
    best = min(fits, key=lambda fit: fit.chi_square)
    freedom = max(2 * seen.numbers.size - 4, 1)
    # 95 % of one parameter: chi-square grows by 3.84 times its best reduced value
    allowed = max(best.chi_square, 1.0) * 3.84 / freedom + best.chi_square + 1e-9
    return best, [fit for fit in fits if fit.chi_square <= allowed]


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
