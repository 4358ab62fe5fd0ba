"""Whether the level of a capture can be what it seems: coupling, sign, dark level."""

from __future__ import annotations

from flicker.conditioning._shape import Shape, with_unit
from flicker.results import DEPTH_MEASURES, Note
from flicker.trace import Trace


def with_coupling_judged(trace: Trace, *, sound: bool) -> Trace:
    """Recognise AC coupling: the readings go both ways about zero."""
    shape = Shape.of(trace)
    if shape.about_zero or (sound and shape.mean > 0 and shape.below_dark):
        return trace.replace(mean_known=False, note=_ac_coupled(sound))
    return trace


def with_level_judged(trace: Trace, sound: bool, dc_coupled: bool, inverted: bool) -> Trace:
    """Say what is doubtful about level and sign of a trace that is not known to have lost its mean."""
    if not trace.mean_known:
        return trace
    shape = Shape.of(trace)
    if shape.mean <= 0 or (shape.below_dark and -shape.low > shape.high):
        return trace.replace(note=_not_above_dark(trace, shape, inverted))
    if shape.below_dark:
        return trace.replace(note=_partly_below_dark(trace, shape))
    if sound and not dc_coupled:
        trace = trace.replace(note=_COUPLING_ASSUMED)
    return trace if trace.dark_level is not None else trace.replace(note=_dark_assumed(trace, shape))


_COUPLING_ASSUMED = Note(
    "coupling-assumed",
    "warning",
    "the sound file never crosses zero and is believed to hold the mean level; if its recorder is AC-coupled, every "
    "depth is wrong: confirm with --dc-coupled, or state the true mean with --mean",
)


def _ac_coupled(sound: bool) -> Note:
    cure = "record DC-coupled, or state the true mean level with --mean"
    if sound:
        cure += ", or --dc-coupled if zero in this file really is dark"
    return Note(
        "ac-coupled",
        "warning",
        "the readings swing both ways about zero: AC coupling has lost the mean level, so frequency, duty cycle and "
        f"shape can be told but no depth; {cure}",
        voids=DEPTH_MEASURES,
    )


def _not_above_dark(trace: Trace, shape: Shape, inverted: bool) -> Note:
    if inverted:
        level = f"with --inverted the mean lies {with_unit(-shape.mean, trace)} below dark"
        message = f"{level}: leave --inverted out, or check --dark-level"
    elif trace.dark_level:
        level = f"the mean reading lies {with_unit(-shape.mean, trace)} below the dark level"
        message = f"{level}: check --dark-level; if more light reads lower, state --inverted"
    else:
        level = f"the mean reading is {with_unit(shape.mean, trace)}, below zero"
        message = (
            f"{level}: if more light reads lower, as behind an inverting amplifier, state --inverted, "
            "else state the dark level with --dark-level"
        )
    return Note("negative-light", "error", message, voids=DEPTH_MEASURES)


def _partly_below_dark(trace: Trace, shape: Shape) -> Note:
    dark = f"the dark level {with_unit(trace.dark_level, trace)}" if trace.dark_level else "zero, taken as dark"
    return Note(
        "negative-light",
        "error",
        f"readings fall {with_unit(-shape.low, trace)} below {dark}, which light cannot: measure the reading with "
        "the light blocked and state it with --dark-level, or state --mean if the capture is AC-coupled",
        voids=DEPTH_MEASURES,
    )


def _dark_assumed(trace: Trace, shape: Shape) -> Note:
    """Say what a dark level of 1 % of the mean would change."""
    dark = 0.01 * shape.mean
    low, high = max(shape.low, 0.0), shape.high
    points = 100 * (high - low) * (1 / max(high + low - 2 * dark, high - low) - 1 / (high + low)) if high > low else 0.0
    return Note(
        "dark-assumed",
        "info",
        f"no dark level was stated and zero is taken as dark; were it 1 % of the mean ({with_unit(dark, trace)}), "
        f"percent flicker would be {points:.2g} points higher and all that is relative to the mean 1 % of itself: "
        "measure with the light blocked and state --dark-level",
    )
