"""Heat maps of flicker over the picture."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from flicker.camera.screen import ScreenMap


def draw_map(found: ScreenMap) -> Figure:
    """
    Draw depth, frequency, phase and level as four maps in the orientation of the picture as stored.

    Parameters
    ----------
    found : ScreenMap
        From `flicker.camera.screen.map_screen`.

    Returns
    -------
    Figure
        Dark cells are grey; every map has its own scale with the unit.
    """
    from matplotlib.figure import Figure

    figure = Figure(figsize=(11, 7), layout="constrained")
    panels: tuple[tuple[str, Any, str, dict[str, Any]], ...] = (
        ("Percent flicker (%)", found.percent_flicker, "viridis", {"vmin": 0, "vmax": 100}),
        ("Frequency (Hz)", found.frequency, "cividis", {}),
        ("Phase ahead of the brightest zone (cycles)", found.phase, "twilight_shifted", {"vmin": -0.5, "vmax": 0.5}),
        ("Mean level (of white)", found.mean, "gray", {"vmin": 0}),
    )
    for place, (title, values, colours, scale) in enumerate(panels):
        axes = figure.add_subplot(2, 2, place + 1)
        axes.set_facecolor("0.75")
        image = axes.imshow(np.ma.masked_invalid(values), cmap=colours, interpolation="nearest", aspect="auto", **scale)
        figure.colorbar(image, ax=axes)
        axes.set_title(title, fontsize=10)
        axes.set_xlabel("column")
        axes.set_ylabel("row")
        for number, zone in enumerate(found.zones[:40], 1):
            row, column = np.mean(np.array(zone.cells), axis=0)
            box = {"boxstyle": "round,pad=0.15", "facecolor": "black", "alpha": 0.55, "linewidth": 0}
            axes.text(column, row, str(number), ha="center", va="center", color="white", fontsize=8, bbox=box)
    figure.suptitle(f"{len(found.zones)} zones, numbered brightest first: {found.kind}", fontsize=11)
    return figure


def save_map(found: ScreenMap, folder: Path) -> Path:
    """Write the maps as `map.png` into a folder, and give the path."""
    from flicker.files import whole_file

    path = folder / "map.png"
    figure = draw_map(found)
    with whole_file(path) as temporary:
        figure.savefig(temporary, dpi=110)
    return path
