"""Doubts that only measuring shows: too few cycles or samples, noise, pauses, slow pulsing."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from flicker.errors import NotMeasurable
from flicker.metrics import Observation
from flicker.results import Note
from flicker.signal.harmonics import HarmonicFit, Series
from flicker.signal.pauses import Pauses, find_pauses

_FEW = 10.0  # cycles; a figure is then an average of few
_UPPER = 0.6  # of the Nyquist frequency
_MOST_ABOVE = 0.1  # share of the modulation's power that may lie above
_SLOW = (0.5, 30.0)  # [Hz]
_LEAST_PULSING = 0.1  # peak over mean [%]
_FLASHING, _DEEP = 3.0, 5.0  # from here on pulsing can harm [Hz], [%]; IEEE 1789-2015, practice 3 (from memory)
_RARE = 0.1  # share of cycles up to which short pauses are missing pulses
_SHORT = 2  # cycles
_SHOWN = 3  # times that a note lists


def doubts(observation: Observation) -> tuple[Note, ...]:
    """
    Say what measuring a trace leaves in doubt.

    Parameters
    ----------
    observation : Observation
        Of the trace.

    Returns
    -------
    tuple of Note
        Codes `few-cycles`, `undersampled`, `noise-dominated`, `missing-pulses`, `burst`, `slow-pulsing`.
    """
    try:
        fit = observation.fit
    except NotMeasurable:
        return ()
    if observation.trace.exposure:  # frames of a video: what is seen may be an alias, which has a note of its own
        return tuple(_few_cycles(observation.series, fit))
    found = (
        _few_cycles(observation.series, fit),
        _undersampled(observation, fit),
        _noise_dominated(observation, fit),
        _pauses(observation.series, fit),
        _slow_pulsing(observation),
    )
    return tuple(note for notes in found for note in notes)


def _few_cycles(series: Series, fit: HarmonicFit) -> Iterator[Note]:
    cycles = series.values.size / series.sample_rate * fit.frequency  # gaps hold none
    if cycles < _FEW:
        yield Note(
            "few-cycles",
            "warning",
            f"only {cycles:.3g} cycles of {fit.frequency:.4g} Hz were recorded: the figures are means of few, and "
            f"whether the light is always like this cannot be told; record {_FEW / fit.frequency:.2g} s or more",
        )


def _undersampled(observation: Observation, fit: HarmonicFit) -> Iterator[Note]:
    nyquist = 0.5 * observation.trace.sample_rate
    above = total = 0.0
    for one in observation.search.families:
        power = np.abs(one.amplitudes) ** 2
        frequencies = one.frequency * np.arange(1, power.size + 1)
        seen = np.abs((frequencies + nyquist) % (2 * nyquist) - nyquist)
        above += float(power[seen > _UPPER * nyquist].sum())
        total += float(power.sum())
    if total > 0 and above > _MOST_ABOVE * total:
        samples = observation.trace.sample_rate / fit.frequency
        yield Note(
            "undersampled",
            "warning",
            f"{100 * above / total:.0f} % of the modulation lies in the upper part of what {2 * nyquist:.6g} samples/s "
            f"can show ({samples:.3g} samples a cycle): the light may be faster than it seems here, and its extremes "
            f"lie between samples; record at {20 * fit.frequency:.2g} Hz or faster, or once more at another rate and "
            "settle it with --same-light",
        )


def _noise_dominated(observation: Observation, fit: HarmonicFit) -> Iterator[Note]:
    swing = float(np.sqrt(0.5 * np.sum(np.abs(fit.amplitudes) ** 2)))
    noise = observation.cycle.noise
    if noise > swing:
        yield Note(
            "noise-dominated",
            "warning",
            f"the noise of single samples is {noise / swing:.2g} times the modulation (RMS): the figures come from the "
            "mean of many cycles, and faster or rarer events are lost in the noise; record with more light or gain, or "
            "with a narrower bandwidth",
        )


def _pauses(series: Series, fit: HarmonicFit) -> Iterator[Note]:
    pauses = find_pauses(series, fit)
    if pauses is None:
        return
    if pauses.cycles.max() <= _SHORT and pauses.share < _RARE:
        missing = int(pauses.cycles.sum())
        yield Note(
            "missing-pulses",
            "warning",
            f"{missing} of the cycles of {fit.frequency:.5g} Hz {'lacks its' if missing == 1 else 'lack their'} pulse "
            f"({_moments(pauses)}): the figures are those of the mean cycle; look for a loose contact or a driver that "
            "skips",
        )
        return
    shortest, longest = float(pauses.seconds.min()), float(pauses.seconds.max())
    lengths = f"{longest:.3g} s" if longest < 1.2 * shortest else f"{shortest:.3g} s to {longest:.3g} s"
    yield Note(
        "burst",
        "warning",
        f"the light comes in bursts: {pauses.starts.size} {'pause' if pauses.starts.size == 1 else 'pauses'} of "
        f"{lengths}, {100 * pauses.share:.2g} % of the time ({_moments(pauses)}): the figures mix light and pause; "
        "measure inside a burst with --start and --duration",
    )


def _moments(pauses: Pauses) -> str:
    shown = ", ".join(f"{moment:.5g}" for moment in pauses.starts[:_SHOWN])
    more = pauses.starts.size - _SHOWN
    return f"at {shown} s" + (f" and {more} more" if more > 0 else "")


def _slow_pulsing(observation: Observation) -> Iterator[Note]:
    slow = [fit for fit in observation.search.families if _SLOW[0] <= fit.frequency <= _SLOW[1]]
    if not slow or not observation.trace.mean_known or not observation.mean > 0:
        return
    fit = max(slow, key=lambda one: float(np.abs(one.amplitudes).max()))
    depth = 100.0 * float(np.abs(fit.amplitudes).max()) / observation.mean
    if depth < _LEAST_PULSING:
        return
    harm = ", and it can harm people with photosensitive epilepsy"
    harmful = depth >= _DEEP and fit.frequency >= _FLASHING
    yield Note(
        "slow-pulsing",
        "warning",
        f"the light pulses {fit.frequency:.4g} times a second, its strongest line by {depth:.3g} %"
        f"{_when(observation.series, fit)}: people may see it{harm if harmful else ''}; look at the "
        "supply and the regulation of the driver",
    )


def _when(series: Series, fit: HarmonicFit) -> str:
    """Say from when to when the pulsing has more than half of its largest amplitude, where that is not throughout."""
    length = 2.0 / fit.frequency
    count = int(series.span / length)
    if count < 4:
        return ""
    begin = series.segments[0].start
    sums = np.zeros((2, count), dtype=complex)
    for part, times in series.chunks():
        window = np.minimum(((times + series.centre - begin) / length).astype(np.intp), count - 1)
        turned = (series.values[part] - fit.mean) * np.exp(-2j * np.pi * fit.frequency * times)
        sums[0] += np.bincount(window, turned.real, count) + 1j * np.bincount(window, turned.imag, count)
        sums[1] += np.bincount(window, minlength=count)
    heights = np.abs(sums[0] / np.maximum(sums[1].real, 1.0))
    strong = np.flatnonzero(heights > 0.5 * heights.max())
    if strong.size > 0.9 * np.count_nonzero(sums[1]):
        return ""
    return f", from {begin + strong[0] * length:.4g} s to {begin + (strong[-1] + 1) * length:.4g} s"
