"""The pictures of a report, each channel its own."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.errors import NotMeasurable
from flicker.plots.plane import draw_plane
from flicker.plots.spectrum import draw_spectrum
from flicker.plots.style import save_figure
from flicker.plots.waveform import draw_waveform

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from flicker.analysis import CaptureReport, ChannelReport, Report

PICTURES: dict[str, tuple[str, Callable[[ChannelReport, str], Figure]]] = {
    "waveform": ("light over time, and its mean cycle", draw_waveform),
    "spectrum": ("spectrum relative to the mean", draw_spectrum),
    "plane": ("modulation over frequency, regions of IEEE 1789-2015", draw_plane),
}


@dataclass(frozen=True)
class Pictures:
    """The files written, and the pictures that could not be drawn with the reason."""

    written: tuple[Path, ...]
    missing: dict[str, str]


def write_pictures(report: Report, folder: Path) -> Pictures:
    """
    Write every picture of every channel as PNG.

    Parameters
    ----------
    report : Report
        What was measured.
    folder : Path
        Where the files go; it must be there.

    Returns
    -------
    Pictures
        Files `CAPTURE-PICTURE.png`, with the channel's name in between where a capture has several; a second
        capture of the same name gets its number in front.

    Raises
    ------
    UnreadableFileError
        If a file cannot be written.
    """
    written: list[Path] = []
    missing: dict[str, str] = {}
    for capture in report.captures:
        for channel in capture.channels:
            name = _free_name(capture, channel, written)
            for kind, (about, draw) in PICTURES.items():
                try:
                    figure = draw(channel, f"{name}: {about}")
                except NotMeasurable as reason:
                    missing[f"{name}-{kind}"] = str(reason)
                    continue
                written.append(folder / f"{name}-{kind}.png")
                save_figure(figure, written[-1])
    return Pictures(tuple(written), missing)


def _free_name(capture: CaptureReport, channel: ChannelReport, written: list[Path]) -> str:
    """Name a channel's pictures after its capture, so that no two channels of a report share a name."""
    stem = Path(capture.path).stem if capture.path else "capture"
    if len(capture.channels) > 1:
        stem += f"-{channel.trace.name}"
    stem = "".join(sign if sign.isalnum() or sign in "-_." else "-" for sign in stem)
    taken = {path.name for path in written}
    name, number = stem, 1
    while any(f"{name}-{kind}.png" in taken for kind in PICTURES):
        number += 1
        name = f"{number}-{stem}"
    return name
