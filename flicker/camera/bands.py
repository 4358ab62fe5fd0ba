"""Bands: what a camera records of a light."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from flicker.camera import contrast, visibility
from flicker.camera.colour import BandColours, band_colours
from flicker.camera.exposed import Family, Windows, families_of, windows
from flicker.camera.sensor import Camera, unknown
from flicker.errors import InputError
from flicker.light import Light
from flicker.markup import element, items, markup, table
from flicker.trace import FloatArray

ASSUMED_LINES = 1024  # of a picture of which only the readout time is known
_NOTHING_LEFT = 1e-9


@dataclass(frozen=True, slots=True)
class Prediction:
    """
    What one exposure records; the fields are those of the JSON, None where `reasons` says why.

    Contrasts are (max - min)/(max + min) of light, not of code values.
    """

    exposure_s: float | tuple[float, ...]
    band_period_lines: float | None
    bands_per_frame: float | None
    contrast_percent: dict[str, float]
    drift_lines_per_frame: float | None
    drift_seconds_per_band: float | None
    standing: bool | None
    frame_flicker_percent: dict[str, float | None]
    aliased: bool | None
    worst_contrast_percent: float
    visible: bool
    worst_frame_flicker_percent: float | None = None
    beat_frequency_hz: float | None = None
    visibility: str = "invisible"
    worst_visibility: str = "invisible"
    threshold_percent: float = 0.0
    wander_contrast_percent: float | None = None
    colours: BandColours | None = None
    reasons: dict[str, str] = field(default_factory=dict)

    @property
    def deepest(self) -> float:
        """Largest contrast or frame flicker of a channel. [%]"""
        frames = [value for value in self.frame_flicker_percent.values() if value is not None]
        return max([*self.contrast_percent.values(), *frames])

    def to_dict(self) -> dict[str, Any]:
        """Give an entry of `predictions`."""
        entry = {item.name: getattr(self, item.name) for item in dataclasses.fields(self)}
        entry["colours"] = self.colours.to_dict() if self.colours else None
        if self.reasons:
            entry["reason"] = "; ".join(dict.fromkeys(self.reasons.values()))
        return entry

    def rows(self) -> list[dict[str, Any]]:
        """
        List what each channel shows, one row each: what `pandas.DataFrame` and its like take.

        Returns
        -------
        list of dict
            Keys `exposure_s`, `channel`, `contrast_percent`, `frame_flicker_percent`, and those of the JSON that all
            channels share.
        """
        return [
            {
                "exposure_s": self.exposure_s,
                "channel": name,
                "contrast_percent": contrast,
                "frame_flicker_percent": self.frame_flicker_percent.get(name),
                "worst_contrast_percent": self.worst_contrast_percent,
                "band_period_lines": self.band_period_lines,
                "drift_lines_per_frame": self.drift_lines_per_frame,
                "visibility": self.visibility,
            }
            for name, contrast in self.contrast_percent.items()
        ]

    def _repr_html_(self) -> str:
        """Show the prediction in a notebook."""
        rows = self.rows()
        shown = [[_shown(value) for name, value in row.items() if name != "exposure_s"] for row in rows]
        head = [name.replace("_percent", " (%)").replace("_", " ") for name in rows[0] if name != "exposure_s"]
        lengths = self.exposure_s if isinstance(self.exposure_s, tuple) else (self.exposure_s,)
        title = " + ".join(f"{1e3 * one:.4g} ms" for one in lengths)
        said = element("p", element("strong", title), f": {self.visibility}")
        return markup(said, table(head, shown), items(dict.fromkeys(self.reasons.values())))


def _shown(value: object) -> object:
    return "\N{EN DASH}" if value is None else f"{value:.4g}" if isinstance(value, float) else value


@dataclass(frozen=True, slots=True)
class _Pattern:
    """Movement of the strongest line over lines and frames."""

    frequency: float  # [Hz]
    cycles_per_line: float | None  # folded, -0.5 to 0.5
    aliased: bool | None
    cycles_per_frame: float | None  # folded, -0.5 to 0.5


def predict_bands(
    light: Light,
    camera: Camera,
    exposure: float | Sequence[float] | None = None,
    tolerance: float = 0.0,
    *,
    light_scan: float = 0.0,
    wander: float | None = None,
    viewing_distance: float | None = None,
    gain: float = 1.0,
) -> Prediction:
    r"""
    Predict what a camera records of a light.

    Parameters
    ----------
    light : Light
        The light, measured or typed in.
    camera : Camera
        The camera; what is unknown of it leaves gaps in the answer, each with its reason.
    exposure : float, or several floats
        Exposure [s]; several are staggered exposures that the sensor takes one after the other and adds up. May be
        left out if the camera offers exactly one.
    tolerance : float
        How far the light's frequency may be off, as a share of it: 0.01 is 1 %.
    light_scan : float
        Time by which the light at the end of the picture lags that at its start, counted the way the lines are read,
        as behind a scanning backlight. [s]
    wander : float, optional
        How far the frequency wanders to either side while the camera looks (spread spectrum, dither), as a share of it;
        otherwise as the light was measured.
    viewing_distance : float or None
        In picture heights; None judges from the distance that shows the bands best.
    gain : float
        Factor by which grading raises the contrast.

    Returns
    -------
    Prediction
        Contrasts of the worst start phase, movement of the strongest line.

    Raises
    ------
    InputError
        If a value cannot be right, or the exposure is unknown.

    Notes
    -----
    Line :math:`n` of frame :math:`k` averages the light over the exposure :math:`T` from
    :math:`k / F + n t_L` on, which leaves :math:`\mathrm{sinc}(f T)` of a line at :math:`f`, with its sign. The
    light's phase :math:`f t_L` a line and :math:`f / F` a frame, both folded to half a cycle, give period and
    drift. Rectangles are integrated exactly, other light by its lines.

    Examples
    --------
    >>> from flicker.light import pwm_light
    >>> camera = Camera(lines=1080, line_time=14.8e-6, frame_rate=25.0)
    >>> bands = predict_bands(pwm_light(frequency=240.0, duty=0.05), camera, exposure=1 / 50)
    >>> round(bands.contrast_percent["all"], 2), round(bands.band_period_lines)
    (11.11, 282)
    """
    seen = _windows(camera, exposure)
    check_share(tolerance, "tolerance")
    wander = light.wander if wander is None else wander
    check_share(wander, "wander")
    if not (math.isfinite(gain) and gain > 0):
        raise InputError(f"the gain of the grading must be above 0, not {gain}")
    line_time, lines = apparent_line_time(camera, light_scan)
    delays = line_delays(camera, light_scan)
    families = {channel.name: families_of(channel) for channel in light}
    found = {name: contrast.worst(group, seen, delays, 0.0) for name, group in families.items()}
    if tolerance > 0:
        over_all = max(contrast.worst(group, seen, delays, tolerance) for group in families.values())
    else:
        over_all = max(found.values())
    frames = {name: _frame_flicker(group, seen, camera, line_time, lines) for name, group in families.items()}
    reasons: dict[str, str] = {}
    pattern = _pattern(light, seen, camera, line_time, reasons)
    if camera.frame_rate is None:
        reasons["frame_flicker_percent"] = unknown("frame_rate")
    period, bands = _pitch(pattern, camera, light_scan, reasons)
    drift, seconds, standing = _movement(pattern, camera, reasons)
    limit = visibility.band_threshold(bands, viewing_distance)
    flickers = [value for value in frames.values() if value is not None]
    over_all = max(over_all, *found.values())
    pulsing = deepest_pulsing(tuple(families.values()), camera, seen, tolerance)

    def words(contrast: float, flicker: float) -> str:
        seen_bands = visibility.in_words(gain * contrast, limit)
        return max(
            seen_bands, visibility.in_words(gain * flicker, visibility.FLICKER_THRESHOLD), key=visibility.WORDS.index
        )

    nominal = words(max(found.values()), max(flickers, default=0.0))
    return Prediction(
        exposure_s=seen.lengths[0] if len(seen.lengths) == 1 else seen.lengths,
        band_period_lines=period,
        bands_per_frame=bands,
        contrast_percent={name: 100.0 * value for name, value in found.items()},
        drift_lines_per_frame=drift,
        drift_seconds_per_band=seconds,
        standing=standing,
        frame_flicker_percent={name: None if value is None else 100.0 * value for name, value in frames.items()},
        aliased=pattern.aliased if pattern else False,
        worst_contrast_percent=100.0 * over_all,
        worst_frame_flicker_percent=None if pulsing is None else 100.0 * pulsing,
        visible=nominal != visibility.WORDS[0],
        beat_frequency_hz=None
        if pattern is None or pattern.cycles_per_frame is None or camera.frame_rate is None
        else pattern.cycles_per_frame * camera.frame_rate,
        visibility=nominal,
        worst_visibility=max(nominal, words(over_all, pulsing or 0.0), key=visibility.WORDS.index),
        threshold_percent=100.0 * limit / gain,
        wander_contrast_percent=100.0 * max(contrast.wandering(group, seen, wander) for group in families.values())
        if wander
        else None,
        colours=band_colours(light, seen),
        reasons=reasons,
    )


def check_share(value: float, what: str) -> None:
    """Refuse a share of the frequency that is below 0 or absurdly large; `InputError`."""
    if not 0 <= value < 0.5:
        raise InputError(f"a {what} is a share of the frequency from 0 to below 0.5 (0.01 is 1 %), not {value}")


def _windows(camera: Camera, exposure: float | Sequence[float] | None) -> Windows:
    if exposure is None:
        if len(camera.exposures) != 1:
            raise InputError(unknown("exposure"))
        exposure = camera.exposures[0]
    return windows(exposure, binning=camera.line_binning, line_time=camera.line_time)


def apparent_line_time(camera: Camera, light_scan: float = 0.0) -> tuple[float | None, int | None]:
    """
    Time between lines as the light sees it, and the number of lines; what is not known is None.

    A light that scans the way the lines are read makes it shorter. [s]
    """
    if camera.shutter == "global":
        return 0.0, camera.lines or 1
    if camera.line_time is not None:
        scan = light_scan / camera.lines if camera.lines is not None else 0.0
        if light_scan and camera.lines is None:
            raise InputError(unknown("lines"))
        return camera.line_time - scan, camera.lines
    if camera.readout_time is not None:
        return (camera.readout_time - light_scan) / ASSUMED_LINES, ASSUMED_LINES
    return None, camera.lines


def line_delays(camera: Camera, light_scan: float = 0.0) -> FloatArray | None:
    """How much later than its first line the other lines of a frame start, shape (lines - 1,); None if unknown. [s]"""
    line_time, lines = apparent_line_time(camera, light_scan)
    if camera.shutter == "global":
        return np.zeros(0)
    if line_time is None or lines is None:
        return None
    return np.asarray(np.arange(1, lines) * abs(line_time))


def frame_delays(camera: Camera) -> FloatArray | None:
    """How much later than a first frame the other frames of a minute start, shape (frames,); None if unknown. [s]"""
    if camera.frame_rate is None:
        return None
    frames = max(2, min(int(contrast.STANDS * camera.frame_rate), 20_000))
    return np.asarray(np.arange(1, frames) / camera.frame_rate)


def deepest_pulsing(
    groups: Sequence[Sequence[Family]], camera: Camera, seen: Windows, tolerance: float
) -> float | None:
    """
    Largest frame flicker of any channel over the tolerance, 0..1, where it is not smaller than the bands anyway.

    None behind a rolling shutter that shows a band or more, since the lines average it down, and where frame rate
    or readout time are unknown. With less than a band in the picture it is the bound of all lines at once.
    """
    slowest = min((family.frequency for families in groups for family in families), default=math.inf)
    if camera.shutter == "rolling" and (camera.readout_time is None or slowest * camera.readout_time >= 1.0):
        return None
    delays = frame_delays(camera)
    if delays is None:
        return None
    return max(
        contrast.worst(families, seen, None if tolerance else contrast.moving(families, delays), tolerance)
        for families in groups
    )


def _frame_flicker(
    families: Sequence[Family], seen: Windows, camera: Camera, line_time: float | None, lines: int | None
) -> float | None:
    delays = frame_delays(camera)
    if delays is None or line_time is None or lines is None:
        return None
    if not families:
        return 0.0
    if camera.shutter == "global":
        return contrast.worst(families, seen, contrast.moving(families, delays), 0.0)
    blurred = [family.averaged(seen, line_time, lines) for family in families]
    frequencies = np.array([family.frequency for family in families])
    return contrast.of_blurred(blurred, contrast.moving(families, delays)[:, None] * frequencies)


def _pattern(
    light: Light, seen: Windows, camera: Camera, line_time: float | None, reasons: dict[str, str]
) -> _Pattern | None:
    """Follow the line that keeps the most contrast, or the light's strongest one where nothing is left of any."""
    frequencies = np.concatenate([channel.frequencies for channel in light])
    before = np.abs(np.concatenate([channel.amplitudes for channel in light]))
    if not before.size or before.max() == 0:
        for name in ("band_period_lines", "drift_lines_per_frame", "drift_seconds_per_band"):
            reasons[name] = "the light is steady: there are no bands"
        return None
    left = before * np.abs(seen.transfer(frequencies))
    number = int(np.argmax(left if left.max() > _NOTHING_LEFT else before))
    frequency = float(frequencies[number])
    per_line = aliased = None
    if line_time is not None and camera.shutter == "rolling":
        turns = frequency * line_time
        per_line = turns - round(turns)
        aliased = abs(turns) > 0.5
    per_frame = None
    if camera.frame_rate is not None:
        turns = frequency / camera.frame_rate
        per_frame = turns - round(turns)
    return _Pattern(frequency, per_line, False if camera.shutter == "global" else aliased, per_frame)


