"""Verdicts and limits in words: the answer first, then what it rests on, then what to do."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from flicker.figures import measure_name, measured, quantity, round_up
from flicker.limits import OUTCOMES, Curve, Limit, Verdict, overall
from flicker.report.typesetting import wrap
from flicker.results import Measure

OUTCOME_WORDS = {"fail": "FAIL", "undecided": "UNDECIDED", "pass": "pass", "not-applicable": "not applicable"}
_LEGEND = (
    "f is the frequency in Hz. A limit on modulation holds for the depth of every family at its fundamental and for "
    "every line at its own frequency; one on percent flicker over frequency holds for every family."
)
RULES = {
    "guarded": "guarded: pass only where the whole 95 % interval keeps the limit, fail only where all of it breaks it",
    "simple": "simple: the value alone decides; at the limit itself that is wrong up to every second time",
}


def verdict_words(title: str, verdicts: Sequence[Verdict], advice: Sequence[str] = (), *, width: int = 100) -> str:
    """
    Say what the limits make of one channel.

    Parameters
    ----------
    title : str
        Which capture and channel.
    verdicts : sequence of Verdict
        All of it.
    advice : sequence of str
        What to do, a sentence each.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        Headline, advice, a row for each verdict (fails first), the decision rule.
    """
    lines = [f"{title}: {headline(verdicts)}"]
    lines += [line for sentence in advice for line in wrap(sentence, width, "  ")]
    lines.append("")
    lines += _table(sorted(verdicts, key=lambda verdict: OUTCOMES.index(verdict.verdict)), width)
    if verdicts:
        lines += ["", *wrap(f"Decision rule, {RULES[verdicts[0].decision]}.", width, "")]
    return "\n".join(lines)


def cures(verdicts: Sequence[Mapping[str, Any]]) -> list[str]:
    """Say for each broken limit, in the JSON form of its verdict, what change of the light would keep it."""
    sentences = []
    for one in verdicts:
        found = one.get("to_pass", {})
        ways = []
        if found.get("least_frequency_hz"):
            ways.append(f"raise the frequency to {quantity(round_up(found['least_frequency_hz']), 'Hz')}")
        if found.get("ripple_factor"):
            fold = quantity(round_up(found["ripple_factor"]), "", 3)
            ways.append(f"shrink the modulation {fold}-fold ({quantity(found['ripple_db'], 'dB', 3)})")
        if ways:
            sentences.append(f"To keep {one['limit']}: {' or '.join(ways)}.")
    return sentences


def headline(verdicts: Sequence[Verdict]) -> str:
    """Say the answer in one line: the outcome, how many limits, and the worst."""
    outcome = overall(verdict.verdict for verdict in verdicts)
    judged = [verdict for verdict in verdicts if verdict.verdict != "not-applicable"]
    if outcome == "not-applicable":
        return "NOT APPLICABLE, no limit holds for this capture"
    if outcome == "pass":
        return f"PASS, keeps {_all(len(judged))}"
    those = [verdict for verdict in judged if verdict.verdict == outcome]
    verb = "breaks" if outcome == "fail" else "cannot be decided for"
    return (
        f"{OUTCOME_WORDS[outcome]}, {verb} {len(those)} of {len(judged)} limits"
        if len(judged) > 1
        else (f"{OUTCOME_WORDS[outcome]}, {verb} the limit")
    )


def _all(count: int) -> str:
    return "the limit" if count == 1 else f"all {count} limits"


def _table(verdicts: Sequence[Verdict], width: int) -> list[str]:
    head = ("verdict", "limit", "value (95 % interval)", "bound", "margin")
    rows = [
        (
            OUTCOME_WORDS[verdict.verdict],
            verdict.limit.id,
            value_words(verdict),
            bound_words(verdict),
            margin_in_words(verdict.margin),
        )
        for verdict in verdicts
    ]
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    lines = [_row(head, wide)]
    for row, verdict in zip(rows, verdicts, strict=True):
        lines.append(_row(row, wide))
        if verdict.reason and verdict.verdict != "pass":
            lines += wrap(verdict.reason, width, " " * (wide[0] + 2))
    return lines


def _row(cells: Sequence[str], wide: Sequence[int]) -> str:
    left = "  ".join(cell.ljust(space) for cell, space in zip(cells[:3], wide[:3], strict=True))
    right = "  ".join(cell.rjust(space) for cell, space in zip(cells[3:], wide[3:], strict=True))
    return f"{left}  {right}".rstrip()


def value_words(verdict: Verdict) -> str:
    """Say the value with its interval, and the frequency at which it was judged."""
    if verdict.value is None:
        return "none"
    measure = Measure(verdict.value, verdict.limit.unit, verdict.low, verdict.high)
    number, interval = measured(measure)
    text = f"{number} ({interval})" if interval else number
    text = f"line of {text}" if verdict.part == "line" else text
    return f"{text} at {quantity(verdict.frequency, 'Hz')}" if verdict.frequency is not None else text


def bound_words(verdict: Verdict) -> str:
    """Say the bound that the value was held against."""
    if verdict.bound is None:
        return "unlimited" if verdict.value is not None else ""
    return f"{'<' if verdict.limit.strict else '≤'} {quantity(verdict.bound, verdict.limit.unit)}"


def margin_in_words(margin: float | None) -> str:
    """Say how much room is left in percent of the bound, or of very much too much how many times the bound it is."""
    if margin is None:
        return ""
    if margin < -999.5:
        return f"{1.0 - margin / 100.0:.0f} × bound"
    return f"{margin:+.{0 if abs(margin) >= 10 else 1}f} %"


# ---- the limits themselves ---------------------------------------------------------------------------------------


def limits_words(limits: Sequence[Limit], *, detailed: bool = False, width: int = 100) -> str:
    """
    Say what each limit allows, on what authority, and how far its source was seen.

    Parameters
    ----------
    limits : sequence of Limit
        In the order of their sheets.
    detailed : bool
        Whether to add what each holds for, and its notes.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        The limits, grouped by sheet.
    """
    lines: list[str] = []
    sheet = None
    column = max((len(limit.id) for limit in limits), default=0) + 4
    for limit in limits:
        if limit.title != sheet:
            sheet = limit.title
            lines += ["", *wrap(limit.title, width, "")]
            lines += wrap(f"Source: {limit.source}; basis: {limit.basis}", width, "  ")
        parts = [allowance_words(limit), f"{limit.clause}; {_span(limit)}"]
        if detailed:
            parts += [f"holds for {limit.applies}", *_notes(limit)]
        first, *rest = [line for part in parts for line in wrap(part, width, " " * column)]
        lines += [f"  {limit.id}".ljust(column) + first.lstrip(), *rest]
    if any(isinstance(limit.bound, Curve) for limit in limits):
        lines += ["", *wrap(_LEGEND, width, "")]
    if not detailed:
        lines += ["Name a limit to see what it holds for: flicker limits ID"]
    return "\n".join(lines).strip("\n")


def _span(limit: Limit) -> str:
    begins = f"since {limit.begins.isoformat()}" if limit.begins else "without a date"
    return f"{begins} until {limit.until.isoformat()}" if limit.until else begins


def _notes(limit: Limit) -> list[str]:
    return [band.note for band in limit.bound.bands if band.note] if isinstance(limit.bound, Curve) else []


def allowance_words(limit: Limit) -> str:
    """Say which measure may be how large: `SVM ≤ 0.4`, `modulation ≤ 0.025 f below 90 Hz, 0.08 f below 1250 Hz`."""
    name = measure_name(limit.measure)
    if not isinstance(limit.bound, Curve):
        return f"{name} {'<' if limit.strict else '≤'} {quantity(limit.bound, limit.unit)}"
    spans = []
    for band in limit.bound.bands:
        amount = f"{quantity(band.level, limit.unit)}" if band.level is not None else f"{band.slope:.4g} %/Hz × f"
        start = f" from {band.start:g} Hz" if band.start > 0 else ""
        end = "" if math.isinf(band.end) else f" to {band.end:g} Hz" if start else f" below {band.end:g} Hz"
        spans.append(amount + start + end)
    return f"{name} ≤ {', '.join(spans)}"
