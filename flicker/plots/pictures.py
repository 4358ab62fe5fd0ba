"""The pictures of a report, each channel its own."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.errors import NotMeasurable
from flicker.plots.along import draw_along, has_course
from flicker.plots.plane import draw_plane
from flicker.plots.spectrum import draw_spectrum
from flicker.plots.style import save_figure
from flicker.plots.waveform import draw_waveform

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from flicker.reports import CaptureReport, ChannelReport

PICTURES: dict[str, tuple[str, Callable[[ChannelReport, str], Figure]]] = {
    "waveform": ("light over time, and its mean cycle", draw_waveform),
    "spectrum": ("spectrum relative to the mean", draw_spectrum),
    "plane": ("modulation over frequency, regions of IEEE 1789-2015", draw_plane),
}
_COURSE: dict[str, tuple[str, Callable[[ChannelReport, str], Figure]]] = {
    "along": ("measures along the capture", draw_along),
}


@dataclass(frozen=True)
class Pictures:
    """The files written, and the pictures that could not be drawn with the reason."""

    written: tuple[Path, ...]
    missing: dict[str, str]


def write_pictures(capture: CaptureReport, folder: Path, name: str) -> Pictures:
    """
    Write every picture of every channel of a capture as PNG.

    Parameters
    ----------
    capture : CaptureReport
        What was measured.
    folder : Path
        Where the files go; it must be there.
    name : str
        What their names begin with: `NAME-PICTURE.png`, with the channel's name in between where there are several.

    Returns
    -------
    Pictures

    Raises
    ------
    UnreadableFileError
        If a file cannot be written.
    """
    written: list[Path] = []
    missing: dict[str, str] = {}
    for channel in capture.channels:
        title = name if len(capture.channels) == 1 else f"{name}-{_plain(channel.trace.name)}"
        for kind, (about, draw) in (PICTURES | (_COURSE if has_course(channel) else {})).items():
            try:
                figure = draw(channel, f"{title}: {about}")
            except NotMeasurable as reason:
                missing[f"{title}-{kind}"] = str(reason)
                continue
            written.append(folder / f"{title}-{kind}.png")
            save_figure(figure, written[-1])
    return Pictures(tuple(written), missing)


def picture_names(paths: Sequence[str]) -> list[str]:
    """Name the pictures of captures after their files; one that would share its name gets a number behind."""
    names: list[str] = []
    for path in paths:
        name = stem = _plain(Path(path).stem)
        number = 1
        while name in names:
            number += 1
            name = f"{stem}-{number}"
        names.append(name)
    return names


def _plain(text: str) -> str:
    """Keep what every file system takes in a name."""
    return "".join(sign if sign.isalnum() or sign in "-_." else "-" for sign in text)
