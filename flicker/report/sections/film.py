"""The light read back from the stripes of a video."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from flicker.figures import measured, quantity
from flicker.markup import Content, Markup, element, markup, pairs, table
from flicker.report.answer import REGION_WORDS
from flicker.report.page import section
from flicker.report.sections._chart import Chart
from flicker.report.sections.answer import region_sign
from flicker.report.sections.figures import not_measured
from flicker.report.sections.notes import note_list
from flicker.report.sections.plane import draw_plane
from flicker.report.video import channel_rows, film_answers, film_recording

if TYPE_CHECKING:
    from flicker.camera.stripes import ChannelStripes
    from flicker.filmed import FilmReport

_POINTS = 400
_LISTED = 12


@section(of="film", title="Answer", order=10)
def film_answer(report: FilmReport) -> Markup:
    """Say what the light is, how deep, how risky, what to do next."""
    deepest = _deepest(report)
    region = report.region(deepest)
    entries: list[tuple[str, Content]] = list(film_answers(report).items())
    entries[-1] = (entries[-1][0], element("strong", entries[-1][1]))
    place = region.region if region else "unknown"
    return markup(
        element("p", region_sign(place), _sentence(report, deepest), class_=f"sentence {place}"),
        element("p", film_recording(report)),
        pairs(entries, class_="answers"),
    )


def _sentence(report: FilmReport, deepest: ChannelStripes) -> str:
    frequency, depth = report.stripes.frequency.value, deepest.measures["percent_flicker"].value
    region = report.region(deepest)
    where = "This light flickers" + (f" at {quantity(frequency, 'Hz', 4)}" if frequency is not None else "")
    if depth is None:
        return f"{where}; how deep cannot be told from this video."
    ends = f": {REGION_WORDS[region.region]} by IEEE 1789-2015" if region else ""
    return f"{where} with a percent flicker of {quantity(depth, '%', 3)} in {deepest.name}{ends}."


def _deepest(report: FilmReport) -> ChannelStripes:
    return max(report.stripes.channels, key=lambda channel: channel.measures["percent_flicker"].value or 0.0)


@section(of="film", title="Figures", order=20)
def film_figures(report: FilmReport) -> Markup | None:
    """List the measures, the channels side by side, and what could not be had."""
    cells = channel_rows(report.stripes.channels)
    pairs_alike = [
        (quantity(pair["frequency_hz"], "Hz", 6), quantity(pair["line_time_s"], "s"))
        for pair in report.stripes.alternatives[:_LISTED]
        if pair.get("line_time_s")
    ]
    frequency = report.stripes.frequency
    return markup(
        element("p", "fundamental frequency ", " ".join(measured(frequency))) if frequency.value is not None else None,
        table(("measure", *cells[0][1:]), cells[1:]) if cells else None,
        not_measured(_deepest(report).measures, report.stripes.notes),
        markup(element("h4", "Pairs that fit alike"), table(("frequency", "line time"), pairs_alike))
        if pairs_alike and frequency.value is None
        else None,
    )


@section(of="film", title="Waveform", order=30)
def film_cycle(report: FilmReport) -> Markup | None:
    """Draw one cycle of the light of each channel, as its lines say."""
    frequency = report.stripes.frequency.value
    known = [channel.light for channel in report.stripes.channels if channel.light is not None]
    lights = [light for light in known if light.name != "all"] or known
    if frequency is None or not lights:
        return None
    phase = np.linspace(0.0, 1.0, _POINTS)
    curves = {light.name: light.at(phase / frequency) for light in lights}
    top = max(float(curve.max()) for curve in curves.values())
    low = min(0.0, *(float(curve.min()) for curve in curves.values()))
    chart = Chart((0.0, 1.0), (low, 1.1 * top), "phase (cycles)", "light over its mean")
    for name, curve in curves.items():
        chart.line(phase, curve, f"channel {name}")
    spoken = {"red": "red: long dashes", "green": "green: solid", "blue": "blue: dots"}
    legend = "; ".join(spoken[name] for name in curves if name in spoken)
    told = "; ".join(
        f"{name} from {curve.min():.3g} to {curve.max():.3g} times the mean" for name, curve in curves.items()
    )
    caption = "One cycle of the light, what the exposure took given back" + (f" ({legend})" if legend else "")
    drawn = chart.figure(caption, f"{told}.")
    return element("div", drawn, class_="drawings")


@section(of="film", title="Where it lies", order=50)
def film_plane(report: FilmReport) -> Markup | None:
    """Draw where the deepest channel lies in the plane of modulation over frequency."""
    deepest = _deepest(report)
    region = report.region(deepest)
    if region is None:
        return None
    told = f"{REGION_WORDS[region.region]}, from channel {deepest.name}"
    drawn = draw_plane(deepest.components, report.families(deepest), region.region, (), told)
    return element("div", drawn, class_="drawings")


@section(of="film", title="Notes", order=70)
def film_notes(report: FilmReport) -> Markup | None:
    """List the doubts, the gravest first."""
    return note_list(report.stripes.notes)


@section(of="film", title="Method", order=80)
def film_method(report: FilmReport) -> Markup | None:
    """Say what was done to the frames."""
    steps = [*report.stripes.footage.history, "scene and light separated jointly, every line at its true time"]
    return element("ol", *(element("li", step) for step in steps))
