"""The plane of modulation over frequency: the regions of IEEE 1789-2015, and where this light lies."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from flicker.errors import NotMeasurable
from flicker.plots.style import (
    FAINT,
    INK,
    LIGHT,
    PAPER,
    REGION_MARKERS,
    REGION_WORDS,
    REGIONS,
    new_figure,
    plain_logarithms,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from flicker.limits import Curve, RiskRegion
    from flicker.reports import ChannelReport

_FREQUENCIES = (1.0, 10_000.0)  # [Hz]
_MODULATIONS = (0.05, 250.0)  # [%]


def draw_plane(channel: ChannelReport, title: str) -> Figure:
    """
    Draw where a light lies in the plane of modulation over frequency.

    Parameters
    ----------
    channel : ChannelReport
        Its families, lines and risk region.
    title : str
        What the picture shows.

    Returns
    -------
    Figure
        Regions shaded and named; large marks for families at their percent flicker, small ones for lines, the
        one that decides the region pointed at.

    Raises
    ------
    NotMeasurable
        If the depth is not known, for then the light has no place.
    """
    from flicker.limits import risk_curves

    if channel.risk_region is None:
        raise NotMeasurable(channel.measures["percent_flicker"].reason or "the depth is not known")
    figure, axes = new_figure(title)
    families = [
        (family.fundamental.value, family.percent_flicker.value)
        for family in channel.families
        if family.fundamental.value is not None and family.percent_flicker.value is not None
    ]
    lines = [(line.frequency, line.modulation) for line in channel.components]
    lowest = min([_FREQUENCIES[0], *(0.7 * frequency for frequency, _ in families)])
    highest = max([_FREQUENCIES[1], *(1.5 * frequency for frequency, _ in families)])
    axes.set(xscale="log", yscale="log", xlim=(lowest, highest), ylim=_MODULATIONS)
    plain_logarithms(axes)
    axes.set_xlabel("frequency (Hz)")
    axes.set_ylabel("modulation (% of the mean)")
    _shade(axes, *risk_curves())
    if lines:
        axes.plot(*np.transpose(lines), linestyle="none", marker="|", color=FAINT, markersize=7, label="spectral lines")
    if families:
        axes.plot(
            *np.transpose(families),
            linestyle="none",
            marker=REGION_MARKERS[channel.risk_region.region],
            markersize=11,
            color=LIGHT,
            markeredgecolor=PAPER,
            label="this light: percent flicker at its fundamental",
        )
    by_depth = any(depth == channel.risk_region.modulation for _, depth in families)
    _point_at(axes, channel.risk_region, "percent flicker" if by_depth else "a line of")
    if lines or families:
        axes.legend(loc="lower right", fontsize=8, frameon=True, framealpha=0.9)
    return figure


def _shade(axes: Axes, low_risk: Curve, no_effect: Curve) -> None:
    """Fill and name the three regions; where a curve gives no limit the region reaches to the top."""
    edges = np.array([edge * side for edge in (*low_risk.edges, *no_effect.edges) for side in (1 - 1e-9, 1 + 1e-9)])
    frequency = np.union1d(np.geomspace(*axes.get_xlim(), 400), edges)
    bottom, top = axes.get_ylim()
    low, none = (np.clip([curve.at(one) for one in frequency], bottom, top) for curve in (low_risk, no_effect))
    spans = {
        "no-observable-effect": (np.full_like(none, bottom), none),
        "low-risk": (none, low),
        "above-low-risk": (low, np.full_like(low, top)),
    }
    for region, (below, above) in spans.items():
        fill, hatch = REGIONS[region]
        axes.fill_between(
            frequency, below, above, facecolor=fill, edgecolor="#b9c0cb", hatch=hatch, linewidth=0, zorder=0
        )
    for bound in (low, none):
        axes.plot(frequency, bound, color=INK, linewidth=1.0)
    for region, x, y in (
        ("above-low-risk", 4.0, 4.0),
        ("low-risk", 16.0, 0.26),
        ("no-observable-effect", 700.0, 0.9),
    ):
        axes.text(
            x,
            y,
            REGION_WORDS[region],
            color=INK,
            fontsize=10,
            ha="center",
            va="center",
            rotation=np.degrees(np.arctan(y / x)) if region == "low-risk" else 0,
            transform_rotates_text=region == "low-risk",
            rotation_mode="anchor",
            bbox=None if region == "low-risk" else {"facecolor": REGIONS[region][0], "edgecolor": "none", "pad": 2},
        )


def _point_at(axes: Axes, place: RiskRegion, what: str) -> None:
    if place.frequency is None or place.modulation is None:
        axes.text(
            0.97, 0.06, "steady light: no modulation was found", transform=axes.transAxes, color=INK, fontsize=10,
            ha="right", fontweight="bold", bbox={"facecolor": PAPER, "edgecolor": INK, "boxstyle": "round,pad=0.35"},
        )  # fmt: skip
        return
    right = place.frequency < 200
    axes.annotate(
        f"{REGION_WORDS[place.region]}:\n{what} {place.modulation:.3g} % at {place.frequency:.4g} Hz",
        (place.frequency, min(place.modulation, _MODULATIONS[1])),
        xytext=(30 if right else -36, -64),
        textcoords="offset points",
        ha="left" if right else "right",
        fontsize=9,
        color=INK,
        fontweight="bold",
        bbox={"facecolor": PAPER, "edgecolor": INK, "linewidth": 0.8, "boxstyle": "round,pad=0.35"},
        arrowprops={"arrowstyle": "-", "color": INK, "shrinkB": 6},
        zorder=6,
    )
