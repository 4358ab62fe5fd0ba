"""Flicker over the picture: depth, frequency, phase and level of each cell of a grid, and the zones that they form."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import scipy.fft

from flicker.camera.stripes_found import find_bands
from flicker.errors import NotMeasurable
from flicker.footage import Footage
from flicker.results import Note
from flicker.signal.stripes_fit import Rows, StripeFit, fit_at
from flicker.signal.stripes_free import extremes, undo_exposure
from flicker.signal.stripes_shape import Harmonics, duty_of, fit_pulse, is_rectangle, pulse_loss
from flicker.trace import FloatArray

_DARK = 0.04  # of the brightest cell: below this a cell is dark
_FAST = 90.0  # frame rate from which frames alone follow a light [Hz]
_DEPTH, _DUTY, _PHASE = 12.0, 0.05, 0.04  # by how much neighbours of one zone may differ [%, 1, cycles]
_GAP = 0.1  # of a cycle that no frame shows, above which depth and duty cycle are guesses
_CODED = 0.003  # of the strongest harmonic of a cell: what coding does to every other one
_FAINT = 0.2  # amplitude over the mean up to which coding erases some of it
_SAME = 0.01  # relative difference of frequency within a zone


@dataclass(frozen=True, slots=True, eq=False)
class Zone:
    """Neighbouring cells whose light keeps the same time and duty."""

    cells: tuple[tuple[int, int], ...]
    frequency: float | None  # [Hz]
    percent_flicker: float  # [%]
    duty: float | None
    phase: float | None  # ahead of the brightest zone [cycles]
    mean: float

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""
        return {
            "cells": [list(cell) for cell in self.cells],
            "frequency_hz": self.frequency,
            "percent_flicker": self.percent_flicker,
            "duty_cycle": self.duty,
            "phase_cycles": self.phase,
            "mean_level": self.mean,
        }


@dataclass(frozen=True, slots=True, eq=False)
class ScreenMap:
    """
    Flicker over the picture; all grids have the shape (rows, columns) of the picture as stored, NaN where unknown.

    The phase is that of the moment of switching on where the light is a rectangle, else of the crest of the
    fundamental; positive is ahead of the brightest zone.
    """

    frequency: FloatArray  # [Hz]
    percent_flicker: FloatArray  # [%]
    duty: FloatArray
    phase: FloatArray  # [cycles]
    mean: FloatArray  # nominal white is 1
    dark: npt.NDArray[np.bool_]
    zones: tuple[Zone, ...]
    kind: str  # "one zone", "zones", "staggered zones", "scanning backlight" or "no flicker"
    footage: Footage
    notes: tuple[Note, ...]

    def to_dict(self) -> dict[str, Any]:
        """Give the JSON form of `docs/json.md`."""

        def grid(values: FloatArray) -> list[list[float | None]]:
            return [[float(value) if math.isfinite(value) else None for value in row] for row in values]

        return {
            "rows": self.mean.shape[0],
            "columns": self.mean.shape[1],
            "frequency_hz": grid(self.frequency),
            "percent_flicker": grid(self.percent_flicker),
            "phase_cycles": grid(self.phase),
            "mean_level": grid(self.mean),
            "duty_cycle": grid(self.duty),
            "dark": self.dark.tolist(),
            "zones": [zone.to_dict() for zone in self.zones],
            "kind": self.kind,
            "frame_rate_hz": self.footage.frame_rate,
            "notes": [note.to_dict() for note in self.notes],
        }


def map_screen(
    footage: Footage, rows: int, *, line_time: float | None = None, exposure: float | None = None
) -> ScreenMap:
    """
    Map the flicker over the picture.

    Parameters
    ----------
    footage : Footage
        Channel `all`, its lines cut into as many blocks as the grid has cells along a line.
    rows : int
        Cells across the lines.
    line_time : float, optional
        Needed unless the video is fast. [s]
    exposure : float, optional
        Of each line; half the time of a frame is taken if it is unknown. [s]

    Returns
    -------
    ScreenMap
        Grids and zones.

    Raises
    ------
    NotMeasurable
        If the video is slow and the line time unknown, or no cell shows a light that moves.
    """
    notes = list(footage.notes)
    if line_time is None and footage.frame_rate < _FAST:
        raise NotMeasurable(
            f"at {footage.frame_rate:.4g} frames/s the cells need the times of their lines: state "
            "--line-time, or film at "
            "240 frames/s and more"
        )
    cells = _Cells(footage, rows, line_time)
    frequencies = cells.frequencies()
    if line_time is None:
        _need_phases(footage, frequencies)
    if exposure is None:
        exposure = _likeliest_exposure(cells, frequencies)
        message = (
            f"the exposure was not stated; {exposure:.3g} s fits the brightest cells best: depths "
            "and duty cycles may be a few per cent off"
        )
        notes.append(Note("exposure-fitted", "warning", message))
    shape = (rows, footage.light.shape[2])
    grids = {name: np.full(shape, np.nan) for name in ("frequency", "depth", "duty", "phase")}
    for place in zip(*np.nonzero(~cells.dark), strict=True):
        _measure(cells, place, frequencies[place], exposure, grids)
    if line_time is None:
        message = (
            f"frames at {footage.frame_rate:.5g} Hz cannot tell a light of frequency f from one of k "
            "times that rate plus or "
            "minus f; the delays of the lines are left in: state --line-time to settle both"
        )
        notes.append(Note("aliasing-possible", "info", message))
    zones = _zones(grids, cells.mean, cells.dark)
    reference = zones[0].phase if zones and zones[0].phase is not None else 0.0
    zones = tuple(_relative(zone, reference) for zone in zones)
    grids["phase"] = _wrap(grids["phase"] - reference)
    if footage.read_direction in ("left", "right"):
        grids = {name: grid.T for name, grid in grids.items()}
    return ScreenMap(
        grids["frequency"],
        grids["depth"],
        grids["duty"],
        grids["phase"],
        cells.mean,
        cells.dark,
        zones,
        _kind(zones),
        footage,
        tuple(notes),
    )


def _need_phases(footage: Footage, frequencies: FloatArray) -> None:
    """Refuse frames that show the light in a few phases of its cycle only."""
    if not np.isfinite(frequencies).any():
        return
    frequency = float(np.nanmedian(frequencies))
    phases = np.sort(footage.times * frequency % 1.0)
    gap = float(np.diff(np.r_[phases, phases[0] + 1.0]).max())
    if gap > _GAP:
        raise NotMeasurable(
            f"frames at {footage.frame_rate:.5g} Hz meet a light of {frequency:.5g} Hz in few phases of its cycle "
            f"and leave out {100 * gap:.0f} % of it: film longer, or at another frame rate"
        )


class _Cells:
    """The lines of each cell."""

    def __init__(self, footage: Footage, rows: int, line_time: float | None) -> None:
        self.footage = footage
        self.line_time = line_time
        self.edges = np.linspace(0, footage.lines, rows + 1).astype(int)
        self.light = footage.light[..., footage.channels.index("all")]
        whole = self.light.mean(axis=0, dtype=float)
        parts = [whole[a:b].mean(axis=0) for a, b in zip(self.edges[:-1], self.edges[1:], strict=True)]
        self.mean = np.array(parts)
        self.dark = self.mean < _DARK * self.mean.max()

    def lines(self, row: int, column: int) -> FloatArray:
        """Lines of a cell, shape (t, r); one alone where their times are unknown."""
        part = self.light[:, self.edges[row] : self.edges[row + 1], column].astype(float)
        return part if self.line_time is not None else part.mean(axis=1, keepdims=True)

    def number(self, row: int) -> float:
        """Number of the middle line of a cell."""
        return float(self.edges[row] + self.edges[row + 1] - 1) / 2 + self.footage.first_line

    def rows(self, row: int, column: int) -> Rows:
        """Lines of a cell about the middle of the footage and of the cell."""
        return Rows.of(self.lines(row, column), self.footage.times, float(self.footage.times.mean()))

    def frequencies(self) -> FloatArray:
        """Frequency of each cell, shape (rows, columns), NaN where there is none. [Hz]"""
        if self.line_time is not None and self.footage.frame_rate < _FAST:
            found = np.full(self.mean.shape, find_bands(self.footage, self.line_time).frequency)
            return np.where(self.dark, np.nan, found)
        series = np.stack([[self.lines(r, c)[:, 0] for c in range(self.mean.shape[1])] for r in range(len(self.mean))])
        deviation = series / np.maximum(series.mean(axis=2, keepdims=True), 1e-9) - 1
        deviation[self.dark] = 0
        size: int = scipy.fft.next_fast_len(8 * series.shape[2])
        window = np.hanning(series.shape[2])
        power = np.abs(scipy.fft.rfft(deviation * window, size, axis=2)) ** 2
        lowest = 24  # three cycles in the footage
        power[..., :lowest] = 0
        floor = np.median(power[..., lowest:], axis=2)
        whole = power.sum(axis=(0, 1))
        common = int(whole.argmax())
        own = power.argmax(axis=2)
        near = power[..., max(common - 2, 0) : common + 3].max(axis=2)
        chosen = np.where(near > 0.3 * power.max(axis=2), common, own)
        found = np.full(self.mean.shape, np.nan)
        for bin_ in np.unique(chosen[~self.dark]):
            members = (chosen == bin_) & ~self.dark
            found[members] = self._refined(deviation[members], window, bin_ / size * self.footage.frame_rate)
        clear = np.take_along_axis(power, chosen[..., None], axis=2)[..., 0] > 25 * floor
        clear &= deviation.std(axis=2) > 1e-3
        return np.where(clear, found, np.nan)

    def _refined(self, deviation: FloatArray, window: FloatArray, frequency: float) -> float:
        from scipy.optimize import minimize_scalar

        times = self.footage.times
        cell = 0.4 / (times[-1] - times[0])

        def loss(f: float) -> float:
            turned = np.exp(-2j * np.pi * np.outer(times, f * np.arange(1, 3))) * window[:, None]
            return -float((np.abs(deviation @ turned) ** 2).sum())

        return float(minimize_scalar(loss, bounds=(frequency - cell, frequency + cell), method="bounded").x)


def _fit(cells: _Cells, place: Any, frequency: float) -> StripeFit:
    turns = frequency * cells.line_time if cells.line_time is not None else 0.0
    limit = None if cells.line_time is not None and cells.footage.frame_rate < _FAST else cells.footage.frame_rate
    return fit_at(cells.rows(*place), frequency, turns, frame_rate=limit)


def _harmonics(fit: StripeFit) -> Harmonics:
    """Harmonics of a cell with what coding does to them: a share of the strongest, and faint bands erased."""
    strongest = float(np.abs(fit.amplitudes).max())
    return Harmonics.of(fit, (_CODED * strongest) ** 2 + (_CODED * math.exp(-strongest / _FAINT)) ** 2)


def _likeliest_exposure(cells: _Cells, frequencies: FloatArray) -> float:
    """Exposure with which pulses fit the brightest flickering cells best. [s]"""
    level = np.where(np.isfinite(frequencies), cells.mean, 0.0)
    places = [np.unravel_index(int(k), level.shape) for k in np.argsort(level, axis=None)[::-1][:4]]
    seen = []
    for place in places:
        if level[place] > 0:
            fit = _fit(cells, place, float(frequencies[place]))
            if fit.amplitudes.size:
                seen.append(_harmonics(fit))
    exposures = np.linspace(0.05, 1.0, 20) / cells.footage.frame_rate
    losses = [sum(pulse_loss(one, float(exposure)) for one in seen) for exposure in exposures]
    return float(exposures[int(np.argmin(losses))])


def _measure(cells: _Cells, place: Any, frequency: float, exposure: float, grids: dict[str, FloatArray]) -> None:
    if not math.isfinite(frequency):
        grids["depth"][place] = 0.0
        return
    turns = frequency * cells.line_time if cells.line_time is not None else 0.0
    fit = _fit(cells, place, frequency)
    first = np.abs(fit.amplitudes[:1])
    if first.size == 0 or not (np.abs(fit.amplitudes) > 5 * fit.errors).any():
        grids["depth"][place] = 0.0
        return
    grids["frequency"][place] = frequency
    seen = _harmonics(fit)
    depth, duty, phase = _shape(seen, fit, exposure)
    # phases count from the middle of the footage and of the cell: back to the first line of the picture
    lag = turns * cells.number(place[0])
    grids["depth"][place], grids["duty"][place] = depth, duty
    grids["phase"][place] = _wrap(np.array(phase - lag))


def _shape(seen: Harmonics, fit: StripeFit, exposure: float) -> tuple[float, float, float]:
    """Percent flicker, duty cycle (NaN if it is no rectangle) and phase ahead of the middle. [%, 1, cycles]"""
    plain = duty_of(seen, exposure)
    if plain is not None:
        return 100.0, plain[0], -(plain[1] - plain[0] / 2)
    pulse = fit_pulse(seen, exposure)
    duty, share, middle = pulse.duty, pulse.share, pulse.middle
    if not is_rectangle(pulse):
        free = undo_exposure(seen, exposure)
        numbers, amplitudes = (free.numbers, free.amplitudes) if free.numbers.size else (fit.harmonics, fit.amplitudes)
        low, high, _ = extremes(numbers, amplitudes)
        crest = float(np.angle(fit.amplitudes[0]) / (2 * np.pi))
        return 100 * (high - low) / (high + low), math.nan, crest
    return 100 * share / (share * (1 - 2 * duty) + 2 * duty), duty, -(middle - duty / 2)


def _wrap(cycles: FloatArray) -> FloatArray:
    return np.asarray((cycles + 0.5) % 1.0 - 0.5)


def _zones(grids: dict[str, FloatArray], mean: FloatArray, dark: npt.NDArray[np.bool_]) -> tuple[Zone, ...]:
    """Grow zones from neighbour to neighbour, brightest first."""
    known = np.isfinite(grids["frequency"]) & ~dark
    label = np.full(mean.shape, -1)
    zones: list[list[Any]] = []
    for place in sorted(zip(*np.nonzero(known), strict=True), key=lambda p: -mean[p]):
        if label[place] >= 0:
            continue
        label[place] = len(zones)
        members, edge = [place], [place]
        while edge:
            row, column = edge.pop()
            for other in ((row + 1, column), (row - 1, column), (row, column + 1), (row, column - 1)):
                inside = 0 <= other[0] < mean.shape[0] and 0 <= other[1] < mean.shape[1]
                if inside and known[other] and label[other] < 0 and _alike(grids, (row, column), other):
                    label[other] = len(zones)
                    members.append(other)
                    edge.append(other)
        zones.append(members)
    least = 2 if any(len(members) > 2 for members in zones) else 1
    found = [_zone(members, grids, mean) for members in zones if len(members) >= least]
    return tuple(sorted(found, key=lambda zone: -zone.mean))


def _alike(grids: dict[str, FloatArray], one: tuple[int, int], other: tuple[int, int]) -> bool:
    apart = {name: abs(float(grid[one] - grid[other])) for name, grid in grids.items()}
    phase = abs((apart["phase"] + 0.5) % 1.0 - 0.5)
    duty = apart["duty"] if math.isfinite(apart["duty"]) else 0.0
    same = apart["frequency"] < _SAME * grids["frequency"][one]
    return bool(same and apart["depth"] < _DEPTH and duty < _DUTY and phase < _PHASE)


def _zone(members: list[tuple[int, int]], grids: dict[str, FloatArray], mean: FloatArray) -> Zone:
    index = tuple(np.array(members).T)
    turned = np.exp(2j * np.pi * grids["phase"][index])
    duty = grids["duty"][index]
    return Zone(
        tuple(sorted((int(row), int(column)) for row, column in members)),
        float(np.median(grids["frequency"][index])),
        float(np.median(grids["depth"][index])),
        float(np.nanmedian(duty)) if np.isfinite(duty).any() else None,
        float(np.angle(np.median(turned.real) + 1j * np.median(turned.imag)) / (2 * np.pi)),
        float(mean[index].mean()),
    )


def _relative(zone: Zone, reference: float) -> Zone:
    phase = None if zone.phase is None else float(_wrap(np.array(zone.phase - reference)))
    return Zone(zone.cells, zone.frequency, zone.percent_flicker, zone.duty, phase, zone.mean)


def _kind(zones: tuple[Zone, ...]) -> str:
    """Name what the zones do together."""
    if not zones:
        return "no flicker"
    if len(zones) == 1:
        return "one zone"
    phases = np.array([zone.phase or 0.0 for zone in zones])
    places = np.array([np.mean(np.array(zone.cells), axis=0) for zone in zones])
    if np.abs(phases).max() < _PHASE:
        return "zones"
    for axis in (0, 1):
        order = np.argsort(places[:, axis])
        run = np.unwrap(phases[order], period=1.0)
        spread = np.ptp(places[:, axis])
        if len(zones) >= 3 and spread > 0 and np.ptp(run) > 0.1:
            fit = np.polyfit(places[order, axis], run, 1)
            if np.abs(run - np.polyval(fit, places[order, axis])).max() < 0.04:
                return "scanning backlight"
    return "staggered zones"
