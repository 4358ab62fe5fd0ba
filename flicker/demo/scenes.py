"""The lights of the pilot station, and how each was captured."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from flicker.demo.dialects import write_comma, write_semicolon, write_single_column, write_wav
from flicker.trace import FloatArray, Trace
from flicker.waveforms import Waveform, pwm, rectified_sine, sampled

DARK_LEVEL = 0.012  # reading of the covered sensor [V]
SCOPE_NOISE = 0.0003  # standard deviation of one reading [V]
FIRST_SAMPLE = 0.00137  # of the light's own clock, so that no capture begins with a cycle [s]


@dataclass(frozen=True)
class Lamp:
    """One channel of a scene: a waveform, its mean reading above dark, and where IEEE 1789-2015 puts it."""

    waveform: Waveform
    mean: float
    region: str | None
    name: str = "light"
    mean_known: bool = True

    def truth(self) -> dict[str, Any]:
        """Give the true figures of the channel, None for what its capture cannot carry."""
        wave = self.waveform
        depth: dict[str, Any] = {
            "percent_flicker": wave.percent_flicker,
            "flicker_index": wave.flicker_index,
            "rms_modulation": wave.rms_modulation,
            "mean": self.mean,
            "risk_region": self.region,
        }
        known = depth if self.mean_known else dict.fromkeys(depth)
        return {"fundamental_frequency_hz": wave.frequency or None, "duty_cycle": wave.duty_cycle, **known}


@dataclass(frozen=True)
class Scene:
    """One capture: what stands before the sensor, how it is sampled and how it is written."""

    file: str
    about: str
    lamps: tuple[Lamp, ...]
    sample_rate: float
    duration: float
    write_traces: Callable[[Path, tuple[Trace, ...]], None]
    dark_level: float = DARK_LEVEL
    noise: float = SCOPE_NOISE  # standard deviation of one reading, unit of the capture
    unit: str = "V"
    bits: int = 12

    def traces(self) -> tuple[Trace, ...]:
        """Sample the lamps as the instrument did, with noise and the steps of its converter."""
        return tuple(
            sampled(
                lamp.waveform.at if lamp.mean_known else _without_mean(lamp.waveform),
                sample_rate=self.sample_rate,
                duration=self.duration,
                mean=lamp.mean,
                dark_level=self.dark_level,
                start=FIRST_SAMPLE,
                noise=self.noise / lamp.mean,
                seed=sum(self.file.encode()) + number,
                bits=self.bits,
                name=lamp.name,
                unit=self.unit,
            )
            for number, lamp in enumerate(self.lamps)
        )

    def write(self, path: Path) -> None:
        """Write the capture in its own dialect."""
        self.write_traces(path, self.traces())

    def truth(self) -> dict[str, Any]:
        """Give what is true of the capture, as plain data."""
        return {
            "about": self.about,
            "sample_rate_hz": self.sample_rate,
            "samples": round(self.sample_rate * self.duration),
            "unit": self.unit,
            "dark_level": self.dark_level,
            "noise": self.noise,
            "channels": {lamp.name: lamp.truth() for lamp in self.lamps},
        }


def softened(waveform: Waveform, share: float) -> Waveform:
    """Shrink the modulation about the mean to a share, as a reservoir capacitor does: 1 + share (light - 1)."""
    phase = np.linspace(0.0, 1.0, 4001)
    brightest, darkest = (1 + share * (end(waveform.at_phase(phase)) - 1) for end in (np.max, np.min))

    def light(phase: FloatArray) -> FloatArray:
        return np.asarray(1 + share * (waveform.at_phase(phase) - 1))

    return dataclasses.replace(
        waveform,
        name=f"softened {waveform.name}",
        at_phase=light,
        lines=lambda harmonics: np.asarray(share * waveform.lines(harmonics)),
        percent_flicker=float(100 * (brightest - darkest) / (brightest + darkest)),
        flicker_index=share * waveform.flicker_index,
        rms_modulation=share * waveform.rms_modulation,
        duty_cycle=None,
    )


def _without_mean(waveform: Waveform) -> Callable[[FloatArray], FloatArray]:
    return lambda times: np.asarray(waveform.at(times) - 1)


def _steady() -> Waveform:
    """Light that does not change: no frequency, no depth."""
    return Waveform(
        "steady",
        0.0,
        lambda phase: np.ones_like(phase),
        lambda harmonics: np.zeros(harmonics.shape, complex),
        percent_flicker=0.0,
        flicker_index=0.0,
        rms_modulation=0.0,
    )


_CORRIDOR = softened(rectified_sine(49.98), 0.3)
_CHART_TABLE = tuple(
    Lamp(pwm(479.4, 0.3, decay=decay), mean, region, name)
    for name, decay, mean, region in (
        ("red", 8.5e-3, 0.21, "no-observable-effect"),
        ("green", 0.0, 0.26, "above-low-risk"),
        ("blue", 0.0, 0.17, "above-low-risk"),
    )
)

SCENES = (
    Scene(
        "bridge-display-day.csv",
        "Radar display on the bridge at full brightness: the backlight is hardly dimmed.",
        (Lamp(pwm(239.7, 0.9, low_level=0.8), 0.931, "low-risk"),),
        20_000.0,
        0.25,
        write_comma,
    ),
    Scene(
        "bridge-display-dusk.csv",
        "The same display turned down at dusk.",
        (Lamp(pwm(239.7, 0.45, low_level=0.35), 0.4275, "above-low-risk"),),
        20_000.0,
        0.25,
        write_comma,
    ),
    Scene(
        "bridge-display-night.csv",
        "The same display at night: short pulses, darkness between them.",
        (Lamp(pwm(239.7, 0.05), 0.05, "above-low-risk"),),
        20_000.0,
        0.4,
        write_comma,
    ),
    Scene(
        "bridge-display-night-new-driver.wav",
        "The display at night after its backlight driver was set to 4.8 kHz; a DC-coupled converter wrote it.",
        (Lamp(pwm(4799.0, 0.05), 0.03, "no-observable-effect"),),
        192_000.0,
        0.15,
        write_wav,
        dark_level=0.01,
        unit="",
        bits=16,
    ),
    Scene(
        "chart-table-lamp.csv",
        "Lamp over the chart table through red, green and blue filters: its red phosphor glows on between pulses.",
        _CHART_TABLE,
        20_000.0,
        0.25,
        write_semicolon,
    ),
    Scene(
        "corridor-lamp.csv",
        "Corridor lamp on the 50 Hz mains: the ripple of a single-stage driver.",
        (Lamp(_CORRIDOR, 0.62, "above-low-risk"),),
        10_000.0,
        0.5,
        write_single_column,
    ),
    Scene(
        "corridor-lamp-recorder.wav",
        "The corridor lamp through a sound recorder, whose input loses the mean level.",
        (Lamp(_CORRIDOR, 0.4, "above-low-risk", mean_known=False),),
        48_000.0,
        0.4,
        write_wav,
        dark_level=0.0,
        unit="",
        bits=16,
    ),
    Scene(
        "mess-room-lamp.csv",
        "Lamp of the mess room on direct current: steady light, 0.2 % of noise.",
        (Lamp(_steady(), 0.8, "no-observable-effect"),),
        20_000.0,
        0.25,
        write_comma,
        noise=0.0016,
    ),
    Scene(
        "sensor-covered.csv",
        "The sensor with a cap on it: the dark level of all the CSV captures.",
        (Lamp(_steady(), 1.0, None, mean_known=False),),
        10_000.0,
        0.1,
        write_comma,
    ),
)
