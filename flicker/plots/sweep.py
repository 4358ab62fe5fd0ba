"""A sweep over dimming levels: depth, frequency and verdict of every step."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.plots.style import FAINT, INK, LIGHT, MARK, PAPER, dress, save_figure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flicker.sweep.course import Course, Point

_MARKERS = {"fail": ("X", MARK), "undecided": ("D", PAPER), "pass": ("o", LIGHT), "not-applicable": ("|", FAINT)}
_WORDS = {"fail": "breaks a limit", "undecided": "undecided", "pass": "keeps every limit", "not-applicable": "no limit"}
_SIZE = (8.0, 5.6)  # [inch]


def draw_sweep(course: Course) -> Figure:
    """
    Draw percent flicker and frequency over the dimming level, each step marked by its verdict.

    Parameters
    ----------
    course : Course
        One specimen and channel over its levels.

    Returns
    -------
    Figure
        Depth above, frequency below; verdicts told apart by the shape of the mark, the levels at which the dimming
        mode changes by a vertical line, the worst step named.
    """
    from matplotlib.figure import Figure

    figure = Figure(figsize=_SIZE, facecolor=PAPER, layout="constrained")
    upper, lower = figure.subplots(2, 1, sharex=True)
    name = f"{course.unit}, {course.channel}" if course.unit else course.channel
    upper.set_title(f"over the dimming range: {name}", loc="left", color=INK, fontsize=11)
    _steps(upper, course, "depth")
    _steps(lower, course, "frequency")
    upper.set_ylabel("percent flicker (%)")
    upper.set_ylim(bottom=-0.06 * upper.get_ylim()[1])
    lower.set_ylabel("frequency (Hz)")
    lower.set_xlabel("dimming level (%)")
    frequencies = [point.frequency for point in course.points if point.frequency]
    if frequencies and max(frequencies) > 5 * min(frequencies):
        lower.set_yscale("log")
    elif frequencies:
        lower.set_ylim(0, 1.15 * max(frequencies))
    for axes in (upper, lower):
        dress(axes)
        for span in course.spans[1:]:
            axes.axvline(span.high, color=INK, linewidth=0.8, linestyle=(0, (4, 3)))
    for span in course.spans:
        middle = (span.high + span.low) / 2
        label = "mode unknown" if span.mode == "unknown" else span.mode.replace("pwm", "PWM")
        place = {"xycoords": ("data", "axes fraction"), "ha": "center", "va": "top"}
        lower.annotate(label, (middle, 0.98), fontsize=8, color=INK, **place)
    _name_worst(upper, course.worst)
    upper.legend(loc="best", fontsize=8, framealpha=0.9)
    return figure


def _steps(axes: Axes, course: Course, what: str) -> None:
    steps = ((point.level, getattr(point, what), point.verdict) for point in course.points)
    known = [(level, value, verdict) for level, value, verdict in steps if level is not None and value is not None]
    axes.plot([entry[0] for entry in known], [entry[1] for entry in known], color=FAINT, linewidth=1.0, zorder=1)
    for verdict, (marker, fill) in _MARKERS.items():
        some = [entry for entry in known if entry[2] == verdict]
        if some:
            axes.plot(
                [entry[0] for entry in some],
                [entry[1] for entry in some],
                linestyle="none",
                marker=marker,
                markersize=9,
                color=LIGHT if verdict == "undecided" else fill,
                markerfacecolor=fill,
                label=_WORDS[verdict],
            )


def _name_worst(axes: Axes, worst: Point) -> None:
    if worst.depth is None or worst.level is None:
        return
    low = worst.level < 50
    axes.annotate(
        f"worst: {worst.level:g} %" + (f", {worst.limit}" if worst.limit else ""),
        (worst.level, worst.depth),
        xytext=(14 if low else -14, -22),
        textcoords="offset points",
        ha="left" if low else "right",
        fontsize=9,
        color=INK,
        fontweight="bold",
        bbox={"facecolor": PAPER, "edgecolor": INK, "linewidth": 0.8, "boxstyle": "round,pad=0.3"},
        arrowprops={"arrowstyle": "-", "color": INK},
    )


def save_sweeps(courses: Sequence[Course], folder: Path) -> None:
    """Write the picture of every course as PNG: `sweep-UNIT-CHANNEL.png`; `UnreadableFileError` if one cannot be."""
    taken: set[str] = set()
    for course in courses:
        words = "-".join(part for part in ("sweep", course.unit, course.channel) if part)
        name = re.sub(r"[^\w.-]+", "-", words).strip("-")
        while name in taken:
            name += "-again"
        taken.add(name)
        save_figure(draw_sweep(course), folder / f"{name}.png")
