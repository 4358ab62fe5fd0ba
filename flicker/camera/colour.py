"""Colour of the bands, where the channels of a light do not move as one."""

from __future__ import annotations

import colorsys
from dataclasses import dataclass
from typing import Any

import numpy as np

from flicker.camera.exposed import Windows, families_of
from flicker.light import Light
from flicker.trace import FloatArray

PRIMARIES = ("red", "green", "blue")
_NEUTRAL = 0.03  # saturation below which a band has no colour of its own
_PHASES = 2048
_HUES = ("red", "orange", "yellow", "lime", "green", "teal", "cyan", "azure", "blue", "violet", "magenta", "rose")


@dataclass(frozen=True, slots=True)
class BandColours:
    """Brightest and darkest band as red, green, blue over their means, and how far colour swings between lines."""

    bright: tuple[float, float, float]
    dark: tuple[float, float, float]
    chroma_contrast_percent: float  # largest (max - min)/(max + min) of the ratio of two channels

    @property
    def bright_name(self) -> str:
        """Name of the hue of the brightest band."""
        return hue_name(self.bright)

    @property
    def dark_name(self) -> str:
        """Name of the hue of the darkest band."""
        return hue_name(self.dark)

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form."""
        return {
            "bright": list(self.bright),
            "bright_hue": self.bright_name,
            "bright_hue_deg": _hue(self.bright),
            "dark": list(self.dark),
            "dark_hue": self.dark_name,
            "dark_hue_deg": _hue(self.dark),
            "chroma_contrast_percent": self.chroma_contrast_percent,
        }


def _hue(rgb: tuple[float, float, float]) -> float | None:
    """Hue in degrees, 0 red, 120 green, 240 blue; None without colour."""
    top = max(rgb)
    if top <= 0:
        return None
    hue, saturation, _ = colorsys.rgb_to_hsv(*(value / top for value in rgb))
    return 360.0 * hue if saturation >= _NEUTRAL else None


def hue_name(rgb: tuple[float, float, float]) -> str:
    """Name the hue of linear red, green and blue; `neutral` where it has none, `black` without light."""
    if max(rgb) <= 0:
        return "black"
    hue = _hue(rgb)
    return "neutral" if hue is None else _HUES[round(hue / 30.0) % 12]


def exposed_cycle(light: Light, seen: Windows, phases: int = _PHASES) -> FloatArray | None:
    """
    Light that each channel collects over one cycle of the light's fundamental, shape (phases, channels), mean 1.

    Only the family of that fundamental is shown, in the phases that the channels have to each other; None for
    steady light.
    """
    fundamental = light.frequency
    if fundamental is None:
        return None
    cycle = np.ones((phases, len(light.channels)))
    starts = np.arange(phases) / phases
    for number, channel in enumerate(light):
        for family in families_of(channel):
            if abs(family.frequency / fundamental - 1) < 1e-3:
                cycle[:, number] += family.blurred(seen).at(starts)
    return np.maximum(cycle, 0.0)


def band_colours(light: Light, seen: Windows) -> BandColours | None:
    """Give the colours of the bands; None unless the light has the channels red, green and blue and is unsteady."""
    if tuple(channel.name for channel in light) != PRIMARIES:
        return None
    cycle = exposed_cycle(light, seen)
    if cycle is None:
        return None
    total = cycle.sum(axis=1)
    bright, dark = cycle[int(total.argmax())], cycle[int(total.argmin())]
    swings = [_swing(cycle[:, one], cycle[:, other]) for one, other in ((0, 1), (0, 2), (1, 2))]
    return BandColours(_triple(bright), _triple(dark), 100.0 * max(swings))


def _swing(one: FloatArray, other: FloatArray) -> float:
    """Contrast of the ratio of two channels over the lines, as (max - min)/(max + min)."""
    share = one / np.where(one + other > 0, one + other, 1.0)
    share = share[one + other > 0]
    if not share.size:
        return 0.0
    high, low = float(share.max()), float(share.min())
    high, low = high * (1 - low), low * (1 - high)  # ratios high/(1-high) and low/(1-low), brought to one divisor
    return (high - low) / (high + low) if high + low > 0 else 0.0


def _triple(values: FloatArray) -> tuple[float, float, float]:
    red, green, blue = (float(value) for value in values)
    return red, green, blue
