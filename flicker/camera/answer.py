"""The whole answer about one light and one camera: a prediction for each exposure, and the advice."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from flicker.camera.bands import Prediction, predict_bands
from flicker.camera.sensor import Camera, unknown
from flicker.camera.shutter import CONTRAST_LIMIT, Setting, advise, standing_frame_rates
from flicker.errors import InputError
from flicker.light import Light

_LINES_LISTED = 20


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
    first = predictions[0].exposure_s if exposures else None
    advice = advise(
        light,
        camera,
        tolerance=tolerance or 0.0,
        limit=limit,
        wanted=max(first) if isinstance(first, tuple) else first,
        light_scan=light_scan,
    )
    return Answer(light, camera, predictions, advice, tolerance, limit, light_scan)
