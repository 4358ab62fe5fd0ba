"""The readings over time, and the mean cycle that the depth is read from."""

from __future__ import annotations

from contextlib import suppress
from typing import TYPE_CHECKING

import numpy as np

from flicker.errors import NotMeasurable
from flicker.figures import quantity
from flicker.limits.verdict import COVERAGE
from flicker.markup import Markup, element
from flicker.report.page import section
from flicker.report.sections._chart import Chart, extent

if TYPE_CHECKING:
    from flicker.report.sheets import ChannelSheet
    from flicker.reports import ChannelReport
    from flicker.trace import FloatArray, Trace

_CYCLES_SHOWN = 4
_WHOLE_FROM = 3  # times what the first cycles show: a shorter capture is not drawn a second time
_SAMPLES_SHOWN = 4000  # of light without a frequency


@section(of="channel", title="Waveform", order=30)
def waveform(sheet: ChannelSheet) -> Markup:
    """Draw the whole capture, its first cycles, and the mean cycle with its 95 % band."""
    channel = sheet.channel
    trace = channel.trace
    count = _first_cycles(channel)
    drawn = [_readings(channel, count, _beginning(channel, count))]
    if trace.samples > _WHOLE_FROM * count:
        drawn.append(_readings(channel, trace.samples, "The whole capture"))
    with suppress(NotMeasurable):
        drawn.insert(1, _mean_cycle(channel))
    return element("div", *drawn, class_="drawings")


def _beginning(channel: ChannelReport, count: int) -> str:
    if count >= channel.trace.samples:
        return "As recorded"
    periodic = channel.measures["fundamental_frequency"].value is not None
    return f"The first {'cycles' if periodic else _span(channel.trace, count)}, as recorded"


def _first_cycles(channel: ChannelReport) -> int:
    frequency = channel.measures["fundamental_frequency"].value
    trace = channel.trace
    count = round(trace.sample_rate * _CYCLES_SHOWN / frequency) if frequency else _SAMPLES_SHOWN
    return min(max(count, 8), trace.samples)


def _readings(channel: ChannelReport, count: int, caption: str) -> Markup:
    trace = channel.trace
    light = trace.light[:count]
    factor, unit = _time_unit(count / trace.sample_rate)
    low, high = float(light.min()), float(light.max())
    dark = (trace.dark_level or 0.0) if trace.mean_known else low
    room = 0.08 * ((max(high, dark) - min(low, dark)) or 1.0)
    chart = Chart(
        (0.0, count / trace.sample_rate / factor),
        (min(low, dark) - 2 * room, max(high, dark) + room),
        f"time since the start ({unit})",
        f"reading ({trace.unit})" if trace.unit else "reading",
    )
    times = _times(trace, count) / factor
    if count > 2 * chart.columns:
        chart.area(*extent(times, light, chart.columns), "envelope")
    else:
        chart.line(times, light, "light")
    if trace.mean_known:
        chart.level(dark, "dark level" if trace.dark_level is not None else "zero, taken as dark", "held")
    told = f"Readings from {quantity(low, trace.unit)} to {quantity(high, trace.unit)} over {_span(trace, count)}."
    return chart.figure(caption, told)


def _times(trace: Trace, count: int) -> FloatArray:
    return trace.times()[:count] - trace.start if trace.segments else np.arange(count) / trace.sample_rate


def _span(trace: Trace, count: int) -> str:
    return quantity(count / trace.sample_rate, "s")


def _time_unit(span: float) -> tuple[float, str]:
    return (1.0, "s") if span >= 1 else (1e-3, "ms") if span >= 1e-3 else (1e-6, "µs")


def _mean_cycle(channel: ChannelReport) -> Markup:
    cycle, trace = channel.observation.cycle, channel.trace
    middle = np.angle(np.sum(cycle.levels * np.exp(2j * np.pi * cycle.phase))) / (2 * np.pi)
    phase = (cycle.phase - middle + 0.5) % 1.0
    order = np.argsort(phase)
    scale = cycle.mean if trace.mean_known and cycle.mean > 0 else None
    phase, light = phase[order], cycle.levels[order] / (scale or 1.0)
    spread = COVERAGE * cycle.standard_error[order] / (scale or 1.0)
    low, high = float((light - spread).min()), float((light + spread).max())
    unit = f" ({trace.unit})" if trace.unit else ""
    room = 0.06 * ((high - low) or 1.0)
    chart = Chart(
        (0.0, 1.0),
        (min(0.0, low) if scale else low - room, high + room),
        "phase (cycles), brightest half in the middle",
        "light over its mean" if scale else f"reading about a lost mean{unit}",
    )
    chart.area(phase, light - spread, light + spread, "band")
    chart.line(phase, light, "light")
    chart.level(float(np.mean(light)), "mean", "mean")
    depth = channel.measures["percent_flicker"].value
    caption = "The mean cycle with its 95 % band"
    told = f"From {low:.3g} to {high:.3g}" + (" times the mean." if scale else f"{unit}.")
    return chart.figure(caption, told if depth is None else f"{told} Percent flicker {quantity(depth, '%', 3)}.")
