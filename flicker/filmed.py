"""Videos as light: what the readers, the cameras and the limits make of a film together."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from flicker import __version__
from flicker.camera import Camera
from flicker.camera.line_time import LineTime, measure_line_time
from flicker.camera.screen import ScreenMap, map_screen
from flicker.camera.stripes import ChannelStripes, Stripes, read_stripes
from flicker.errors import InputError
from flicker.footage import Footage, ReadDirection
from flicker.light import Light
from flicker.limits import risk_region
from flicker.readers.video import Region, read_footage
from flicker.results import Family, Measure

_BANDS_BELOW = (40, 90, 200, 400, 1000)


@dataclass(frozen=True, slots=True, eq=False)
class FilmReport:
    """What the stripes of one video say, in the form of a report."""

    path: str
    stripes: Stripes

    @property
    def light(self) -> Light:
        """The light of all channels, for prediction."""
        return self.stripes.light

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        stripes, footage = self.stripes, self.stripes.footage
        capture = {
            "path": self.path,
            "kind": "video",
            "sha256": footage.sha256,
            "sample_rate_hz": 1 / stripes.line_time if stripes.line_time else None,
            "samples": footage.frames * footage.lines,
            "duration_s": footage.duration,
            "start_s": float(footage.times[0]),
            "line_time_s": stripes.line_time,
            "fitted_line_time_s": stripes.fitted_line_time.to_dict(),
            "exposure_s": stripes.exposure,
            "exposure_told": stripes.exposure_told,
            "frame_rate_hz": footage.frame_rate,
            "frames": footage.frames,
            "lines": footage.lines,
            "read_direction": footage.read_direction,
            **footage.details,
        }
        channels = [self._channel(channel) for channel in stripes.channels]
        one = {"capture": capture, "channels": channels, "alternatives": list(stripes.alternatives)}
        return {"format": "flicker-report", "version": 1, "program": __version__, "captures": [one]}

    def families(self, channel: ChannelStripes) -> tuple[Family, ...]:
        """Families of lines, one a light, where their frequencies are known."""
        place = self.stripes.channels.index(channel)
        found = []
        for light, own in [
            (self.stripes, channel.own or channel.measures),
            *((other, other.channels[place].measures) for other in self.stripes.others),
        ]:
            if light.frequency.value is not None:
                base = light.frequency.value
                lines = sum(
                    abs(one.frequency / base - round(one.frequency / base)) < 1e-6 for one in channel.components
                )
                depth = own["percent_flicker"]
                found.append(Family(light.frequency, depth, max(lines, 1), "read from the stripes of a video"))
        return tuple(sorted(found, key=lambda family: -(family.percent_flicker.value or 0.0)))

    def region(self, channel: ChannelStripes) -> Any:
        """Risk region of a channel, None where its depth is unknown."""
        if channel.measures["percent_flicker"].value is None or self.stripes.frequency.value is None:
            return None
        return risk_region(channel.components, self.families(channel))

    def _channel(self, channel: ChannelStripes) -> dict[str, Any]:
        region = self.region(channel)
        measures = {name: measure.to_dict() for name, measure in channel.measures.items()}
        gaps = "frames have gaps between them, so that slow light cannot be followed: use a photodiode"
        for name in ("pst_lm", *(f"percent_flicker_below_{edge}hz" for edge in _BANDS_BELOW)):
            unit = "1" if name == "pst_lm" else "%"
            measures.setdefault(name, Measure.missing(unit, gaps).to_dict())
        return {
            "name": channel.name,
            "level": {"mean": channel.mean, "unit": "of white", "dark": 0.0, "mean_known": True},
            "notes": [note.to_dict() for note in self.stripes.notes],
            "measures": measures,
            "band_contrast_percent": 100 * min(channel.bands.contrast, 1.0),
            "components": [line.to_dict() for line in channel.components],
            "families": [family.to_dict() for family in self.families(channel)],
            "risk_region": region.to_dict() if region else None,
            "verdicts": [],
            "history": [
                *self.stripes.footage.history,
                "scene and light separated jointly, every line at its true time",
            ],
        }


def read_back(
    path: str | Path,
    *,
    line_time: float | None = None,
    line_rate: float | None = None,
    readout_time: float | None = None,
    exposure: float | None = None,
    read_direction: ReadDirection | None = None,
    frame_rate: float | None = None,
    region: Region | None = None,
    transfer: str | None = None,
    start: float | None = None,
    duration: float | None = None,
    clock_ppm: float | None = None,
) -> FilmReport:
    """
    Read the light of a rolling-shutter video back from its stripes.

    Parameters
    ----------
    path : str or Path
        The video.
    line_time, line_rate, readout_time : float, optional
        Any one of them: seconds a line, lines/s, or seconds for all lines of a frame.
    exposure : float, optional
        Seconds that a line collects light.
    read_direction : {"down", "up", "left", "right"}, optional
        Down if not given.
    frame_rate, region, transfer, start, duration
        See `flicker.readers.video.read_footage`.
    clock_ppm : float, optional
        Standard uncertainty of the camera's clock. [1e-6]

    Returns
    -------
    FilmReport
        Its `light` is what prediction needs.

    Raises
    ------
    InputError
        If more than one of line time, line rate and readout time is given.
    NotMeasurable
        If no moving bands are found.
    """
    footage = read_footage(
        path,
        read_direction=read_direction or "down",
        frame_rate=frame_rate,
        region=region,
        transfer=transfer,
        start=start or 0.0,
        duration=duration,
    )
    line_time = _line_time(footage, line_time, line_rate, readout_time)
    stripes = read_stripes(footage, line_time=line_time, exposure=exposure, clock=1e-6 * (clock_ppm or 0.0))
    return FilmReport(str(path), stripes)


def from_camera(file: str | Path, how: dict[str, Any]) -> dict[str, Any]:
    """Fill in what a camera file says of line time and read direction where `how` leaves them open."""
    camera = Camera.load(file)
    filled = dict(how)
    if all(how.get(name) is None for name in ("line_time", "line_rate", "readout_time")):
        filled["line_time"] = camera.line_time
    filled["read_direction"] = how.get("read_direction") or camera.read_direction
    return filled


def find_line_time(
    path: str | Path,
    light_frequency: float,
    *,
    light_ppm: float = 0.0,
    frame_rate: float | None = None,
    region: Region | None = None,
    transfer: str | None = None,
    read_direction: str | None = None,
    start: float | None = None,
    duration: float | None = None,
) -> LineTime:
    """
    Measure a camera's line time from a video of a light of known frequency; any read direction is found.

    Parameters
    ----------
    path : str or Path
        The video.
    light_frequency : float
        [Hz]
    light_ppm : float
        Standard uncertainty of it. [1e-6]
    frame_rate, region, transfer, start, duration
        See `flicker.readers.video.read_footage`.
    read_direction : {"down", "up", "left", "right"}, optional
        Looked for if not given.

    Returns
    -------
    LineTime
        Its `camera` is a `Camera` for prediction.
    """
    how: dict[str, Any] = {"frame_rate": frame_rate, "region": region, "transfer": transfer, "colour": False}
    how |= {"start": start or 0.0, "duration": duration}
    directions = (read_direction,) if read_direction else ("down", "right")
    views = []
    for direction in directions:
        view = read_footage(path, read_direction=direction, **how)  # type: ignore[arg-type]
        views.append(view)
        if not read_direction:
            opposite: Any = {"down": "up", "right": "left"}[direction]
            turned = dataclasses.replace(
                view,
                light=view.light[:, ::-1],
                weight=view.weight[::-1],
                read_direction=opposite,
                first_line=view.lines_of_frame - view.first_line - view.lines,
            )
            views.append(turned)
    return measure_line_time(views, light_frequency, uncertainty=1e-6 * light_ppm)


def _line_time(
    footage: Footage, line_time: float | None, line_rate: float | None, readout_time: float | None
) -> float | None:
    given = [value for value in (line_time, line_rate, readout_time) if value is not None]
    if len(given) > 1:
        raise InputError(f"give one of line time, line rate and readout time, not {len(given)}")
    if line_rate is not None:
        return 1.0 / line_rate
    return line_time if readout_time is None else readout_time / footage.lines_of_frame


def map_video(
    path: str | Path,
    *,
    rows: int = 12,
    columns: int = 16,
    line_time: float | None = None,
    line_rate: float | None = None,
    readout_time: float | None = None,
    exposure: float | None = None,
    read_direction: ReadDirection | None = None,
    frame_rate: float | None = None,
    region: Region | None = None,
    transfer: str | None = None,
    start: float | None = None,
    duration: float | None = None,
) -> ScreenMap:
    """
    Map the flicker over the picture of a video.

    Parameters
    ----------
    path : str or Path
        The video.
    rows, columns : int
        Cells of the grid, in the picture as stored.
    line_time, line_rate, readout_time, exposure, read_direction, frame_rate, region, transfer, start, duration
        See `read_back`.

    Returns
    -------
    ScreenMap
        Grids and zones.
    """
    sideways = read_direction in ("left", "right")
    footage = read_footage(
        path,
        read_direction=read_direction or "down",
        blocks=rows if sideways else columns,
        colour=False,
        frame_rate=frame_rate,
        region=region,
        transfer=transfer,
        start=start or 0.0,
        duration=duration,
    )
    time = _line_time(footage, line_time, line_rate, readout_time)
    return map_screen(footage, columns if sideways else rows, line_time=time, exposure=exposure)
