"""Shutter: which exposure to dial in, and how exactly."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass, replace
from typing import Any

import numpy as np

from flicker.camera import contrast
from flicker.camera.bands import check_share, deepest_pulsing, line_delays
from flicker.camera.exposed import Family, Windows, deciding_channels, windows
from flicker.camera.sensor import Camera
from flicker.light import Light
from flicker.trace import FloatArray

CONTRAST_LIMIT = 0.01  # up to which a setting is called clean; common practice, no source: 1 to 2 %

# Dials in use: fractions of a second, and shutter angles [degrees]; common practice, no source
# fmt: off
FRACTIONS = (
    24, 25, 30, 40, 48, 50, 60, 80, 96, 100, 120, 125, 150, 160, 180, 192, 200, 240, 250, 300, 320, 400, 480, 500,
    600, 640, 800, 960, 1000, 1200, 1250, 1600, 2000, 2400, 2500, 3200, 4000, 5000, 6400, 8000,
)
ANGLES = (
    360.0, 345.6, 300.0, 288.0, 270.0, 259.2, 240.0, 216.0, 180.0, 172.8, 150.0, 144.0, 120.0, 108.0, 90.0, 86.4,
    75.0, 72.0, 60.0, 45.0, 36.0, 30.0, 22.5, 15.0, 11.25, 5.6,
)
# fmt: on
FRAME_RATES = (24000 / 1001, 24.0, 25.0, 30000 / 1001, 30.0, 48.0, 50.0, 60000 / 1001, 60.0, 96.0, 100.0, 120.0)


@dataclass(frozen=True, slots=True)
class Setting:
    """An exposure with what it leaves of the bands, and how far it may be off; None where it is not clean at all."""

    exposure_s: float
    label: str
    contrast_percent: float
    worst_contrast_percent: float
    worst_frame_flicker_percent: float | None
    clean: bool
    angle_deg: float | None
    cycles: float | None  # of the light in the exposure
    window_percent: tuple[float, float] | None = None  # exposure or frequency may be off by this much: below, above
    window_deg: tuple[float, float] | None = None  # the same in degrees of shutter angle

    @property
    def deepest(self) -> float:
        """What ranks the setting: contrast or frame flicker, whichever is larger. [%]"""
        return max(self.worst_contrast_percent, self.worst_frame_flicker_percent or 0.0)

    def to_dict(self) -> dict[str, Any]:
        """Give an entry of `advice`."""
        return asdict(self)


def exposure_label(exposure: float, frame_rate: float | None = None) -> str:
    """
    Name an exposure [s] as people dial it: a fraction, and the shutter angle where the frame rate is known.

    Examples
    --------
    >>> exposure_label(1 / 50, 25.0)
    '1/50 s, 180°'
    >>> exposure_label(0.0175)
    '1/57.14 s'
    """
    if exposure >= 0.4:
        text = f"{exposure:g} s"
    else:
        text = f"1/{1 / exposure:.4g} s" if 1 / exposure < 9999.5 else f"1/{1 / exposure:.0f} s"
    return text if frame_rate is None else f"{text}, {_angle(exposure, frame_rate)}"


def _angle(exposure: float, frame_rate: float) -> str:
    return f"{float(f'{360 * exposure * frame_rate:.5g}'):.2f}".rstrip("0").rstrip(".") + "°"


def offered(camera: Camera, frequency: float | None = None, wanted: Sequence[float] = ()) -> tuple[float, ...]:
    """
    Exposures that can be dialled in [s]: the camera's own and those wanted, or those in use that fit into a frame.

    In the second case the exact nulls of a light of `frequency` [Hz] that lie nearest to the wanted exposures and to
    half a frame are among them, for cameras whose shutter is set freely.
    """
    if camera.exposures:
        fits = [one for one in wanted if camera.frame_rate is None or one * camera.frame_rate <= 1.0 + 1e-9]
        found: Iterable[float] = [*camera.exposures, *fits]
    else:
        found = [1.0 / number for number in FRACTIONS]
        if camera.frame_rate is not None:
            found = [*found, *(angle / 360.0 / camera.frame_rate for angle in ANGLES)]
        if frequency is not None:
            centres = [*wanted, *([0.5 / camera.frame_rate] if camera.frame_rate else [])]
            near = {max(1, round(frequency * centre)) + step for centre in centres for step in (-1, 0, 1)}
            found = [*found, *(number / frequency for number in near if number >= 1)]
        longest = math.inf if camera.frame_rate is None else (1.0 + 1e-9) / camera.frame_rate
        found = [exposure for exposure in found if exposure <= longest]
    different: list[float] = []
    for exposure in sorted(found, reverse=True):
        if not different or exposure < different[-1] * (1 - 1e-7):
            different.append(exposure)
    return tuple(different)


def rank(
    light: Light,
    camera: Camera,
    *,
    exposures: Sequence[float] | None = None,
    tolerance: float = 0.0,
    limit: float = CONTRAST_LIMIT,
    wanted: float | None = None,
    light_scan: float = 0.0,
) -> list[Setting]:
    """Rank exposures as `advise` does, all of them and without their windows."""
    check_share(tolerance, "tolerance")
    if exposures is None:
        exposures = offered(camera, light.frequency, () if wanted is None else (wanted,))
    groups = deciding_channels(light)
    centre = wanted or (0.5 / camera.frame_rate if camera.frame_rate else 1 / 50)
    settings = [_setting(light, groups, camera, exposure, tolerance, limit, light_scan) for exposure in exposures]
    return sorted(settings, key=lambda one: (round(one.deepest, 3), abs(math.log(one.exposure_s / centre))))


def advise(light: Light, camera: Camera, *, most: int = 12, **how: Any) -> tuple[Setting, ...]:
    """
    Rank exposures by the deepest bands that they leave while the light's frequency is off by up to `tolerance`.

    Parameters
    ----------
    light, camera
        As in `predict_bands`.
    most : int
        How many settings to give at most.
    exposures : sequence of float or None
        What can be dialled in [s]; None asks `offered`.
    tolerance : float
        Share of the frequency, 0.01 for 1 %.
    limit : float
        Contrast up to which a setting is clean, 0.01 for 1 %.
    wanted : float or None
        Exposure that one would like to have; among equally good ones the nearest comes first. None: half a frame. [s]
    light_scan : float
        As in `predict_bands`. [s]

    Returns
    -------
    tuple of Setting
        Best first.
    """
    limit, light_scan = how.get("limit", CONTRAST_LIMIT), how.get("light_scan", 0.0)
    settings = rank(light, camera, **how)[:most]
    return tuple(with_window(light, camera, one, limit, light_scan) for one in settings)


def _setting(
    light: Light,
    groups: Sequence[Sequence[Family]],
    camera: Camera,
    exposure: float,
    tolerance: float,
    limit: float,
    light_scan: float,
) -> Setting:
    delays = line_delays(camera, light_scan)
    seen = windows(exposure, binning=camera.line_binning, line_time=camera.line_time)
    nominal = deepest_contrast(groups, seen, delays, 0.0)
    worst = max(nominal, deepest_contrast(groups, seen, delays, tolerance)) if tolerance else nominal
    pulsing = deepest_pulsing(groups, camera, seen, tolerance)
    return Setting(
        exposure_s=exposure,
        label=exposure_label(exposure, camera.frame_rate),
        contrast_percent=100 * nominal,
        worst_contrast_percent=100 * worst,
        worst_frame_flicker_percent=None if pulsing is None else 100 * pulsing,
        clean=max(worst, pulsing or 0.0) <= limit,
        angle_deg=None if camera.frame_rate is None else 360 * exposure * camera.frame_rate,
        cycles=None if light.frequency is None else exposure * light.frequency,
    )


def deepest_contrast(
    groups: Sequence[Sequence[Family]], seen: Windows, delays: FloatArray | None, tolerance: float
) -> float:
    """Largest contrast of any channel over the tolerance, 0..1; `groups` are the families of each channel."""
    return max(contrast.worst(families, seen, delays, tolerance) for families in groups)


def with_window(
    light: Light, camera: Camera, setting: Setting, limit: float = CONTRAST_LIMIT, light_scan: float = 0.0
) -> Setting:
    """Add to a clean setting how far its exposure may be off; arguments as in `advise`."""
    groups = deciding_channels(light)
    if not setting.clean or not any(groups):
        return setting
    delays = None if camera.shutter == "global" else line_delays(camera, light_scan)

    def clean(exposure: float) -> bool:
        seen = windows(exposure, binning=camera.line_binning, line_time=camera.line_time)
        return deepest_contrast(groups, seen, delays, 0.0) <= limit

    below, above = (_edge(setting.exposure_s, clean, sign) for sign in (-1.0, 1.0))
    degrees = None if setting.angle_deg is None else (setting.angle_deg * below, setting.angle_deg * above)
    return replace(setting, window_percent=(100 * below, 100 * above), window_deg=degrees)


def _edge(exposure: float, clean: Any, sign: float) -> float:
    """Find how far, as a share, the exposure may be off before it is no longer clean; at most a half."""
    inside, outside = 0.0, None
    for off in np.geomspace(1e-5, 0.5, 40):
        if not clean(exposure * (1 + sign * off)):
            outside = float(off)
            break
        inside = float(off)
    if outside is None:
        return inside
    for _ in range(12):
        middle = 0.5 * (inside + outside)
        inside, outside = (middle, outside) if clean(exposure * (1 + sign * middle)) else (inside, middle)
    return inside


def standing_frame_rates(frequency: float, near: float | None = None) -> tuple[float, ...]:
    """
    Frame rates [Hz] in use at which the bands of a light stand still, and the exact one nearest to `near`.

    A light of whole cycles in a frame meets every frame in the same phase.
    """
    found = [rate for rate in FRAME_RATES if abs(frequency - round(frequency / rate) * rate) * 60.0 < 1.0]
    if near is not None and frequency >= near / 2:
        exact = frequency / max(1, round(frequency / near))
        if all(abs(exact - rate) > 1e-3 for rate in found):
            found.append(exact)
    return tuple(sorted(found))
