"""Measures along a capture, window by window."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.plots.style import FAINT, INK, LIGHT, MARK, PAPER, dress

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flicker.along import Along
    from flicker.reports import ChannelReport

_PANELS = {
    "fundamental_frequency": "frequency (Hz)",
    "percent_flicker": "percent flicker (%)",
    "flicker_index": "flicker index",
    "duty_cycle": "duty cycle",
    "svm": "SVM",
    "pst_lm": "Pst LM",
}


def has_course(channel: ChannelReport) -> bool:
    """Whether there is anything to draw along the capture."""
    return channel.along is not None or len(channel.measures["pst_lm"].series) > 1


def draw_along(channel: ChannelReport, title: str) -> Figure:
    """
    Draw each main measure over the time of the capture.

    Parameters
    ----------
    channel : ChannelReport
        Measured with `window=`, or long enough for several windows of short-term severity.
    title : str
        Above the picture.

    Returns
    -------
    Figure
        A panel for each measure that some window carries: a bar over the interval of each window, a dashed line at the
        figure of the whole capture; a panel says where the windows differ by more than their intervals.
    """
    from matplotlib.figure import Figure

    along, severity = channel.along, channel.measures["pst_lm"].series
    names = [name for name in _PANELS if along and name in along.throughout]
    if len(severity) > 1 and "pst_lm" not in names:
        names.append("pst_lm")
    figure = Figure(figsize=(8.0, 1.0 + 1.7 * max(len(names), 1)), facecolor=PAPER, layout="constrained")
    panels = figure.subplots(max(len(names), 1), 1, sharex=True, squeeze=False)[:, 0]
    panels[0].set_title(title, loc="left", color=INK, fontsize=11)
    for axes, name in zip(panels, names, strict=False):
        dress(axes)
        axes.set_ylabel(_PANELS[name], fontsize=9)
        axes.ticklabel_format(useOffset=False)
        whole = channel.measures[name].value
        if whole is not None:
            axes.axhline(whole, color=FAINT, linestyle=(0, (5, 3)), linewidth=1.0)
        if along and name in along.throughout:
            _windows(axes, along, name)
        else:
            axes.plot(*zip(*severity, strict=True), "o-", color=LIGHT, linewidth=1.0)
    if not names:
        panels[0].annotate("no window carries a measure", (0.5, 0.5), xycoords="axes fraction", ha="center")
    panels[-1].set_xlabel("start of the window (s); dashed: the whole capture")
    return figure


def _windows(axes: Axes, along: Along, name: str) -> None:
    found = [(window.start, window.measures[name]) for window in along.windows]
    points = [(start, one.value, one.low, one.high) for start, one in found if one.value is not None]
    axes.plot([point[0] for point in points], [point[1] for point in points], "o", color=LIGHT, markersize=4)
    for start, _, low, high in points:
        if low is not None and high is not None:
            axes.plot([start, start], [low, high], color=LIGHT, linewidth=1.2)
    axes.margins(y=0.15)
    if along.throughout[name].same is False:
        box = {"facecolor": PAPER, "edgecolor": MARK, "linewidth": 0.8, "boxstyle": "round,pad=0.25"}
        words = "changes by more than the intervals allow"
        axes.annotate(words, (0.99, 0.9), xycoords="axes fraction", ha="right", va="top", fontsize=8, bbox=box)
