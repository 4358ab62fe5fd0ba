"""The recorded light, and the mean cycle that the depth is read from."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from flicker.errors import NotMeasurable
from flicker.plots.style import FAINT, INK, LIGHT, MARK, PAPER, dress

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flicker.reports import ChannelReport

_CYCLES_SHOWN = 5
_SAMPLES_SHOWN = 4000
_NORMAL_95 = 1.96  # standard errors in a 95 % band


def draw_waveform(channel: ChannelReport, title: str) -> Figure:
    """
    Draw the first cycles as recorded, and the mean cycle with its extremes.

    Parameters
    ----------
    channel : ChannelReport
        Its trace, and its mean cycle where there is one.
    title : str
        What the picture shows.

    Returns
    -------
    Figure
        Left the readings over time with the dark level, right the mean cycle relative to its mean level, in the unit of
        the readings where that level is lost; only the readings where no cycle could be found.
    """
    from matplotlib.figure import Figure

    figure = Figure(figsize=(9.5, 4.2), facecolor=PAPER, layout="constrained")
    figure.suptitle(title, x=0.01, ha="left", color=INK, fontsize=11)
    try:
        cycle = channel.observation.cycle
    except NotMeasurable:
        cycle = None
    panels = figure.subplots(1, 1 if cycle is None else 2, squeeze=False)[0]
    _draw_readings(panels[0], channel)
    if cycle is not None:
        _draw_cycle(panels[1], channel)
    return figure


def _draw_readings(axes: Axes, channel: ChannelReport) -> None:
    trace = channel.trace
    frequency = channel.measures["fundamental_frequency"].value
    count = round(trace.sample_rate * _CYCLES_SHOWN / frequency) if frequency else _SAMPLES_SHOWN
    count = min(max(count, 2), _SAMPLES_SHOWN, trace.samples)
    times = (trace.times()[:count] - trace.start) * 1e3
    dress(axes)
    axes.plot(times, trace.light[:count], color=LIGHT, linewidth=1.1, marker="." if count < 300 else "", markersize=4)
    if trace.mean_known:
        dark = trace.dark_level or 0.0
        axes.axhline(dark, color=MARK, linewidth=1.0, linestyle=(0, (5, 2)))
        words = "dark level" if trace.dark_level is not None else "zero, taken as dark"
        axes.annotate(
            words, (1, dark), xycoords=("axes fraction", "data"), xytext=(0, -3), textcoords="offset points",
            ha="right", va="top", color=MARK, fontsize=9,
        )  # fmt: skip
    axes.set_title("as recorded", loc="left", color=INK, fontsize=10)
    axes.set_xlabel("time since the start (ms)")
    axes.set_ylabel(f"reading ({trace.unit})" if trace.unit else "reading")
    axes.set_xlim(times[0], times[-1])
    axes.margins(y=0.12)


def _draw_cycle(axes: Axes, channel: ChannelReport) -> None:
    cycle, trace = channel.observation.cycle, channel.trace
    middle = np.angle(np.sum(cycle.levels * np.exp(2j * np.pi * cycle.phase))) / (2 * np.pi)
    phase = (cycle.phase - middle + 0.5) % 1.0
    order = np.argsort(phase)
    scale = cycle.mean if trace.mean_known and cycle.mean > 0 else None
    phase, light = phase[order], cycle.levels[order] / (scale or 1.0)
    spread = _NORMAL_95 * cycle.standard_error[order] / (scale or 1.0)
    dress(axes)
    axes.fill_between(phase, light - spread, light + spread, color=LIGHT, alpha=0.25, linewidth=0)
    axes.plot(phase, light, color=LIGHT, linewidth=1.5)
    mean = float(np.mean(light))
    axes.axhline(mean, color=FAINT, linewidth=1.0)
    axes.annotate("mean", (1, mean), xycoords=("axes fraction", "data"), xytext=(-2, 3), textcoords="offset points",
                  ha="right", color=FAINT, fontsize=9)  # fmt: skip
    depth = channel.measures.get("percent_flicker")
    heading = "mean cycle with its 95 % band"
    if depth is not None and depth.value is not None:
        heading += f"; percent flicker {depth.value:.3g} %"
    axes.set_title(heading, loc="left", color=INK, fontsize=10)
    axes.set_xlabel("phase (cycles), brightest half in the middle")
    axes.set_xlim(0, 1)
    if scale is None:
        axes.set_ylabel(f"reading about a lost mean ({trace.unit})" if trace.unit else "reading about a lost mean")
    else:
        axes.set_ylabel("light over its mean")
        axes.set_ylim(min(0.0, float(np.min(light - spread))), None)
