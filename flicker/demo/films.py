"""The films of the pilot station's crew: what stood before the camera, and how it was filmed."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from flicker.camera.render import Lit, Shot, write_clip
from flicker.light import Pulse
from flicker.trace import FloatArray

DOCK_CAMERA_LINES = 1080
DOCK_CAMERA_LINE_TIME = 14.8e-6  # [s]


@dataclass(frozen=True)
class Film:
    """One clip: lights on parts of a scene, and the camera."""

    file: str
    about: str
    shot: Shot
    truths: tuple[dict[str, Any], ...]  # of each light or zone

    def write(self, path: Path) -> None:
        """Film it; the same bytes at every call with the same encoder."""
        write_clip(path, self.shot)

    def truth(self) -> dict[str, Any]:
        """Give what is true of the clip, as plain data."""
        return {
            "about": self.about,
            "frame_rate_hz": self.shot.frame_rate,
            "frames": self.shot.frames,
            "line_time_s": self.shot.line_time,
            "exposure_s": self.shot.exposure,
            "read_direction": self.shot.read_direction,
            "lights": list(self.truths),
        }


def _true(light: Pulse, **more: Any) -> dict[str, Any]:
    return {
        **more,
        "fundamental_frequency_hz": light.frequency,
        "percent_flicker": light.percent_flicker,
        "duty_cycle": light.duty,
        "decay_time_s": light.decay or None,
    }


def _wall(lines: int, width: int) -> FloatArray:
    """A wall that is darker here and brighter there, shape (lines, width)."""
    rows, columns = np.arange(lines)[:, None], np.arange(width)[None, :]
    return np.asarray(0.15 + 0.03 * np.sin(rows / 90) + 0.03 * np.cos(columns / 5 + rows / 50))


def _generator() -> Film:
    light = Pulse(1003.0, 0.5)
    shot = Shot(
        DOCK_CAMERA_LINE_TIME, 25.0, 1 / 2000, 40, [Lit(_wall(DOCK_CAMERA_LINES, 32), [light])],
        noise=0.006, options={"crf": "22"},
    )  # fmt: skip
    about = "A light-emitting diode on a generator before the dock camera, which shows the line time of that mode."
    return Film("generator-1003hz.mp4", about, shot, (_true(light),))


def _dock_lamp() -> Film:
    """Film a lamp of the make that hangs over the chart table."""
    fast, slow = Pulse(479.4, 0.3), Pulse(479.4, 0.3, decay=8.5e-3)
    lights = {"red": slow, "green": fast, "blue": fast}
    shot = Shot(
        DOCK_CAMERA_LINE_TIME, 25.0, 1 / 1000, 50, [Lit(_wall(DOCK_CAMERA_LINES, 32), list(lights.values()))],
        noise=0.006, options={"crf": "20"},
    )  # fmt: skip
    about = "Wall of the dock under a lamp of the make that hangs over the chart table; its red phosphor glows on."
    return Film("dock-lamp.mp4", about, shot, tuple(_true(light, channel=name) for name, light in lights.items()))


def _bridge_display() -> Film:
    """Film the four zones of a backlight, each with a duty cycle of its own, switched on one after the other."""
    duties = (0.2, 0.35, 0.5, 0.65)
    parts, truths = [], []
    for number, duty in enumerate(duties):
        light, phase = Pulse(239.7, duty), number / 4
        zone = np.zeros((96, 128))
        row, column = divmod(number, 2)
        zone[48 * row : 48 * row + 48, 64 * column : 64 * column + 64] = 0.45 * duty
        parts.append(Lit(zone, [light], delay=phase / light.frequency))
        truths.append(_true(light, zone=[row, column], switched_on_after_cycles=phase))
    shot = Shot(2e-6, 1000.0, 1 / 2000, 250, parts, noise=0.006, options={"crf": "22"})
    about = "The bridge display at 1000 frames/s: four zones of its backlight, dimmed apart and switched in turn."
    return Film("bridge-display-1000fps.mp4", about, shot, tuple(truths))


def films() -> tuple[Film, ...]:
    """Give all films."""
    return _generator(), _dock_lamp(), _bridge_display()
