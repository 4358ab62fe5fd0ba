"""Plan: which exposure and frame rate keeps every light clean on every camera."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.camera import contrast
from flicker.camera.bands import check_share, deepest_pulsing, line_delays
from flicker.camera.exposed import Family, Windows, deciding_channels, windows
from flicker.camera.sensor import Camera, unknown
from flicker.camera.shutter import CONTRAST_LIMIT, exposure_label
from flicker.errors import InputError
from flicker.light import Light
from flicker.trace import FloatArray

_FITS = 1 + 1e-6  # a frame must hold exposure and readout, but for rounding


@dataclass(frozen=True, slots=True)
class PlannedCamera:
    """A camera with the frame rates [Hz] and exposures [s] to choose from."""

    camera: Camera
    name: str
    frame_rates: tuple[float, ...]
    exposures: tuple[float, ...]


@dataclass(frozen=True, slots=True)
class PlanSetting:
    """One camera, frame rate and exposure, with what it leaves of every light. [%]"""

    camera: str
    frame_rate_hz: float
    exposure_s: float
    worst_contrast_percent: float
    worst_frame_flicker_percent: float | None  # where it may exceed the contrast, else None
    worst_light: str
    clean: bool
    contrast_percent: dict[str, float]  # what ranks, of each light
    without_worst_light_percent: float | None  # what the others leave; None for a single light
    standing: tuple[str, ...] = ()  # lights whose bands stand still at this frame rate

    @property
    def deepest(self) -> float:
        """What ranks the setting. [%]"""
        return max(self.contrast_percent.values())

    @property
    def label(self) -> str:
        """Frame rate and exposure as people dial them."""
        return f"{self.frame_rate_hz:.6g} frames/s, {exposure_label(self.exposure_s, self.frame_rate_hz)}"

    def to_dict(self) -> dict[str, Any]:
        """Give an entry of `settings`."""
        return {
            "camera": self.camera,
            "frame_rate_hz": self.frame_rate_hz,
            "exposure_s": self.exposure_s,
            "label": self.label,
            "worst_contrast_percent": self.worst_contrast_percent,
            "worst_frame_flicker_percent": self.worst_frame_flicker_percent,
            "worst_light": self.worst_light,
            "clean": self.clean,
            "light_contrast_percent": self.contrast_percent,
            "without_worst_light_percent": self.without_worst_light_percent,
            "standing_lights": list(self.standing),
        }


@dataclass(frozen=True, slots=True)
class SharedSetting:
    """A frame rate and exposure that every camera has, with the worst pair of camera and light."""

    frame_rate_hz: float
    exposure_s: float
    worst_contrast_percent: float
    worst_camera: str
    worst_light: str
    clean: bool

    def to_dict(self) -> dict[str, Any]:
        """Give `best_for_all_cameras`."""
        return {name: getattr(self, name) for name in self.__slots__}


@dataclass(frozen=True, slots=True)
class Plan:
    """The JSON of `flicker plan` as objects; settings best first."""

    lights: tuple[str, ...]
    cameras: tuple[str, ...]
    settings: tuple[PlanSetting, ...]
    shared: tuple[SharedSetting, ...]
    tolerance: float | None
    limit: float
    impossible: int = 0  # settings whose exposure or readout does not fit into the frame

    @property
    def best(self) -> PlanSetting | None:
        """The setting with the least left of its worst light."""
        return self.settings[0] if self.settings else None

    def best_of(self, camera: str) -> PlanSetting | None:
        """The best setting of one camera, None if none fits."""
        return next((setting for setting in self.settings if setting.camera == camera), None)

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        best_each = {name: self.best_of(name) for name in self.cameras}
        return {
            "tolerance_percent": None if self.tolerance is None else 100 * self.tolerance,
            "contrast_limit_percent": 100 * self.limit,
            "lights": list(self.lights),
            "settings": [setting.to_dict() for setting in self.settings],
            "best": self.best.to_dict() if self.best else None,
            "best_of_each_camera": {name: one.to_dict() if one else None for name, one in best_each.items()},
            "best_for_all_cameras": self.shared[0].to_dict() if self.shared else None,
            "impossible_settings": self.impossible,
        }


def make_plan(
    lights: Mapping[str, Light],
    cameras: Sequence[PlannedCamera],
    *,
    tolerance: float | Mapping[str, float] | None = None,
    limit: float = CONTRAST_LIMIT,
) -> Plan:
    """
    Rank all settings of all cameras by the worst light.

    Parameters
    ----------
    lights : mapping
        Lights by name.
    cameras : sequence of PlannedCamera
        What can be set.
    tolerance : float, mapping or None
        Share by which each light's frequency may be off, one for all or by name; None takes them as exact.
    limit : float
        Contrast up to which a setting is clean, as a share.

    Returns
    -------
    Plan
        Equally good settings keep the order of cameras, frame rates and exposures, longer exposures first.

    Raises
    ------
    InputError
        If there is no light, no camera, or a camera without frame rates or exposures.

    Notes
    -----
    A rolling shutter's contrast does not depend on the frame rate, so it is found once for each exposure; the frame
    rate decides what fits, which bands stand still, and what a global shutter sees.
    """
    if not lights:
        raise InputError("a plan needs at least one [[light]]")
    if not cameras:
        raise InputError("a plan needs at least one [[camera]]")
    shares = {name: _share_of(tolerance, name) for name in lights}
    table = _Table(lights, shares)
    settings: list[PlanSetting] = []
    impossible = 0
    for planned in cameras:
        if not planned.frame_rates:
            raise InputError(f"{planned.name}: {unknown('frame_rate')} (frame_rates_hz in the plan)")
        if not planned.exposures:
            raise InputError(f"{planned.name}: {unknown('exposure')}")
        columns: dict[float, dict[str, float]] = {}
        for frame_rate in planned.frame_rates:
            camera = planned.camera.changed(frame_rate=frame_rate)
            for exposure in sorted(planned.exposures, reverse=True):
                if not _fits(camera, exposure, frame_rate):
                    impossible += 1
                    continue
                if exposure not in columns:
                    columns[exposure] = table.contrasts(camera, exposure)
                pulsing = table.pulsing(camera, exposure)
                settings.append(_setting(planned.name, frame_rate, exposure, columns[exposure], pulsing, lights, limit))
    settings.sort(key=lambda one: round(one.deepest, 4))
    names = tuple(planned.name for planned in cameras)
    shared = _shared(settings, names, limit) if len(names) > 1 else ()
    stated = max(shares.values()) if tolerance is not None else None
    return Plan(tuple(lights), names, tuple(settings), shared, stated, limit, impossible)


def _share_of(tolerance: float | Mapping[str, float] | None, name: str) -> float:
    share = tolerance.get(name, 0.0) if isinstance(tolerance, Mapping) else tolerance or 0.0
    check_share(share, "tolerance")
    return share


def _fits(camera: Camera, exposure: float, frame_rate: float) -> bool:
    longest = max(exposure, camera.readout_time or 0.0 if camera.shutter == "rolling" else 0.0)
    return longest * frame_rate <= _FITS


class _Table:
    """Contrast and pulsing of every light; what does not depend on the camera is found once."""

    def __init__(self, lights: Mapping[str, Light], shares: Mapping[str, float]) -> None:
        self._groups = {name: deciding_channels(light) for name, light in lights.items()}
        self._shares = shares
        self._bounds: dict[tuple[str, int, Windows], contrast.Bound] = {}
        self._pulsing: dict[tuple[object, ...], dict[str, float | None]] = {}

    def contrasts(self, camera: Camera, exposure: float) -> dict[str, float]:
        """Worst contrast of each light over its tolerance, 0..1."""
        seen = windows(exposure, binning=camera.line_binning, line_time=camera.line_time)
        delays = line_delays(camera)
        return {
            name: max(self._one(name, number, families, seen, delays) for number, families in enumerate(groups))
            for name, groups in self._groups.items()
        }

    def _one(
        self, name: str, number: int, families: Sequence[Family], seen: Windows, delays: FloatArray | None
    ) -> float:
        share = self._shares[name]
        if not families or not share or contrast.is_rectangle(families, seen):
            return contrast.worst(families, seen, delays, share)
        key = (name, number, seen)
        if key not in self._bounds:
            self._bounds[key] = contrast.bound(families, seen, share)
        return contrast.worst(families, seen, delays, share, self._bounds[key])

    def pulsing(self, camera: Camera, exposure: float) -> dict[str, float | None]:
        """Worst frame flicker of each light, 0..1, where it may exceed the contrast."""
        key = (camera.shutter, camera.readout_time, camera.frame_rate, exposure)
        if key not in self._pulsing:
            seen = windows(exposure)
            self._pulsing[key] = {
                name: deepest_pulsing(groups, camera, seen, self._shares[name]) for name, groups in self._groups.items()
            }
        return self._pulsing[key]


def _setting(
    camera: str,
    frame_rate: float,
    exposure: float,
    contrasts: Mapping[str, float],
    pulsing: Mapping[str, float | None],
    lights: Mapping[str, Light],
    limit: float,
) -> PlanSetting:
    ranked = {name: max(value, pulsing[name] or 0.0) for name, value in contrasts.items()}
    worst = max(ranked, key=lambda name: ranked[name])
    flickers = [value for value in pulsing.values() if value is not None]
    others = [value for name, value in ranked.items() if name != worst]
    return PlanSetting(
        camera=camera,
        frame_rate_hz=frame_rate,
        exposure_s=exposure,
        worst_contrast_percent=100 * max(contrasts.values()),
        worst_frame_flicker_percent=100 * max(flickers) if flickers else None,
        worst_light=worst,
        clean=ranked[worst] <= limit,
        contrast_percent={name: 100 * value for name, value in ranked.items()},
        without_worst_light_percent=100 * max(others) if others else None,
        standing=tuple(name for name, light in lights.items() if _stands(light, frame_rate)),
    )


def _stands(light: Light, frame_rate: float) -> bool:
    if light.frequency is None:
        return False
    turns = light.frequency / frame_rate
    return abs(turns - round(turns)) * frame_rate * contrast.STANDS < 1.0


def _shared(settings: Sequence[PlanSetting], cameras: Sequence[str], limit: float) -> tuple[SharedSetting, ...]:
    """Settings that all cameras have, best first."""
    groups: dict[tuple[float, float], dict[str, PlanSetting]] = {}
    for one in settings:
        key = (float(np.round(one.frame_rate_hz, 6)), float(f"{one.exposure_s:.9g}"))
        groups.setdefault(key, {}).setdefault(one.camera, one)
    found = []
    for members in groups.values():
        if len(members) < len(set(cameras)):
            continue
        worst = max(members.values(), key=lambda one: one.deepest)
        found.append(
            SharedSetting(
                worst.frame_rate_hz,
                worst.exposure_s,
                worst.deepest,
                worst.camera,
                worst.worst_light,
                worst.deepest <= 100 * limit,
            )
        )
    return tuple(sorted(found, key=lambda one: round(one.worst_contrast_percent, 4)))
