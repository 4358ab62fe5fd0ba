"""Predictions against the simulated sensor over 500 random lights and cameras, three channels, aliased ones included.

    python tests/speed/bands_simulated.py [CASES]

prints the largest deviation of each figure.
"""

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "camera"))
from sensor_simulation import Wave, contrast, frame_means, rectangle, worst_frame

from flicker.camera import Camera, predict_bands
from flicker.light import pwm_light


def deviation(got, expected):
    """Percentage points beyond 1 % of the figure; the smaller of both measures."""
    return min(abs(got - expected), abs(got - expected) / max(expected, 1e-9) * 20)  # 1 % counts as 0.2 points


def drift(waves, camera, exposure, bands):
    """Lines that the pattern moves from one frame to the next, from the phase of its strongest line."""
    times = np.arange(2)[:, None] / camera.frame_rate + np.arange(camera.lines) * camera.line_time
    rows = max((wave.exposed(times, exposure) - 1 for wave in waves), key=np.ptp)
    tone = np.exp(-2j * np.pi * np.arange(camera.lines) / bands.band_period_lines) * np.hanning(camera.lines)
    first, second = rows @ tone
    return -np.angle(second / first) / (2 * np.pi) * bands.band_period_lines


def main(cases):
    largest = {"contrast": 0.0, "frame flicker": 0.0, "drift, of a band": 0.0}
    aliased = directions = 0
    for seed in range(cases):
        rng = np.random.default_rng(seed)
        frame_rate = float(rng.uniform(20, 120))
        lines = int(rng.integers(80, 500))
        camera = Camera(lines=lines, readout_time=float(rng.uniform(0.2, 1)) / frame_rate, frame_rate=frame_rate)
        frequency = float(np.exp(rng.uniform(np.log(40), np.log(60_000))))
        duty, low = float(rng.uniform(0.03, 0.97)), float(rng.choice([0.0, rng.uniform(0, 0.8)]))
        exposure = float(np.exp(rng.uniform(np.log(1 / 8000), np.log(1 / frame_rate))))
        decay = float(np.exp(rng.uniform(np.log(2e-4), np.log(1e-2))))
        bands = predict_bands(pwm_light(frequency, duty, low, (decay, 0.0, 0.0)), camera, exposure)
        aliased += bool(bands.aliased)
        slow = rectangle(duty, low, 1 / (frequency * decay), samples=40_000)
        waves = {"red": Wave(slow, frequency), "green": Wave(rectangle(duty, low), frequency)}
        for name, wave in waves.items():
            expected = worst_frame(wave, exposure, camera.line_time, lines, phases=200, zooms=3)
            means = contrast(frame_means(wave, exposure, camera.line_time, lines, frame_rate, int(60 * frame_rate)))
            off = deviation(bands.contrast_percent[name], expected)
            if off > 0.2:
                print(f"contrast {name}: {bands.contrast_percent[name]} against {expected}", frequency, duty, exposure)
            largest["contrast"] = max(largest["contrast"], off)
            largest["frame flicker"] = max(
                largest["frame flicker"], deviation(bands.frame_flicker_percent[name], float(means))
            )
        share = abs(bands.beat_frequency_hz) / frame_rate
        if bands.bands_per_frame > 3 and bands.band_period_lines > 3 and 0.02 < share < 0.45 and bands.visible:
            measured = drift(waves.values(), camera, exposure, bands)
            directions += 1
            off = abs(measured - bands.drift_lines_per_frame) / bands.band_period_lines
            largest["drift, of a band"] = max(largest["drift, of a band"], off)
            if np.sign(measured) != np.sign(bands.drift_lines_per_frame):
                print("the other way", frequency, duty, exposure, camera)
    print(f"{cases} lights and cameras, {aliased} aliased, {directions} directions of drift; largest deviations:")
    for name, value in largest.items():
        print(f"  {name}: {value:.3f}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 500)
