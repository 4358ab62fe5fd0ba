"""Short-term severity of light: the chain of filters from light to the flicker that an average observer feels."""

from __future__ import annotations

import math
from functools import cache

import numpy as np
import scipy.fft

from flicker.trace import FloatArray

# IEC TR 61547-1 and IEC 61000-4-15:2010, all from memory
HIGH_PASS = 0.05  # first order [Hz]
LOW_PASS = 35.0  # sixth-order Butterworth, for mains of 50 Hz [Hz]
WEIGHTING = ((0.041661, 44.758, 2715.6, 29839.0, 0.0), (1.0, 196.32, 11781.0, 534820.0, 3505380.0))  # in s, [rad/s]
SMOOTHING = 0.3  # first order, after squaring [s]
# computed: a sine of 8.8 Hz that moves the voltage by 0.25 %, through `LAMP`, gives a sensation of 1 at its peak
SCALE = 1.238350e6
# computed: the ratio of the voltage's weighting to the light's, to within 0.0015 % from 0.1 to 35 Hz
LAMP = (3.5700, 20.210e-3, 0.990e-3)  # gain, two time constants of the 60 W filament lamp for 230 V [s]

_PERCENTILES = (  # weight, shares of the time that each level is exceeded [%]; IEC 61000-4-15:2010 (from memory)
    (0.0314, (0.1,)),
    (0.0525, (0.7, 1.0, 1.5)),
    (0.0657, (2.2, 3.0, 4.0)),
    (0.28, (6.0, 8.0, 10.0, 13.0, 17.0)),
    (0.08, (30.0, 50.0, 80.0)),
)
_LOWEST_RATE = 2000.0  # after decimation; bilinear sections are then right to 0.3 % even at 40 Hz [Hz]
_TOP = 80.0  # no severity above it [Hz]
_STOPPED = 100.0  # by the filter before decimation [dB]
_LEAD_IN = 20.0  # for the filters to settle on [s]
_ALIKE = 1.0  # stretch by which a lead-in is chosen [s]


