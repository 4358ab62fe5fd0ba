"""The line time of a camera, from a light of known frequency."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from flicker.camera.sensor import Camera
from flicker.camera.stripes_found import find_bands
from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.results import Measure, Note
from flicker.signal.stripes_fit import Rows, StripeFit, fit_stripes
from flicker.signal.stripes_search import Deviation, search_turns

_CLEAR = 1.5  # resolution cells by which a beat must differ from its mirror image to tell the read direction


@dataclass(frozen=True, slots=True, eq=False)
class LineTime:
    """A camera's line time, and the way in which it reads its lines."""

    footage: Footage
    line_time: Measure
    line_rate: Measure
    readout_time: Measure
    bands: StripeFit
    notes: tuple[Note, ...]

    @property
    def camera(self) -> Camera:
        """What is now known of the camera."""
        assert self.line_time.value is not None
        return Camera(
            lines=self.footage.lines_of_frame,
            line_time=self.line_time.value,
            frame_rate=self.footage.frame_rate,
            read_direction=self.footage.read_direction,
            name=f"{self.footage.lines_of_frame} lines, {self.footage.frame_rate:.5g} fps",
        )

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "line_time_s": self.line_time.to_dict(),
            "line_rate_hz": self.line_rate.to_dict(),
            "readout_time_s": self.readout_time.to_dict(),
            "lines": self.footage.lines_of_frame,
            "read_direction": self.footage.read_direction,
            "frame_rate_hz": self.footage.frame_rate,
            "light_frequency_hz": self.bands.frequency,
            "notes": [note.to_dict() for note in self.notes],
        }


def measure_line_time(views: Sequence[Footage], frequency: float, *, uncertainty: float = 0.0) -> LineTime:
    """
    Measure the line time.

    Parameters
    ----------
    views : sequence of Footage
        The same video once for each read direction that is possible.
    frequency : float
        Of the light. [Hz]
    uncertainty : float
        Relative standard uncertainty of that frequency.

    Returns
    -------
    LineTime
        Of the view whose bands move as that frequency must.

    Raises
    ------
    NotMeasurable
        If no view shows moving bands, or the frequency is so near to a multiple of half the frame rate that the read
        direction stays open.

    Notes
    -----
    Bands show cycles a line and, linked to them, cycles a frame. The known frequency says how many whole cycles a
    frame are missing and which sign the rest must have; lines counted the wrong way give the other sign.
    """
    best: tuple[float, Footage, StripeFit] | None = None
    problem: NotMeasurable | None = None
    for view in views:
        found = _tone(view, frequency)
        if found is None:
            continue
        power, turns = found
        if best is not None and power <= best[0]:
            continue
        rows = Rows.of(view.lines_of("all"), view.times, float(view.times.mean()))
        best = (power, view, fit_stripes(rows, frequency, turns))
    if best is None:
        for view in views[:1]:
            try:
                find_bands(view, None)
            except NotMeasurable as error:
                problem = error
        raise problem or NotMeasurable(
            f"bands are there, but they do not move as a light of {frequency:.6g} Hz must: check --light-frequency and "
            "--frame-rate"
        )
    _, view, bands = best
    notes = list(view.notes)
    rest = (frequency / view.frame_rate) % 0.5
    if len(views) > 1 and min(rest, 0.5 - rest) < _CLEAR / view.frames:
        message = (
            f"a light of {frequency:.6g} Hz is so near to a multiple of half the frame rate that the read direction is "
            "uncertain; check it with a light of another frequency, or state --read-direction"
        )
        notes.append(Note("direction-uncertain", "warning", message))
    return _result(view, bands, frequency, uncertainty, notes)


def _tone(view: Footage, frequency: float) -> tuple[float, float] | None:
    """Power and cycles a line of the tone that moves from frame to frame as the frequency must; None without one."""
    deviation = Deviation.of(view.lines_of("all"), view.times)
    best = None
    for turns, per_frame, power in search_turns(deviation, view.frame_rate):
        expected = (frequency / view.frame_rate + 0.5) % 1.0 - 0.5
        off = abs((per_frame - expected + 0.5) % 1.0 - 0.5)
        whole = turns * view.lines_of_frame * view.frame_rate / frequency  # readout over frame time
        least = max(100.0 / (deviation.lines * len(deviation.times)), 1e-3)
        if (
            off < 1.5 / len(deviation.times) + 1e-3 * frequency / view.frame_rate
            and 0.02 < whole < 1.1
            and power > least
        ):
            best = max(best or (0.0, 0.0), (power, turns))
    return best


def _result(view: Footage, bands: StripeFit, frequency: float, uncertainty: float, notes: list[Note]) -> LineTime:
    time = abs(bands.turns_per_line) / bands.frequency
    error = time * math.hypot(
        bands.turns_error / bands.turns_per_line, bands.frequency_error / bands.frequency, uncertainty
    )
    method = (
        f"cycles a line of {len(bands.harmonics)} harmonics over {view.frames} frames, over "
        f"{bands.frequency:.7g} Hz, which "
        "the camera's clock makes of the stated frequency"
    )
    off = abs(bands.frequency / frequency - 1)
    if off > 2e-4 + 3 * uncertainty:
        message = (
            f"by the camera's clock the light has {bands.frequency:.7g} Hz, {1e6 * off:.0f} ppm from "
            "what was stated: one of the "
            "two is off, or --frame-rate is not what the camera shot at"
        )
        notes.append(Note("clock-off", "warning", message))
    lines = view.lines_of_frame

    def scaled(factor: float, unit: str) -> Measure:
        half = 1.96 * error * factor
        return Measure(time * factor, unit, time * factor - half, time * factor + half, method)

    rate = Measure(1 / time, "1/s", 1 / (time + 1.96 * error), 1 / (time - 1.96 * error), method)
    return LineTime(view, scaled(1.0, "s"), rate, scaled(float(lines), "s"), bands, tuple(notes))


def camera_file(camera: Camera) -> str:
    """Give the text of a camera file."""
    return (
        f'name = "{camera.name}"\nlines = {camera.lines}\nline_time_s = {camera.line_time:.8g}\n'
        f'frame_rate_hz = {camera.frame_rate:.9g}\nshutter = "{camera.shutter}"\n'
        f'read_direction = "{camera.read_direction}"\n'
    )
