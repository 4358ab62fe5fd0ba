"""The whole answer about one light and one camera: a prediction for each exposure, and the advice."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from flicker.camera.bands import Prediction, predict_bands
from flicker.camera.sensor import Camera, unknown
from flicker.camera.shutter import CONTRAST_LIMIT, Setting, offered, rank, standing_frame_rates, with_window
from flicker.errors import InputError
from flicker.light import Light

_LINES_LISTED = 20
_ADVISED = 12


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """The JSON of `flicker bands` as objects."""

    light: Light
    camera: Camera
    predictions: tuple[Prediction, ...]
    advice: tuple[Setting, ...]  # best first
    tolerance: float | None = None  # share of the frequency; None where nobody stated it
    limit: float = CONTRAST_LIMIT  # contrast up to which a setting is clean
    light_scan: float = 0.0  # [s]
    nearest_clean: tuple[Setting | None, ...] = ()  # to each exposure predicted, longest window of a staggered one

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        frequency = self.light.frequency
        return {
            "light": _light_dict(self.light),
            "camera": self.camera.to_dict(),
            "tolerance_percent": None if self.tolerance is None else 100.0 * self.tolerance,
            "contrast_limit_percent": 100.0 * self.limit,
            "light_scan_s": self.light_scan,
            "predictions": [prediction.to_dict() for prediction in self.predictions],
            "advice": [setting.to_dict() for setting in self.advice],
            "nearest_clean": [setting.to_dict() if setting else None for setting in self.nearest_clean],
            "standing_frame_rates_hz": []
            if frequency is None
            else list(standing_frame_rates(frequency, self.camera.frame_rate)),
        }


def _light_dict(light: Light) -> dict[str, Any]:
    lines = {}
    for channel in light:
        strongest = sorted(range(len(channel.amplitudes)), key=lambda k: -abs(channel.amplitudes[k]))[:_LINES_LISTED]
        lines[channel.name] = [
            {
                "frequency_hz": float(channel.frequencies[k]),
                "modulation_percent": 100.0 * float(abs(channel.amplitudes[k])),
                "amplitude_real": float(channel.amplitudes[k].real),
                "amplitude_imag": float(channel.amplitudes[k].imag),
            }
            for k in strongest
        ]
    result: dict[str, Any] = {"frequency_hz": light.frequency, "lines": lines}
    pulses = {channel.name: channel.pulse for channel in light if channel.pulse is not None}
    if pulses:
        result["pulses"] = {
            name: {"duty": pulse.duty, "low_level": pulse.low_level, "decay_s": pulse.decay}
            for name, pulse in pulses.items()
        }
    return result


def predict_all(
    light: Light,
    camera: Camera,
    *,
    exposures: Sequence[float | Sequence[float]] = (),
    tolerance: float | None = None,
    limit: float | None = None,
    light_scan: float = 0.0,
    **how: Any,
) -> Answer:
    """
    Predict every exposure, and advise.

    Parameters
    ----------
    light, camera
        As in `predict_bands`.
    exposures : sequence
        Exposures [s] to predict; none: those that the camera offers.
    tolerance : float or None
        Share by which the light's frequency may be off; None takes it as exact and says so.
    limit : float or None
        Contrast up to which a setting is clean, as a share; None: 1 %.
    **how
        Other keywords of `predict_bands`.

    Raises
    ------
    InputError
        If no exposure is known, or a value cannot be right.
    """
    wanted = tuple(exposures) or camera.exposures
    if not wanted:
        raise InputError(unknown("exposure"))
    limit = CONTRAST_LIMIT if limit is None else limit
    predictions = tuple(
        predict_bands(light, camera, exposure, tolerance or 0.0, light_scan=light_scan, **how) for exposure in wanted
    )
    longest = [_longest(one.exposure_s) for one in predictions]
    ranked = rank(
        light,
        camera,
        exposures=offered(camera, light.frequency, longest),
        tolerance=tolerance or 0.0,
        limit=limit,
        wanted=longest[0] if exposures else None,
        light_scan=light_scan,
    )
    nearest = [_nearest_clean(ranked, exposure) for exposure in longest]
    windowed = {
        one.exposure_s: with_window(light, camera, one, limit, light_scan)
        for one in [*ranked[:_ADVISED], *(one for one in nearest if one)]
    }
    return Answer(
        light,
        camera,
        predictions,
        tuple(windowed[one.exposure_s] for one in ranked[:_ADVISED]),
        tolerance,
        limit,
        light_scan,
        tuple(windowed[one.exposure_s] if one else None for one in nearest),
    )


def _longest(exposure: float | tuple[float, ...]) -> float:
    return max(exposure) if isinstance(exposure, tuple) else exposure


def _nearest_clean(advice: Sequence[Setting], wanted: float) -> Setting | None:
    clean = [one for one in advice if one.clean]
    return min(clean, key=lambda one: abs(math.log(one.exposure_s / wanted)), default=None)
