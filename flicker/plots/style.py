"""One look for every picture: ink on paper, told apart by shape and words first, by colour second."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

INK = "#1d2433"
FAINT = "#7b8496"
PAPER = "#ffffff"
LIGHT = "#1f4e79"  # what was measured
MARK = "#a3500b"  # what it is held against or pointed at
CHANNELS = {"red": "#9c2f4b", "green": "#27705c", "blue": "#2c5aa0"}
DASHES = {"red": (0, (5, 1.5)), "green": "solid", "blue": (0, (1.5, 1.2))}  # channels differ by dash as well
REGIONS = {  # fill and hatching; lighter is safer, also in grey
    "no-observable-effect": ("#eef4f8", ""),
    "low-risk": ("#cfdde8", ".."),
    "above-low-risk": ("#e3cdb6", "///"),
}
REGION_WORDS = {
    "no-observable-effect": "no observable effect",
    "low-risk": "low risk",
    "above-low-risk": "above low risk",
}
REGION_MARKERS = {"no-observable-effect": "o", "low-risk": "D", "above-low-risk": "^"}
_SIZE = (8.0, 4.5)  # [inch]
_RESOLUTION = 150  # [dots an inch]


def new_figure(title: str, *, size: tuple[float, float] = _SIZE) -> tuple[Figure, Axes]:
    """Make a figure with one pair of axes and a title at the left, without a window system."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=size, facecolor=PAPER, layout="constrained")
    axes = figure.add_subplot()
    axes.set_title(title, loc="left", color=INK, fontsize=11)
    dress(axes)
    return figure, axes


def dress(axes: Axes) -> None:
    """Give axes the common look: no frame at the top and the right, ticks outward, a faint grid."""
    axes.spines[["top", "right"]].set_visible(False)
    axes.spines[["left", "bottom"]].set_color(FAINT)
    axes.tick_params(colors=INK, labelsize=9)
    axes.grid(visible=True, color="#d5d9e0", linewidth=0.6)
    axes.set_axisbelow(True)


def plain_logarithms(axes: Axes) -> None:
    """Write the numbers of logarithmic axes as numbers, not as powers."""
    from matplotlib.ticker import FuncFormatter, LogLocator

    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(LogLocator())
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,.6g}".replace(",", " ")))


def save_figure(figure: Figure, path: Path) -> None:
    """Write a figure, whole or not at all; the suffix tells the format, and the same figure gives the same bytes."""
    from flicker.files import whole_file

    metadata = {".png": {"Software": None}, ".pdf": {"CreationDate": None}, ".svg": {"Date": None}}
    with whole_file(path) as temporary:
        figure.savefig(temporary, dpi=_RESOLUTION, metadata=metadata.get(path.suffix))
