"""One drive behind the emitters of several colours: which channels share it, and how far each lags."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flicker.light import ComplexArray
from flicker.signal.stripes_shape import Harmonics
from flicker.trace import FloatArray

_LEAST_LAG = 0.2  # of the fundamental, below which no decay is told [rad]
_BETTER = 9.0  # by how much a decay must lower the chi-square
_SAME = 2.5  # reduced chi-square up to which two channels share their drive
_INTERVAL = 3.84  # growth of the chi-square at the ends of a 95 % interval
_GREEN_UNLESS = 0.85  # of the strongest channel: green is best known, and taken as the fastest above this


@dataclass(frozen=True, slots=True)
class Lag:
    """A decay time and its standard errors downward and upward. [s]"""

    decay: float = 0.0
    down: float = 0.0
    up: float = 0.0  # infinite where all that can be said is that the channel lags

    @property
    def known(self) -> bool:
        """Whether the lag has an upper end."""
        return bool(np.isfinite(self.up))

    def of(self, turns: FloatArray) -> ComplexArray:
        """Response of the emitter to harmonics at `turns` = frequency times number, shape (k,)."""
        return np.asarray(1.0 / (1.0 + 2j * np.pi * turns * self.decay))


@dataclass(frozen=True, slots=True, eq=False)
class Drive:
    """Harmonics of a drive that several channels share, and the lag of each of these."""

    seen: Harmonics
    lags: dict[str, Lag]


def common_drive(
    names: Sequence[str],
    amplitudes: ComplexArray,
    covariances: FloatArray,
    numbers: FloatArray,
    frequency: float,
    common: float,
) -> Drive:
    """
    Find the channels that are driven like the fastest one, and what they say of the drive together.

    Parameters
    ----------
    names : sequence of str
        Of the c channels.
    amplitudes : ndarray
        Relative to the mean, shape (c, k).
    covariances : ndarray
        Between the channels, of the real parts, shape (k, c, c).
    numbers : ndarray
        Of the harmonics, shape (k,).
    frequency : float
        [Hz]
    common : float
        Relative standard error that all amplitudes share.

    Returns
    -------
    Drive
        The fastest channel is always among its channels.

    Notes
    -----
    One pole divides harmonic h by `1 + 2j pi h f tau`; the exposure is the same for all channels and drops out, and
    so does the shape of the drive. What the harmonics of two channels leave open together is weighed with the
    covariance of their errors: video codes luma finely and colour coarsely, so that errors of two colours are
    opposed. The channels that agree are then joined by generalised least squares.
    """
    noise = 2 * np.einsum("kcc->ck", covariances)
    strength = np.sqrt(np.maximum(np.abs(amplitudes) ** 2 - 8 * noise, 0.0).sum(axis=1))
    fastest = int(strength.argmax())
    if "green" in names and strength[names.index("green")] > _GREEN_UNLESS * strength[fastest]:
        fastest = names.index("green")
    turns = numbers * frequency
    errors = np.sqrt(covariances[:, fastest, fastest])
    clear = np.abs(amplitudes[fastest]) > 3 * errors
    lags = {names[fastest]: Lag()}
    if clear.any():
        for place, name in enumerate(names):
            if place == fastest:
                continue
            pair = np.array([fastest, place])
            lag = _lag(amplitudes[pair][:, clear], covariances[clear][:, pair][:, :, pair], turns[clear])
            if lag is not None:
                lags[name] = lag
    group = np.array([place for place, name in enumerate(names) if name in lags])
    response = np.array([lags[names[place]].of(turns) for place in group])
    weights = np.linalg.inv(covariances[:, group][:, :, group])
    strong = np.einsum("ck,kcd,dk->k", response.conj(), weights, response).real
    joined = np.einsum("ck,kcd,dk->k", response.conj(), weights, amplitudes[group]) / strong
    return Drive(Harmonics(numbers, joined, 1 / strong, frequency, common), lags)


def _lag(pair: ComplexArray, covariances: FloatArray, turns: FloatArray) -> Lag | None:
    """Lag of the second channel behind the first, shapes (2, k) and (k, 2, 2); None if no lag explains it."""

    def loss(decay: float) -> float:
        response = 1.0 / (1.0 + 2j * np.pi * turns * decay)
        variance = (
            covariances[:, 1, 1]
            + np.abs(response) ** 2 * covariances[:, 0, 0]
            - 2 * response.real * covariances[:, 0, 1]
        )
        return float((np.abs(pair[1] - response * pair[0]) ** 2 / variance).sum())

    from scipy.optimize import brentq, minimize_scalar

    steps = np.log(np.geomspace(3e-3, 1e3, 150) / (2 * np.pi * turns[0]))
    losses = np.array([loss(float(decay)) for decay in np.exp(steps)])
    near = int(losses.argmin())
    bounds = (steps[max(near - 1, 0)], steps[min(near + 1, steps.size - 1)])
    best = float(minimize_scalar(lambda step: loss(np.exp(step)), bounds=bounds, method="bounded").x)
    without = loss(0.0)
    least = min(loss(np.exp(best)), without)
    freedom = max(2 * turns.size - 1, 1)
    scale = max(least / freedom, 1.0)
    allowed = least + _BETTER * scale
    if least / freedom > _SAME or max(without, losses[-1]) < allowed:
        return None  # another drive, or so faint that any lag would do
    if without < allowed or 2 * np.pi * turns[0] * np.exp(best) < _LEAST_LAG:
        return Lag() if without / freedom < _SAME else None
    limit = least + _INTERVAL * scale
    decay = float(np.exp(best))
    if losses[-1] < limit:
        return Lag(decay, decay, np.inf)
    down, up = (brentq(lambda step: loss(np.exp(step)) - limit, best, end) for end in (steps[0] - 5, steps[-1]))
    return Lag(decay, (decay - float(np.exp(down))) / 1.96, (float(np.exp(up)) - decay) / 1.96)