def decimated(light: FloatArray, sample_rate: float) -> tuple[FloatArray, float]:
    """
    Reduce the sample rate to between 2 and 4 kHz, behind a linear-phase filter that lets nothing fold back below 80 Hz.

    Parameters
    ----------
    light : ndarray, shape (n,)
        Evenly sampled.
    sample_rate : float
        [Hz]

    Returns
    -------
    (ndarray of shape (m,), float)
        The light, and its new sample rate [Hz].

    Notes
    -----
    Polyphase (`scipy.signal.upfirdn`) with the filter of `decimation`. Only what the filter sees whole is given: some
    milliseconds are lost at both ends.
    """
    factor, kernel = decimation(sample_rate)
    if factor < 2:
        return light, sample_rate
    from scipy.signal import upfirdn

    lost = -(-kernel.size // factor)
    return np.asarray(upfirdn(kernel, light, down=factor)[lost : light.size // factor]), sample_rate / factor


@cache
def decimation(sample_rate: float) -> tuple[int, FloatArray]:
    """
    Design the decimation: by how much, and the filter before it, shape (t,), symmetric, t odd.

    Kaiser window for 100 dB (Kaiser 1974; `scipy.signal.kaiserord`).
    """
    factor = int(sample_rate // _LOWEST_RATE)
    if factor < 2:
        return 1, np.ones(1)
    from scipy.signal import firwin, kaiserord

    rate = sample_rate / factor
    taps, beta = kaiserord(_STOPPED, (rate - 2 * _TOP) / (0.5 * sample_rate))
    return factor, np.asarray(firwin(taps | 1, 0.5 * rate, window=("kaiser", beta), fs=sample_rate))


@cache
def sections(sample_rate: float) -> FloatArray:
    """
    Give high-pass, low-pass and weighting of the eye and brain as second-order sections, shape (6, 6).

    Bilinear transform of the analogue filters; a direct form of fourth order would lose digits at high sample rates.
    """
    from scipy.signal import bilinear_zpk, butter, tf2zpk, zpk2sos

    weighting = zpk2sos(*bilinear_zpk(*tf2zpk(*WEIGHTING), sample_rate))
    high = butter(1, HIGH_PASS, "highpass", fs=sample_rate, output="sos")
    low = butter(6, LOW_PASS, fs=sample_rate, output="sos")
    return np.concatenate([high, low, weighting])


@cache
def smoothing(sample_rate: float) -> FloatArray:
    """Give the smoothing after squaring as a second-order section, shape (1, 6)."""
    from scipy.signal import bilinear, tf2sos

    return np.asarray(tf2sos(*bilinear([1.0], [SMOOTHING, 1.0], sample_rate)))


def weighted_sensation(light: FloatArray, sample_rate: float) -> FloatArray:
    """
    Give the flicker that is felt at every moment.

    Parameters
    ----------
    light : ndarray, shape (n,)
        Over its mean.
    sample_rate : float
        From 1 kHz on. [Hz]

    Returns
    -------
    ndarray, shape (n,)
        1 at the threshold of an average observer.

    Notes
    -----
    Deviation from 1, high-pass, low-pass, weighting, squaring, smoothing, scale: the meter of IEC TR 61547-1 for light
    (constants from memory, held against IEC 61000-4-15:2010 through the lamp). The filters
    first settle on 20 s of the same light, so that neither the start of the capture nor its mean counts as a change.
    """
    from scipy.signal import sosfilt

    deviation = light - 1.0
    before = _lead_in(deviation, sample_rate)
    felt = sosfilt(sections(sample_rate), np.concatenate([before, deviation]))
    np.square(felt, out=felt)
    felt = sosfilt(smoothing(sample_rate), felt)[before.size :]
    felt *= SCALE
    return np.asarray(felt)


def _lead_in(deviation: FloatArray, sample_rate: float) -> FloatArray:
    """
    Give what may have come before the first sample: the light that led up to the second most like the first one.

    For periodic light that is its own past, in the right phase. It is looked for in the first 200 s.
    """
    deviation = deviation[: int(10 * _LEAD_IN * sample_rate)]
    before, alike = int(_LEAD_IN * sample_rate), int(_ALIKE * sample_rate)
    last = deviation.size - alike
    if last < before:
        return np.zeros(0)
    size = scipy.fft.next_fast_len(deviation.size, real=True)
    transforms = (scipy.fft.rfft(deviation, size), scipy.fft.rfft(deviation[:alike], size))
    products = scipy.fft.irfft(transforms[0] * transforms[1].conj(), size)[before : last + 1]
    energy = np.concatenate([[0.0], np.cumsum(deviation**2)])
    distance = energy[before + alike : last + 1 + alike] - energy[before : last + 1] - 2.0 * products
    place = before + int(np.argmin(distance))
    return deviation[place - before : place]


def severity_of(sensation: FloatArray) -> float:
    r"""
    Give the short-term severity of a stretch of sensation.

    Parameters
    ----------
    sensation : ndarray, shape (n,)
        From `weighted_sensation`.

    Returns
    -------
    float
        Pst LM. [1]

    Notes
    -----
    .. math:: \sqrt{0.0314 P_{0.1} + 0.0525 P_{1s} + 0.0657 P_{3s} + 0.28 P_{10s} + 0.08 P_{50s}}

    with :math:`P_x` exceeded during x % of the time; those with an s are means of neighbouring ones (IEC
    61000-4-15:2010, from memory). A steady sensation P reads :math:`\sqrt{0.5096 P}`.
    """
    shares = [share for _, group in _PERCENTILES for share in group]
    levels = dict(zip(shares, np.percentile(sensation, [100.0 - share for share in shares]), strict=True))
    total = sum(weight * float(np.mean([levels[share] for share in group])) for weight, group in _PERCENTILES)
    return math.sqrt(max(total, 0.0))


def light_of_lamp(voltage: FloatArray, sample_rate: float) -> FloatArray:
    """
    Give the light of the reference lamp of IEC 61000-4-15 for small changes of the RMS voltage.

    Parameters
    ----------
    voltage : ndarray, shape (n,)
        RMS voltage over its mean; the lamp starts settled on the first value.
    sample_rate : float
        [Hz]

    Returns
    -------
    ndarray, shape (n,)
        Light over its mean.

    Notes
    -----
    Two poles: what remains of the voltage's weighting for 230 V when the light's weighting is taken out (computed
    from the constants of IEC 61000-4-15:2010, from memory).
    """
    from scipy.signal import bilinear, sosfilt, sosfilt_zi, tf2sos

    gain, slow, fast = LAMP
    lamp = tf2sos(*bilinear([gain], np.polymul([slow, 1.0], [fast, 1.0]), sample_rate))
    deviation = voltage - 1.0
    return np.asarray(1.0 + sosfilt(lamp, deviation, zi=sosfilt_zi(lamp) * deviation[0])[0])


@cache
def noise_reading(sample_rate: float) -> float:
    """Mean sensation of white noise whose standard deviation is the light's mean."""
    from scipy.signal import sosfilt

    impulse = np.zeros(int(10 * sample_rate))
    impulse[0] = 1.0
    return SCALE * float(np.sum(sosfilt(sections(sample_rate), impulse) ** 2))