def _pitch(
    pattern: _Pattern | None, camera: Camera, light_scan: float, reasons: dict[str, str]
) -> tuple[float | None, float | None]:
    """Band period in lines, and bands in a frame."""
    if pattern is None:
        return None, 0.0
    if camera.shutter == "global":
        reasons["band_period_lines"] = (
            "a global shutter exposes all lines at once: the whole picture pulses, without bands"
        )
        return None, 0.0
    if pattern.cycles_per_line is None:
        reasons["band_period_lines"] = unknown("line_time")
        return None, None
    _, lines = apparent_line_time(camera, light_scan)
    bands = None if lines is None else lines * abs(pattern.cycles_per_line)
    if bands is None:
        reasons["bands_per_frame"] = unknown("lines")
    if camera.line_time is None:
        reasons["band_period_lines"] = unknown("lines")
        return None, bands
    if abs(pattern.cycles_per_line) < 1e-12:
        reasons["band_period_lines"] = "every line meets the light in the same phase: the picture shows no bands"
        return None, bands
    return 1.0 / abs(pattern.cycles_per_line), bands


def _movement(
    pattern: _Pattern | None, camera: Camera, reasons: dict[str, str]
) -> tuple[float | None, float | None, bool | None]:
    """Drift in lines a frame, seconds for one band, and whether the bands stand still."""
    if pattern is None:
        return None, None, False
    if camera.frame_rate is None or pattern.cycles_per_frame is None:
        reasons["drift_lines_per_frame"] = reasons["drift_seconds_per_band"] = unknown("frame_rate")
        return None, None, None
    beat = pattern.cycles_per_frame * camera.frame_rate
    standing = abs(beat) * contrast.STANDS < 1.0
    seconds = 1.0 / abs(beat) if abs(beat) > 1e-9 else None
    if seconds is None:
        reasons["drift_seconds_per_band"] = "the bands stand still"
    if pattern.cycles_per_line is None or camera.line_time is None:
        reasons["drift_lines_per_frame"] = reasons.get("band_period_lines", unknown("line_time"))
        return None, seconds, standing
    if abs(pattern.cycles_per_line) < 1e-12:
        reasons["drift_lines_per_frame"] = reasons["band_period_lines"]
        return None, seconds, standing
    return -pattern.cycles_per_frame / pattern.cycles_per_line, seconds, standing
