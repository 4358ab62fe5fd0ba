"""Margins in words: how far a light is from each limit, and what change reaches it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from flicker.camera.frequencies import CleanFrequencies
from flicker.figures import quantity, round_down, round_up
from flicker.limits import Margin
from flicker.report.typesetting import wrap
from flicker.report.verdicts import OUTCOME_WORDS

if TYPE_CHECKING:
    from flicker.tunable import TunableLight

_HEAD = ("limit", "now", "frequency from", "depth up to", "shrink ripple", "add steady", "reservoir")
_NOTES = (
    "Each column is a cure by itself. Frequency from: the lowest frequency from which on this waveform always passes. "
    "Depth up to: the deepest percent flicker that passes at this frequency. Shrink ripple: the factor, and dB, by "
    "which every deviation from the mean must shrink. Add steady: steady light, in percent of the present mean."
)
_RESERVOIR = (
    " Reservoir: by how much its capacitance must grow if the ripple is that of a single-stage converter with a "
    "capacitor beside the string (depth = 1/√(1 + (2ωRC)²), light following the current); allow for its end of life."
)


def margin_words(title: str, light: TunableLight, margins: Sequence[Margin], *, width: int = 100) -> str:
    """
    Say for each limit what the light may become and must become.

    Parameters
    ----------
    title : str
        Which light.
    light : TunableLight
        The light as it is.
    margins : sequence of Margin
        One a limit.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        The light in a line, the change that keeps all limits, a row for each limit.
    """
    depth = f"percent flicker {quantity(light.percent_flicker(1.0), '%')}"
    what = f"{quantity(light.frequency, 'Hz', 6)}, {depth}" if light.frequency else "steady light"
    lines = [f"{title}: {what}", *wrap(_all_at_once(margins), width, "  "), ""]
    head = _HEAD if any(one.capacitance_factor is not None for one in margins) else _HEAD[:-1]
    rows = [_row(one)[: len(head)] for one in margins]
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    lines += [_line(row, wide) for row in (head, *rows)]
    reasons: dict[str, list[str]] = {}
    for one in margins:
        reason = str(one.to_dict()["reason"])
        if reason:
            reasons.setdefault(reason, []).append(one.limit.id)
    if reasons:
        lines.append("")
    for reason, limits in reasons.items():
        lines += wrap(f"– {', '.join(limits)}: {reason}", width, "", 2)
    return "\n".join(lines)


def column_notes(margins: Sequence[Margin], *, width: int = 100) -> str:
    """Say what the columns of the table mean."""
    reservoir = _RESERVOIR if any(one.capacitance_factor is not None for one in margins) else ""
    return "\n".join(wrap(_NOTES + reservoir, width, ""))


def _all_at_once(margins: Sequence[Margin]) -> str:
    """Say what keeps every limit that can be decided and is not kept yet."""
    broken = [one for one in margins if one.verdict == "fail" or (one.ripple_factor or 1.0) > 1.0]
    open_ = sum(one.verdict == "undecided" for one in margins)
    tail = f" {open_} cannot be decided." if open_ else ""
    if not broken:
        return ("No limit is broken." if margins else "No limit was asked for.") + tail
    ways = []
    frequencies = [one.least_frequency for one in broken]
    known = [frequency for frequency in frequencies if frequency is not None]
    on_mains = any(one.capacitance_factor is not None for one in broken)
    if len(known) == len(broken) and not on_mains:
        ways.append(f"raise the frequency to {quantity(round_up(max(known)), 'Hz')}")
    ripples = [one.ripple_factor for one in broken]
    if all(ripples):
        worst = max(broken, key=lambda one: one.ripple_factor or 0.0)
        fold = quantity(round_up(worst.ripple_factor or 1.0), "", 3)
        ways.append(f"shrink the modulation {fold}-fold ({quantity(worst.ripple_decibels or 0.0, 'dB', 3)})")
    cure = " or ".join(ways) if ways else "no single change helps"
    those = "the broken limit" if len(broken) == 1 else f"the {len(broken)} broken limits"
    return f"To keep {those}: {cure}.{tail}"


def _row(one: Margin) -> tuple[str, ...]:
    ripple = steady = reservoir = "–"
    if one.ripple_factor is not None and one.ripple_decibels is not None and one.pedestal is not None:
        fold = quantity(round_up(one.ripple_factor), "", 3)
        ripple = _none_or(one.pedestal, f"{fold}-fold, {quantity(one.ripple_decibels, 'dB', 3)}")
        steady = _none_or(one.pedestal, quantity(100 * round_up(one.pedestal or 1.0), "%", 3))
    if one.capacitance_factor is not None:
        grown = quantity(round_up(one.capacitance_factor), "", 3)
        reservoir = _none_or(one.capacitance_factor - 1.0, f"× {grown}")
    return (
        one.limit.id,
        OUTCOME_WORDS[one.verdict],
        "–" if one.least_frequency is None else quantity(round_up(one.least_frequency), "Hz"),
        "–" if one.most_percent_flicker is None else quantity(round_down(one.most_percent_flicker), "%", 3),
        ripple,
        steady,
        reservoir,
    )


def _none_or(change: float, text: str) -> str:
    return "none" if change == 0 else text


def _line(cells: Sequence[str], wide: Sequence[int]) -> str:
    left = "  ".join(text.ljust(space) for text, space in zip(cells[:2], wide[:2], strict=True))
    right = "  ".join(text.rjust(space) for text, space in zip(cells[2:], wide[2:], strict=True))
    return f"{left}  {right}".rstrip()


def camera_words(found: CleanFrequencies, limit: float, settings: int, *, width: int = 100) -> str:
    """Say which PWM frequencies keep the band contrast on every camera and exposure, best first."""
    head = f"PWM frequencies whose bands stay within {quantity(100 * limit, '%', 3)} at all {settings} camera settings"
    lines = [f"{head}:"]
    lines += [
        f"  {quantity(choice.frequency, 'Hz', 6):>12}  {quantity(100 * choice.worst_contrast, '%', 2):>7} at "
        f"{_exposure(choice.exposure)}" + (f" ({choice.camera})" if choice.camera else "")
        for choice in found.choices
    ]
    if not found.choices:
        lines.append("  none below the frequency from which on all are")
    lines += wrap(
        f"From {quantity(round_up(found.all_from), 'Hz')} on every frequency does. The percentage is that of the "
        "deepest band within the oscillator's tolerance, at the worst duty cycle of the range.",
        width,
        "  ",
    )
    return "\n".join(lines)


def _exposure(exposure: float) -> str:
    whole = round(1.0 / exposure)
    return f"1/{whole} s" if whole > 1 and abs(exposure * whole - 1.0) < 1e-9 else quantity(exposure, "s")
