"""The camera bench: the reader sets a camera, and sees what it records of the light that stands in the page."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from flicker.camera.exposed import families_of
from flicker.camera.sensor import Camera
from flicker.camera.shutter import ANGLES, CONTRAST_LIMIT, FRACTIONS
from flicker.camera.visibility import band_threshold
from flicker.figures import quantity
from flicker.markup import Markup, element, markup
from flicker.report.bands import light_words, percent
from flicker.report.page import section

if TYPE_CHECKING:
    from flicker.camera.answer import Answer
    from flicker.light import ChannelLight, Light
    from flicker.reports import CaptureReport

# A camera to begin with where none is stated; the page marks each of these as an example
_EXAMPLE = {"frame_rate": 25.0, "line_time": 15e-6, "lines": 1080}
_EXPOSURE_ANGLE = 180.0  # the example's shutter [degrees]
_CAUTION = (
    "Caution: rolling and pulsing pictures flash. People with photosensitive epilepsy, and anybody who feels unwell, "
    "should not start them. They are slowed down to stay within three flashes a second."
)


@dataclass(frozen=True, slots=True)
class Bench:
    """A light and the camera to begin with; what is unknown of the camera is filled with a marked example."""

    light: Light
    camera: Camera = Camera()  # noqa: RUF009 (frozen)
    exposure: float | None = None  # [s]
    limit: float = CONTRAST_LIMIT
    light_scan: float = 0.0  # [s]
    tolerance: float | None = None  # share of the light's frequency

    def to_dict(self) -> dict[str, Any]:
        """Give what the page computes from."""
        camera, examples = self.camera, []
        values: dict[str, Any] = {"frameRate": camera.frame_rate, "lineTime": camera.line_time, "lines": camera.lines}
        if camera.line_time is None and camera.readout_time is not None:
            values["lines"] = _EXAMPLE["lines"]
            values["lineTime"] = camera.readout_time / _EXAMPLE["lines"]
            examples.append("lines")
        for name, known in zip(values, _EXAMPLE, strict=True):
            if values[name] is None:
                values[name] = _EXAMPLE[known]
                examples.append(name)
        exposure = self.exposure
        if exposure is None:
            exposure = camera.exposures[0] if camera.exposures else _EXPOSURE_ANGLE / 360 / values["frameRate"]
            if not camera.exposures:
                examples.append("exposure")
        values |= {
            "exposure": exposure,
            "shutter": camera.shutter,
            "binning": camera.line_binning,
            "lightScan": self.light_scan,
            "direction": camera.read_direction,
        }
        return {
            "light": light_for_page(self.light),
            "camera": values,
            "examples": examples,
            "limit": 100 * self.limit,
            "tolerance": 100 * (self.tolerance or 0.0),
            "threshold": 100 * band_threshold(None),
            "offered": list(camera.exposures) or None,
            "fractions": FRACTIONS,
            "angles": ANGLES,
        }


def light_for_page(light: Light) -> dict[str, Any]:
    """Give the families and lines of each channel, by the names that the page's functions use."""
    return {"frequency": light.frequency, "channels": [_channel(one) for one in light]}


def _channel(channel: ChannelLight) -> dict[str, Any]:
    if channel.pulse is not None:
        pulse = channel.pulse
        known = {"frequency": pulse.frequency, "duty": pulse.duty, "low": pulse.low_level, "decay": pulse.decay}
        families: list[dict[str, Any]] = [known] if families_of(channel) else []
        return {"name": channel.name, "families": families, "pulseLines": len(channel.frequencies)}
    families = [
        {
            "frequency": family.frequency,
            "harmonics": [
                [int(number), _short(one.real), _short(one.imag)]
                for number, one in zip(family.harmonics, family.amplitudes, strict=True)
            ],
        }
        for family in families_of(channel)
    ]
    lines = [
        [float(frequency), _short(abs(one))]
        for frequency, one in zip(channel.frequencies, channel.amplitudes, strict=True)
    ]
    return {"name": channel.name, "families": families, "lines": lines}


def _short(value: float) -> float:
    return float(f"{value:.8g}")


@section(of="capture", title="Camera bench", order=10)
def bench(capture: CaptureReport) -> Markup | None:
    """Set up the bench for a light that was measured."""
    return _bench(Bench(capture.light))


@section(of="bands", title="Camera bench", order=30)
def bands_bench(answer: Answer) -> Markup | None:
    """Set up the bench with the camera that the prediction was made for."""
    first = answer.predictions[0].exposure_s
    exposure = max(first) if isinstance(first, tuple) else first
    return _bench(Bench(answer.light, answer.camera, exposure, answer.limit, answer.light_scan, answer.tolerance))


def _bench(told: Bench) -> Markup | None:
    if told.light.frequency is None or not any(families_of(channel) for channel in told.light):
        return None
    data = json.dumps(told.to_dict(), separators=(",", ":"), allow_nan=False).replace("<", "\\u003c")
    over = f" over ±{quantity(100 * told.tolerance, '%', 3)} of the light's frequency" if told.tolerance else ""
    camera = element(
        "form",
        _field("exposure", "Exposure", "s, such as 1/50", slider=True),
        _field("angle", "Shutter angle", "degrees"),
        _field("frameRate", "Frame rate", "frames/s", slider=True),
        _field("lineTime", "Line time", "µs", slider=True),
        _field("lines", "Lines", "in the picture", slider=True),
        _shutter(),
        aria_label="camera",
    )
    frame = element(
        "figure",
        element("canvas", width=384, height=216, role="img", aria_label="the predicted frame"),
        element("figcaption", f"{light_words(told.light)}, on a plain grey scene, brought to the same mean level."),
        element("p", _CAUTION, class_="reason caution"),
        element(
            "p",
            element("button", "Start rolling", type="button", class_="roll"),
            element("span", class_="speed"),
            class_="handles",
        ),
    )
    curve = element(
        "figure",
        element("svg", viewBox="0 0 460 250", role="img", aria_label="contrast over exposure", class_="curve"),
        element(
            "figcaption",
            "Deepest contrast over exposure, the light's frequency taken as exact; dashed: the limit; hatched: safe "
            "windows, clean within it.",
        ),
    )
    return markup(
        element("p", class_="example"),
        element(
            "div",
            element("div", element("output", class_="told", aria_live="polite"), frame, class_="seen"),
            element("div", camera, element("dl", class_="figures")),
            curve,
            class_="desk",
        ),
        element("h4", f"Nearest clean settings, within {percent(100 * told.limit)}{over}"),
        element("p", class_="handles settings"),
        element("noscript", element("p", "The bench needs scripts, which this viewer does not run.")),
        Markup(f'<script type="application/json">{data}</script>'),
    )


def _field(name: str, label: str, unit: str, *, slider: bool = False) -> Markup:
    own = element("input", name=name, type="text", inputmode="decimal", autocomplete="off")
    slide = element("input", type="range", min=0, max=1000, step=1, data_of=name, aria_label=f"{label}, slider")
    words = element("span", label, element("small", unit, element("b", class_="mark-example")))
    return element("div", element("label", words, own), slide if slider else None, class_="field", data_field=name)


def _shutter() -> Markup:
    kinds = [element("option", kind, value=kind) for kind in ("rolling", "global")]
    chosen = element("select", *kinds, name="shutter")
    return element("div", element("label", element("span", "Shutter"), chosen), class_="field")
