"""
Random lights on random cameras, 2 s of 1080 lines each: how near the light read back comes to the truth.

Run `python tests/speed/stripes_random.py [COUNT] [FIRST_SEED]`; clip number n uses the seed FIRST_SEED + n.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from flicker.camera.render import Lit, Shot, exposed, write_clip
from flicker.camera.stripes import read_stripes
from flicker.errors import NotMeasurable
from flicker.light import Pulse
from flicker.readers.video import read_footage

LINES, WIDTH, SECONDS = 1080, 96, 2.0


def random_shot(seed: int) -> tuple[Shot, dict[str, Pulse], str]:
    """A light whose bands move, on a camera whose lines fit into its frames."""
    rng = np.random.default_rng(seed)
    while True:
        rate = float(rng.choice([23.976, 24, 25, 29.97, 30, 50, 59.94]))
        readout = rng.uniform(0.3, 0.95) / rate
        frequency = float(np.exp(rng.uniform(np.log(110), np.log(4000))))
        beat = frequency / rate % 1.0
        exposure = float(np.exp(rng.uniform(np.log(1 / 4000), np.log(min(1 / 60, 0.9 / rate)))))
        if not 0.04 < beat < 0.96 or frequency * readout < 1.5:
            continue
        duty = rng.uniform(0.08, 0.92)
        low = float(rng.choice([0.0, rng.uniform(0.02, 0.95)]))
        fast, slow = Pulse(frequency, duty, low), Pulse(frequency, duty, low, 8.5e-3)
        bands = exposed(fast, np.linspace(0, 1 / frequency, 400), exposure)
        if np.ptp(bands) / (bands.max() + bands.min()) > 0.01:
            break
    rows, columns = np.arange(LINES)[:, None], np.arange(WIDTH)[None, :]
    scene = 0.16 + 0.05 * np.sin(rows / rng.uniform(60, 300)) + 0.03 * np.sin(columns / 9 + rows / 50)
    scene = (scene + 0.01 * rng.standard_normal((LINES, WIDTH))).clip(0.02)
    codec = str(rng.choice(["libx264", "mjpeg"]))
    coding = {"options": {"crf": "18"}} if codec == "libx264" else {"options": {"qmin": "2", "qmax": "3"}}
    coding |= {} if codec == "libx264" else {"pixel_format": "yuvj420p", "full_range": True, "matrix": "bt601"}
    part = Lit(scene / max(1.0, float(bands.max()) * 0.3), [slow, fast, fast])
    shot = Shot(
        readout / LINES, rate, exposure, round(SECONDS * rate), [part],
        start=rng.uniform(0, 1), noise=0.01, seed=seed, **coding,
    )  # fmt: skip
    return shot, {"red": slow, "green": fast, "blue": fast}, codec


def main() -> None:
    """Print one line a clip and a summary."""
    count, first = (
        (int(word) for word in (*sys.argv[1:], "60", "1000")[:2]) if len(sys.argv) < 3 else map(int, sys.argv[1:3])
    )
    rows: list[tuple[float, float, float, bool, bool]] = []
    decays: list[float] = []
    clock: list[tuple[float, bool]] = []
    refused = unknown = 0
    for seed in range(first, first + count):
        shot, truth, codec = random_shot(seed)
        begin = time.perf_counter()
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / ("clip.mkv" if codec == "mjpeg" else "clip.mp4")
            write_clip(path, shot, codec)
            try:
                found = read_stripes(
                    read_footage(path, transfer="bt709"), line_time=shot.line_time, exposure=shot.exposure
                )
            except NotMeasurable as problem:
                refused += 1
                print(seed, "refused:", problem)
                continue
        light = truth["green"]
        off = 1e6 * ((found.frequency.value or 0) / light.frequency - 1)
        clock.append((off, (found.frequency.low or 0) <= light.frequency <= (found.frequency.high or 0)))
        words = [
            (
                f"{seed} {codec:8} f {light.frequency:7.1f} duty {light.duty:.2f} low {light.low_level:.2f} "
                f"fTe {light.frequency * shot.exposure:5.2f} {off:+6.2f} ppm"
            )
        ]
        for channel in found.channels[:3]:
            true, got = truth[channel.name].percent_flicker, channel.measures["percent_flicker"]
            if got.value is None:
                unknown += 1
                words.append(f"{channel.name} unknown")
                continue
            value = got.value
            inside = (got.low or 0.0) <= true <= (got.high or 0.0)
            contrast = 100 * channel.bands.contrast
            rows.append((value - true, contrast, true, inside, channel.name == "red"))
            words.append(f"{channel.name} {value:.1f}/{true:.1f}{'' if inside else '!'}")
        decay = found.channels[0].measures["decay_time"]
        if decay.value is not None:
            decays.append(decay.value / 8.5e-3 - 1)
            words.append(f"decay {1e3 * decay.value:.2f}")
        print("  ".join(words), f"{time.perf_counter() - begin:.1f} s", flush=True)
    error = np.array([row[0] for row in rows])
    contrast = np.array([row[1] for row in rows])
    inside = np.array([row[3] for row in rows])
    red = np.array([row[4] for row in rows])
    print(
        f"\n{count} clips, {refused} refused; frequency: worst {max(abs(o) for o, _ in clock):.2f} ppm, "
        f"in the interval {np.mean([i for _, i in clock]):.0%}"
    )
    for name, some in (("red", red), ("green and blue", ~red)):
        for what, chosen, bound in (("deep", some & (contrast > 10), 3.0), ("shallow", some & (contrast <= 10), 1.5)):
            if chosen.any():
                print(
                    f"{name}, {what}: {chosen.sum()} depths, within {bound} points "
                    f"{np.mean(np.abs(error[chosen]) <= bound):.0%}, "
                    f"median {np.median(np.abs(error[chosen])):.2f}, worst {np.abs(error[chosen]).max():.2f}, "
                    f"in the interval {np.mean(inside[chosen]):.0%}"
                )
    light = np.array([row[2] for row in rows])
    faint = light < 20
    print(
        f"lights shallower than 20 %: {faint.sum()} depths, within 1.5 points "
        f"{np.mean(np.abs(error[faint]) <= 1.5):.0%}"
    )
    print(f"{unknown} depths said to be unknown")
    print(f"all intervals: {inside.mean():.0%} hold the truth")
    if decays:
        print(
            f"decay: {len(decays)} found, median error {np.median(np.abs(decays)):.1%}, within 8 % "
            f"{np.mean(np.abs(decays) <= 0.08):.0%}, worst {np.abs(decays).max():.1%}"
        )


if __name__ == "__main__":
    main()
