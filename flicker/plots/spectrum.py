"""The spectrum relative to the mean, with the lines that were found."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from flicker.plots.style import FAINT, INK, LIGHT, MARK, new_figure, plain_logarithms

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from flicker.reports import ChannelReport
    from flicker.trace import FloatArray

_NAMED = 3  # lines that get their numbers written
_POINTS = 3000


def draw_spectrum(channel: ChannelReport, title: str) -> Figure:
    """
    Draw the spectrum over a logarithmic frequency axis.

    Parameters
    ----------
    channel : ChannelReport
        Its spectrum and its lines.
    title : str
        What the picture shows.

    Returns
    -------
    Figure
        Peak amplitudes in percent of the mean, in the unit of the readings where the mean level is lost; the lines
        that were found are marked, the strongest are named.
    """
    frequencies, amplitudes = channel.observation.spectrum()
    above_zero = frequencies > 0
    relative = channel.trace.mean_known
    frequencies, percent = frequencies[above_zero], (100 if relative else 1) * np.abs(amplitudes[above_zero])
    figure, axes = new_figure(title)
    lines = channel.components
    lowest = 0.3 * min((line.frequency for line in lines), default=4 * frequencies[0])
    left = max(float(frequencies[0]), lowest)
    grid, tops = envelope(frequencies, np.maximum(percent, 1e-9), left, _POINTS)
    floor = float(np.median(tops))
    axes.plot(grid, tops, color=FAINT, linewidth=0.5, label="spectrum")
    for line in lines:
        axes.plot([line.frequency] * 2, [floor, line.modulation], color=LIGHT, linewidth=1.4)
    if lines:
        found = np.array([(line.frequency, line.modulation) for line in lines])
        axes.plot(
            found[:, 0], found[:, 1], linestyle="none", marker="o", markersize=4.5, color=LIGHT, label="lines found"
        )
    for line in lines[:_NAMED]:
        axes.annotate(f"{line.frequency:.5g} Hz\n{line.modulation:.3g} %", (line.frequency, line.modulation),
                      xytext=(0, 6), textcoords="offset points", ha="center", fontsize=8, color=INK)  # fmt: skip
    nyquist = channel.trace.sample_rate / 2
    axes.axvline(nyquist, color=MARK, linewidth=1.0, linestyle=(0, (5, 2)))
    axes.annotate("half the sample rate", (nyquist, 0.98), xycoords=("data", "axes fraction"), xytext=(-4, 0),
                  textcoords="offset points", rotation=90, ha="right", va="top", fontsize=8, color=MARK)  # fmt: skip
    top = max([float(tops.max()), *(line.modulation for line in lines)])
    axes.set(xscale="log", yscale="log", xlim=(left, 1.08 * nyquist), ylim=(floor / 3, 6 * top))
    plain_logarithms(axes)
    axes.set_xlabel("frequency (Hz)")
    unit = "% of the mean" if relative else channel.trace.unit
    axes.set_ylabel(f"peak amplitude ({unit})" if unit else "peak amplitude")
    axes.legend(loc="lower left", fontsize=8, frameon=True)
    return figure


def envelope(frequencies: FloatArray, percent: FloatArray, left: float, points: int) -> tuple[FloatArray, FloatArray]:
    """Keep the largest value of each narrow step of the logarithmic axis, so that no line is lost in drawing."""
    inside = frequencies >= left
    frequencies, percent = frequencies[inside], percent[inside]
    if frequencies.size <= points:
        return frequencies, percent
    step = np.floor(np.log(frequencies / frequencies[0]) / np.log(frequencies[-1] / frequencies[0]) * (points - 1))
    starts = np.flatnonzero(np.diff(step, prepend=-1))
    return frequencies[starts], np.maximum.reduceat(percent, starts)
