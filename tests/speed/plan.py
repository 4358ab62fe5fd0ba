"""
How long a plan of 12 lights, 6 cameras, 40 exposures and 8 frame rates with tolerance takes, as a process.

`python tests/speed/plan.py [--profile]` writes the plan into a folder of its own, runs `flicker plan` three times and
prints the shortest. A third of the lights are rectangles, a third slow emitters, a third line spectra of captures.
The bound is 3 s on the machine that the project is developed on.
"""

from __future__ import annotations

import cProfile
import pstats
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from flicker.camera.plan import PlannedCamera, make_plan
from flicker.camera.sensor import Camera
from flicker.camera.shutter import FRACTIONS
from flicker.light import ChannelLight, Light, pwm_light

BOUND = 3.0  # [s]
TOLERANCE = 0.01
FRAME_RATES = (23.976, 24.0, 25.0, 29.97, 30.0, 48.0, 50.0, 60.0)
EXPOSURES = tuple(1.0 / number for number in FRACTIONS)


def lights(seed: int = 1) -> dict[str, Light]:
    """Twelve lights, a third of each kind."""
    rng = np.random.default_rng(seed)
    found = {}
    for number in range(4):
        frequency = float(rng.uniform(90, 2000))
        found[f"rectangle {number}"] = pwm_light(frequency, float(rng.uniform(0.1, 0.9)))
        frequency = float(rng.uniform(90, 2000))
        found[f"slow red {number}"] = pwm_light(frequency, float(rng.uniform(0.1, 0.9)), 0.0, (5e-3, 1e-5, 1e-5))
        frequency = float(rng.uniform(90, 1000))
        harmonics = np.arange(1.0, 21.0)
        amplitudes = 0.3 / harmonics * np.exp(2j * np.pi * rng.uniform(0, 1, 20))
        found[f"lines {number}"] = Light((ChannelLight("light", harmonics * frequency, amplitudes, (frequency,)),))
    return found


def cameras() -> list[PlannedCamera]:
    """Six cameras with different line times."""
    return [
        PlannedCamera(
            Camera(lines=1080 + 180 * n, line_time=(6 + 1.3 * n) * 1e-6), f"camera {n}", FRAME_RATES, EXPOSURES
        )
        for n in range(6)
    ]


def plan_text(folder: Path) -> str:
    """Plan file with typed lights, and captures for the lines."""
    rows = [f"tolerance_percent = {100 * TOLERANCE}"]
    for name, light in lights().items():
        rows.append(f'[[light]]\nname = "{name}"')
        channel = light.channels[0]
        if channel.pulse is None:
            times = np.arange(20_000) / 40_000.0
            wave = channel.at(times)
            path = folder / f"{name.replace(' ', '-')}.csv"
            table = np.column_stack([times, wave - min(wave.min(), 0) + 0.05])
            np.savetxt(path, table, "%.6f", ",", header="t (s),v (V)", comments="")
            rows.append(f'capture = "{path.name}"')
            continue
        rows.append(f"frequency_hz = {channel.pulse.frequency}\nduty = {channel.pulse.duty}")
        if channel.pulse.decay:
            rows.append(f"decay_s = {[one.pulse.decay for one in light if one.pulse]}")
    for planned in cameras():
        own = folder / f"{planned.name.replace(' ', '-')}.toml"
        own.write_text(
            f'name = "{planned.name}"\nlines = {planned.camera.lines}\nline_time_s = {planned.camera.line_time}\n'
        )
        rows.append(f'[[camera]]\nfile = "{own.name}"\nframe_rates_hz = {list(FRAME_RATES)}\n'
                    f"exposures_s = {list(EXPOSURES)}")  # fmt: skip
    return "\n".join(rows)


def main() -> None:
    """Print the time of the whole process, or where the time goes."""
    if "--profile" in sys.argv:
        with cProfile.Profile() as profile:
            make_plan(lights(), cameras(), tolerance=TOLERANCE)
        pstats.Stats(profile).sort_stats("tottime").print_stats(14)
        return
    with tempfile.TemporaryDirectory() as name:
        path = Path(name) / "plan.toml"
        path.write_text(plan_text(Path(name)))
        taken = []
        for _ in range(3):
            start = time.perf_counter()
            subprocess.run([sys.executable, "-m", "flicker", "plan", str(path)], check=True, capture_output=True)
            taken.append(time.perf_counter() - start)
    print(f"{min(taken):.2f} s, bound {BOUND} s")


if __name__ == "__main__":
    main()
