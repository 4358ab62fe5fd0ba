"""Bands in words: what you will see, why, and what to dial in."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from flicker.camera.shutter import Setting, exposure_label, standing_frame_rates
from flicker.figures import quantity
from flicker.report.typesetting import Paint, wrap

if TYPE_CHECKING:
    from flicker.camera import Camera, Prediction
    from flicker.camera.answer import Answer
    from flicker.light import Light
    from flicker.plots.clip import Clip

_LABEL = 9
_NULL = 5e-4  # of a cycle: how near to whole cycles an exposure counts as a null
_UNCRITICAL = 20.0  # how far off an exposure or a frequency never is [%]
_SHOWN = 0.05  # frame flicker below which it is not worth a word [%]
_OPPOSITE = {"down": "up", "up": "down", "left": "right", "right": "left"}
_SAME = 1e-6  # by so little exposures of one setting differ


def percent(value: float) -> str:
    """Give a contrast [%] with the digits that help: `0.04 %`, `2.44 %`, `66.7 %`."""
    return "0 %" if value < 0.005 else quantity(value, "%", 3) if value >= 0.995 else quantity(value, "%", 2)


def cell(value: float | None) -> str:
    """Give a contrast [%] for a column of a table."""
    return "–" if value is None else f"{value:.2f} %" if value < 99.995 else "100 %"


def bands_words(answer: Answer, *, width: int = 100, colour: bool = False) -> str:
    """
    Put predictions and advice into words for a terminal.

    Parameters
    ----------
    answer : Answer
        At least one prediction, and the advice.
    width, colour
        Columns of a line, and whether to paint.
    """
    paint = Paint(colour=colour)
    light, camera, predictions = answer.light, answer.camera, answer.predictions
    tolerance = answer.tolerance
    worst = max(predictions, key=lambda one: one.deepest)
    blocks: list[list[str]] = [[paint.bold(light_words(light)), camera_words(camera)]]
    if len(predictions) > 1:
        blocks.append(list(_table(predictions, camera, tolerance, paint)))
    answers: dict[str, list[str]] = {}
    movements = _movements(predictions, camera)
    if len(predictions) == 1:
        answers["See"] = [f"{name_of(worst, camera)}: {see(worst, camera)}"]
    elif len(movements) == 1:
        depth = see(worst, camera).split(",")[0]
        answers["See"] = [f"{movements.pop()}; the worst is {name_of(worst, camera)}, {depth}"]
    answers["Why"] = [why(light, camera, worst)]
    answers["Colour"] = list(colour_words(worst))
    answers["Frames"] = list(frames_words(light, camera, predictions))
    answers["Dial in"] = list(dial_in(answer))
    blocks.append(list(_answers(answers, width, paint)))
    notes = list(notes_of(answer))
    if notes:
        blocks.append([line for note in notes for line in wrap(note, width, "  ", hang=2)])
    return "\n\n".join("\n".join(block) for block in blocks)


def _answers(answers: dict[str, list[str]], width: int, paint: Paint) -> Iterable[str]:
    for label, texts in answers.items():
        for number, text in enumerate(texts):
            first, *rest = wrap(text, width - _LABEL - 2, "")
            head = f"{label if number == 0 else '':<{_LABEL}}"
            yield f"  {paint.faint(head)}{paint.bold(first) if label == 'See' else first}"
            yield from (f"  {'':<{_LABEL}}{line}" for line in rest)


def light_words(light: Light) -> str:
    """Name the light by its numbers: frequency, duty, or the depth of its strongest line."""
    if light.frequency is None:
        return "Steady light"
    channel = next(channel for channel in light if channel.frequency)
    words = f"Light of {quantity(light.frequency, 'Hz', 6)}"
    if channel.pulse is not None:
        words += f", on for {quantity(100 * channel.pulse.duty, '%', 3)} of each period"
        if channel.pulse.low_level:
            words += f", {quantity(100 * channel.pulse.low_level, '%', 3)} of that light when off"
        slow = [f"{one.name} {quantity(one.pulse.decay, 's', 3)}" for one in light if one.pulse and one.pulse.decay]
        return words + (f", decaying slowly ({', '.join(slow)})" if slow else "")
    others = [quantity(one, "Hz", 5) for one in channel.fundamentals[1:]]
    return words + (f" with {' and '.join(others)}" if others else "")


def camera_words(camera: Camera) -> str:
    """Name the camera by its numbers."""
    words = [] if camera.frame_rate is None else [f"{quantity(camera.frame_rate, 'frames/s', 6)}"]
    if camera.shutter == "global":
        words.append("global shutter")
    elif camera.lines is not None and camera.line_time is not None:
        words.append(f"{camera.lines} lines, one every {quantity(camera.line_time, 's', 4)}")
        words.append(f"{quantity(camera.lines * camera.line_time, 's', 3)} from first to last")
    elif camera.readout_time is not None:
        words.append(f"lines read in {quantity(camera.readout_time, 's', 3)}")
    elif camera.line_time is not None:
        words.append(f"one line every {quantity(camera.line_time, 's', 4)}")
    return f"{camera.name or 'Camera'}: {', '.join(words) or 'nothing known but the exposure'}"


def name_of(one: Prediction, camera: Camera) -> str:
    """Name the exposure, or the staggered ones, as people dial them."""
    if isinstance(one.exposure_s, tuple):
        return " + ".join(exposure_label(length) for length in one.exposure_s)
    return exposure_label(one.exposure_s, camera.frame_rate)


def _table(predictions: Sequence[Prediction], camera: Camera, tolerance: float | None, paint: Paint) -> Iterable[str]:
    pulsing = camera.shutter == "global"
    figures = [one.frame_flicker_percent if pulsing else one.contrast_percent for one in predictions]
    heads = ["exposure", *(figures[0] if len(figures[0]) > 1 else ["pulsing" if pulsing else "contrast"])]
    rows = [[name_of(one, camera), *map(cell, row.values())] for one, row in zip(predictions, figures, strict=True)]
    if tolerance:
        heads.append(f"±{quantity(100 * tolerance, '%', 3)}")
        for row, one in zip(rows, predictions, strict=True):
            row.append(cell(one.worst_frame_flicker_percent if pulsing else one.worst_contrast_percent))
    sizes = [max(len(row[column]) for row in [heads, *rows]) for column in range(len(heads))]

    def line(cells: Sequence[str]) -> str:
        return "  ".join(f"{cell:{'<' if i == 0 else '>'}{sizes[i]}}" for i, cell in enumerate(cells))

    yield "  " + paint.faint(f"{line(heads)}  what you see")
    for row, words in zip(rows, seen_words(predictions, camera), strict=True):
        yield f"  {line(row)}  {words}"


def seen_words(predictions: Sequence[Prediction], camera: Camera) -> list[str]:
    """Tell for a row of a table what each shows; bands and their roll only where they are not all alike."""
    alike = len(_movements(predictions, camera)) == 1
    rows = []
    for one in predictions:
        words = one.visibility if alike or not one.visible else f"{one.visibility}: {bands_and_roll(one, camera)}"
        if one.worst_visibility != one.visibility:
            words += f", {one.worst_visibility} where the frequency is off"
        rows.append(words)
    return rows


def _movements(predictions: Sequence[Prediction], camera: Camera) -> set[str]:
    return {bands_and_roll(one, camera) for one in predictions if one.visible}


def see(one: Prediction, camera: Camera) -> str:
    """Tell what the picture shows: how bad, how deep, how many bands, which way they roll."""
    contrast = max(one.contrast_percent.values())
    flicker = max((value or 0.0 for value in one.frame_flicker_percent.values()), default=0.0)
    if camera.shutter == "global":
        if not one.visible:
            return "invisible: every frame collects the same light"
        return f"{one.visibility}: the whole picture pulses by {percent(flicker)}{_beat(one)}"
    if not one.visible:
        return f"no visible bands ({percent(contrast)})"
    words = f"{one.visibility}: {percent(contrast)} deep, {bands_and_roll(one, camera)}".rstrip(", ")
    if flicker > max(_SHOWN, contrast / 2):
        words += f"; the whole picture pulses by {percent(flicker)}{_beat(one)}"
    return words


def bands_and_roll(one: Prediction, camera: Camera) -> str:
    """Tell how many bands the picture holds and which way they roll."""
    if camera.shutter == "global":
        return f"the whole picture pulses{_beat(one)}"
    parts = []
    if one.bands_per_frame is not None:
        bands = quantity(one.bands_per_frame, "", 2 if one.bands_per_frame < 10 else 3)
        parts.append(f"{bands} {'band' if bands == '1' else 'bands'} in the picture")
        if one.bands_per_frame < 1:
            parts[0] = f"{quantity(one.bands_per_frame, '', 2)} of a band in the picture"
    if one.band_period_lines is not None:
        parts.append(f"{quantity(one.band_period_lines, 'lines', 3)} each")
    parts.append(roll(one, camera))
    return ", ".join(part for part in parts if part)


def roll(one: Prediction, camera: Camera) -> str:
    """Tell which way the bands roll in the picture as stored, and how fast."""
    if one.standing:
        return "standing still"
    if one.drift_lines_per_frame is None or one.drift_seconds_per_band is None:
        return ""
    period = f"one every {float(f'{one.drift_seconds_per_band:.2g}'):g} s"
    rate = camera.frame_rate or 0.0
    if abs(abs(one.beat_frequency_hz or 0.0) - rate / 2) < 1e-6 * rate:
        return f"jumping by half a band with every frame, {period}"
    way = camera.read_direction if one.drift_lines_per_frame > 0 else _OPPOSITE[camera.read_direction]
    return f"rolling {way}, {period}"


def _beat(one: Prediction) -> str:
    if one.standing or not one.beat_frequency_hz:
        return ""
    return f", {quantity(abs(one.beat_frequency_hz), 'times', 3)} a second"


def why(light: Light, camera: Camera, one: Prediction) -> str:
    """Give the reason in one sentence, with the numbers of this light and this camera."""
    frequency = light.frequency
    if frequency is None:
        return "The light is steady, so every line collects the same."
    exposures = one.exposure_s if isinstance(one.exposure_s, tuple) else (one.exposure_s,)
    name = " + ".join(exposure_label(length) for length in exposures)
    cycles = sum(exposures) * frequency
    what = "frame" if camera.shutter == "global" else "line"
    head = f"{name} lets in {quantity(cycles, '', 4)} cycles of the {quantity(frequency, 'Hz', 5)} light"
    nearest = round(cycles)
    named = f"the {quantity(frequency, 'Hz', 5)} light"
    if len(exposures) == 1 and nearest and abs(cycles - nearest) < _NULL * nearest and one.deepest < 0.1:
        return f"{name} lets in {_cycles(nearest)} of {named}, so every {what} collects the same."
    if cycles < 1:
        return (
            f"{name} is shorter than one cycle of {named} ({quantity(1 / frequency, 's', 3)}): some {what}s fall on "
            "its bright part, others on its dark part."
        )
    if len(exposures) == 1 and _flashes(light, cycles) is not None:
        return f"{head}: {_flashes(light, cycles, what)}."
    return f"{head}, not a whole number: what the cut-off cycle brings, bright or dark, differs from {what} to {what}."


def _cycles(number: int) -> str:
    return "exactly one cycle" if number == 1 else f"{number} whole cycles"


def _flashes(light: Light, cycles: float, what: str = "line") -> str | None:
    """Tell how many flashes the luckiest and the unluckiest line catch, where whole flashes can be counted."""
    pulses = [channel.pulse for channel in light if channel.pulse is not None]
    if not pulses or any(pulse.low_level > 0 for pulse in pulses):
        return None
    duty, rest = pulses[0].duty, cycles % 1.0
    whole = math.floor(cycles)
    if rest >= duty and rest <= 1 - duty:
        return f"some {what}s catch {whole + 1} of its flashes, others only {whole}"
    return None


def colour_words(one: Prediction) -> Iterable[str]:
    """Name the colours of the bands, where they have any."""
    colours = one.colours
    if colours is None or not one.visible or colours.chroma_contrast_percent < 0.5:
        return
    names = f"bright bands {colours.bright_name}, dark bands {colours.dark_name}"
    yield f"{names}; the ratio of two colours swings by {percent(colours.chroma_contrast_percent)}"


def frames_words(light: Light, camera: Camera, predictions: Sequence[Prediction]) -> Iterable[str]:
    """Name the frame rates at which the bands stand still."""
    if light.frequency is None or camera.frame_rate is None or not any(one.visible for one in predictions):
        return
    rates = standing_frame_rates(light.frequency, camera.frame_rate)
    if rates:
        listed = ", ".join(quantity(rate, "", 6) for rate in rates)
        what = "every frame is alike" if camera.shutter == "global" else "the bands stand still and look like lighting"
        yield f"at {listed} frames/s {what}: cure the light by the exposure, not by the frame rate"


def dial_in(answer: Answer) -> Iterable[str]:
    """Name the exposures that cure it, or say that none does and what would help."""
    advice, tolerance, limit = answer.advice, answer.tolerance or 0.0, answer.limit
    if answer.light.frequency is None or not advice:
        return
    clean = [one for one in advice if one.clean][:3]
    size = max((len(one.label) for one in clean), default=0)
    for number, one in enumerate(clean):
        yield f"{one.label:<{size}}  {_left(one, tolerance)}{_window(one, explain=number == 0)}"
    yield from _nearest(answer, clean)
    if clean:
        return
    best = advice[0]
    yield (
        f"Nothing that can be dialled in keeps the bands within {percent(100 * limit)}; the best is {best.label}, "
        f"with up to {percent(best.deepest)}."
    )
    yield from _what_would_help(answer.light.frequency, answer)


def _nearest(answer: Answer, shown: Sequence[Setting]) -> Iterable[str]:
    """Name the clean exposures nearest to those that are not, unless they are shown already."""
    named = {one.exposure_s for one in shown}
    for one, nearest in zip(answer.predictions, answer.nearest_clean, strict=True):
        if nearest and nearest.exposure_s not in named and one.worst_contrast_percent > 100 * answer.limit:
            named.add(nearest.exposure_s)
            words = f"{_left(nearest, answer.tolerance or 0.0)}{_window(nearest, explain=False)}"
            yield f"nearest to {name_of(one, answer.camera)}: {nearest.label}, {words}"


def _left(one: Setting, tolerance: float) -> str:
    if tolerance:
        return f"at most {percent(one.deepest)} over the tolerance"
    return f"{percent(max(one.contrast_percent, one.deepest))} left"


def _window(one: Setting, *, explain: bool) -> str:
    if one.window_percent is None:
        return ""
    if min(one.window_percent) > _UNCRITICAL:
        return ", and not critical"
    words = f", clean within ±{quantity(min(one.window_percent), '%', 2)}"
    if one.window_deg is not None:
        words += f" (±{quantity(min(one.window_deg), '', 2)}°)"
    return words + (" of exposure or frequency" if explain else "")


def _what_would_help(frequency: float, answer: Answer) -> Iterable[str]:
    camera, advice = answer.camera, answer.advice
    tolerance, limit = answer.tolerance or 0.0, answer.limit
    longest = max([one.exposure_s for one in advice] + ([1 / camera.frame_rate] if camera.frame_rate else []))
    cycles = math.floor(longest * frequency * (1 + 1e-9))
    help_ = []
    if cycles < 1:
        help_.append(f"a slower frame rate: one whole cycle takes {quantity(1 / frequency, 's', 3)}")
    elif all(one.contrast_percent > 100 * limit for one in advice):
        near = max(1, min(cycles, round(0.5 * frequency / camera.frame_rate))) if camera.frame_rate else cycles
        label = exposure_label(near / frequency, camera.frame_rate)
        if not any(abs(one.exposure_s * frequency / near - 1) < _SAME for one in advice):  # else it was tried
            cycle = "whole cycle" if near == 1 else "whole cycles"
            help_.append(f"a shutter that can be set freely: {label} lets in {near} {cycle}")
    elif tolerance:
        help_.append(f"a steadier light: without the tolerance of {quantity(100 * tolerance, '%', 2)} some are clean")
    needed = math.ceil((1 / limit - 1) / 2 - 1e-9) / advice[0].exposure_s
    if needed > frequency:
        label = exposure_label(advice[0].exposure_s)
        help_.append(f"a light of {quantity(needed, 'Hz', 2)} or more, which at {label} cannot band deeper than that")
    help_.append("a light that is dimmed by its current instead of by switching")
    yield f"What would help: {'; '.join(help_)}."


def notes_of(answer: Answer) -> Iterable[str]:
    """Say what does not fit, what was taken as exact, and what is unknown; `!` begins a warning, `i` the rest."""
    predictions = answer.predictions
    yield from _misfits(answer)
    if answer.tolerance is None and answer.light.frequency is not None:
        yield "i The light's frequency is taken as exact: state how far it may be off with --tolerance."
    wander = max((one.wander_contrast_percent or 0.0 for one in predictions), default=0.0)
    if wander:
        yield f"i While the frequency wanders no exposure is a null: up to {percent(wander)} remains."
    if any(one.aliased for one in predictions):
        yield "i The light is faster than half the line rate: the bands are its alias, wider than its own cycles."
    for reason in dict.fromkeys(reason for one in predictions for reason in one.reasons.values()):
        if reason.startswith("the camera's"):
            yield f"i {reason[0].upper()}{reason[1:]}."


def _misfits(answer: Answer) -> Iterable[str]:
    """Name exposures and readouts that do not fit into a frame."""
    rate, readout = answer.camera.frame_rate, answer.camera.readout_time
    if rate is None:
        return
    frame = exposure_label(1 / rate)
    for one in answer.predictions:
        total = sum(one.exposure_s) if isinstance(one.exposure_s, tuple) else one.exposure_s
        if total * rate > 1 + 1e-6:
            name = name_of(one, answer.camera)
            yield f"! {name} does not fit into a frame of {frame}: check exposure and frame rate."
    if answer.camera.shutter == "rolling" and readout is not None and readout * rate > 1 + 1e-6:
        yield (
            f"! Reading all lines takes {quantity(readout, 's', 3)}, longer than a frame of {frame}: "
            "check line time, lines and frame rate."
        )


def clip_words(clip: Clip) -> str:
    """Say what was written, how fast it plays, and the caution that goes with it."""
    speed = "at the speed of life"
    if clip.slowed != 1:
        speed = f"slowed down {quantity(clip.slowed, 'times', 2)} to stay within three flashes a second"
    return (
        f"  clip: {clip.path}, {quantity(clip.duration, 's', 2)}, {speed}\n"
        "  Caution: it shows flicker; people who are sensitive to it should not watch."
    )
