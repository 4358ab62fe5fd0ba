"""Many captures in words: how many pass, each in a line, what happens over the dimming range."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path

from flicker.limits import OUTCOMES
from flicker.report.answer import REGION_WORDS
from flicker.report.figures import quantity
from flicker.report.typesetting import wrap
from flicker.report.verdicts import OUTCOME_WORDS, margin_in_words
from flicker.sweep.course import Change, Course, Point, weight

_MOST_ROWS = 60
_KEEP = {  # of one, of several
    "fail": ("breaks a limit", "break a limit"),
    "undecided": ("cannot be decided", "cannot be decided"),
    "pass": ("keeps every limit", "keep every limit"),
    "not-applicable": ("falls under no limit", "fall under no limit"),
}
_MODES = {
    "amplitude": "by amplitude",
    "pwm": "by PWM (pulse width)",
    "hybrid": "by both at once (hybrid)",
    "unknown": "in a way that these captures do not show",
}


def sweep_words(points: Sequence[Point], errors: Sequence[tuple[str, str]], *, width: int = 100) -> str:
    """
    Say how many captures keep the limits, and what each one shows.

    Parameters
    ----------
    points : sequence of Point
        One a capture and channel.
    errors : sequence of (path, reason)
        Captures that could not be read.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        A headline, then a table; of very many captures the worst ones only.
    """
    lines = [_headline(points, errors)]
    shown = list(points)
    if len(shown) > _MOST_ROWS:
        shown = sorted(points, key=weight)[:_MOST_ROWS]
        lines += [f"the {_MOST_ROWS} worst of {len(points)}; --csv writes them all"]
    if shown:
        lines += ["", *_table(shown, width), *_reasons(shown, width)]
    for path, reason in errors:
        lines += wrap(f"not read: {Path(path).name}: {reason}", width, "  ", 2)
    return "\n".join(lines)


def _reasons(points: Sequence[Point], width: int) -> list[str]:
    """Say why captures are undecided, each reason once with all that it holds for."""
    reasons: dict[str, list[str]] = {}
    for point in points:
        if point.verdict == "undecided" and point.reason:
            reasons.setdefault(f"{point.limit}: {point.reason}", []).append(Path(point.capture).name)
    lines = [""] if reasons else []
    for reason, names in reasons.items():
        more = f" and {len(names) - 3} more" if len(names) > 3 else ""
        lines += wrap(f"undecided: {', '.join(names[:3])}{more}: {reason}", width, "  ", 2)
    return lines


def _headline(points: Sequence[Point], errors: Sequence[tuple[str, str]]) -> str:
    counts = Counter(point.verdict for point in points)
    judged = len({point.capture for point in points})
    what = "captures" if judged == len(points) else f"channels of {judged} captures"
    parts = [f"{counts[outcome]} {_KEEP[outcome][counts[outcome] > 1]}" for outcome in OUTCOMES if counts[outcome]]
    if errors:
        parts.append(f"{len(errors)} more could not be read")
    answer = next((OUTCOME_WORDS[outcome].upper() for outcome in OUTCOMES if counts[outcome]), "NOTHING JUDGED")
    return f"{answer}: of {len(points)} {what}, {', '.join(parts)}"


def _table(points: Sequence[Point], width: int) -> list[str]:
    channels = Counter(point.capture for point in points)
    limits = len({point.limit for point in points}) > 1
    units = len({point.unit for point in points}) > 1
    head = [
        *(["unit"] if units else []),
        *(["level"] if any(point.level is not None for point in points) else []),
        "capture",
        *("frequency", "flicker"),
        *(["verdict", "decided by"] if limits else ["risk region", "verdict"]),
        "margin",
    ]
    rows = []
    for point in points:
        name = Path(point.capture).name + (f", {point.channel}" if channels[point.capture] > 1 else "")
        row = [
            *([point.unit] if units else []),
            *([_amount(point.level, "%")] if "level" in head else []),
            name,
            _amount(point.frequency, "Hz"),
            _amount(point.depth, "%", 3),
            *([] if limits else [REGION_WORDS[point.region] if point.region else "not known"]),
            OUTCOME_WORDS[point.verdict],
            *([point.limit] if limits else []),
            margin_in_words(point.margin),
        ]
        rows.append(row)
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    place = head.index("capture")
    wide[place] = max(12, min(wide[place], width - sum(wide) + wide[place] - 2 * len(wide)))
    numbers = {head.index(name) for name in ("level", "frequency", "flicker", "margin") if name in head}
    return [_row(row, wide, numbers, place) for row in (head, *rows)]


def _row(cells: Sequence[str], wide: Sequence[int], numbers: set[int], place: int) -> str:
    texts = [
        text if column != place or len(text) <= wide[place] else "…" + text[1 - wide[place] :]
        for column, text in enumerate(cells)
    ]
    return (
        "  "
        + "  ".join(
            text.rjust(space) if column in numbers else text.ljust(space)
            for column, (text, space) in enumerate(zip(texts, wide, strict=True))
        ).rstrip()
    )


def _amount(value: float | None, unit: str, digits: int = 5) -> str:
    return "–" if value is None else quantity(value, unit, digits)


def course_words(course: Course, *, width: int = 100) -> str:
    """Say where the worst step is, how the light is dimmed, where that changes, and whether the level rises."""
    who = " ".join(part for part in (course.unit, f"({course.channel})") if part)
    worst = course.worst
    lines = [f"Over the dimming range of {who}:" if course.unit else "Over the dimming range:"]
    deepest = "" if worst.depth is None else f", {quantity(worst.depth, '%', 3)} deep"
    at = "" if worst.frequency is None else f" at {quantity(worst.frequency, 'Hz', 5)}"
    by = f" by {worst.limit}" if worst.limit else ""
    sentences = [f"worst step: {_percent(worst)}{deepest}{at}: {OUTCOME_WORDS[worst.verdict]}{by}"]
    sentences += [
        f"dimmed {_MODES[span.mode]} from {quantity(span.high, '%')} to {quantity(span.low, '%')}"
        for span in course.spans
    ]
    if len(course.spans) > 1:
        changes = ", ".join(quantity(span.high, "%") for span in course.spans[1:])
        sentences.append(f"the mode changes at {changes}")
    sentences += [
        f"the frequency steps from {_amount(before.frequency, 'Hz')} to {_amount(after.frequency, 'Hz')} "
        f"between {_percent(before)} and {_percent(after)}"
        for before, after in course.frequency_steps
    ]
    sentences += [
        f"the light does not get darker from {_percent(before)} to {_percent(after)}: check the order of the "
        "captures, or the driver's steps"
        for before, after in course.breaks
    ] or ["the mean level falls at every step down"]
    for sentence in sentences:
        lines += wrap(sentence, width, "  ", 2)
    return "\n".join(lines)


def _percent(point: Point) -> str:
    return "no level" if point.level is None else quantity(point.level, "%")


def change_words(changes: Sequence[Change], *, width: int = 100) -> str:
    """Say what became of each step between two sweeps, before and after."""
    if not changes:
        return "Before and after: the two sweeps share no step (specimen, channel and level)"
    counts = Counter(change.kind for change in changes)
    lines = [
        f"Before and after, {len(changes)} steps in both: {counts['better']} better, {counts['worse']} worse, "
        f"{counts['same']} with the same verdict"
    ]
    head = ("level", "flicker before", "after", "frequency before", "after", "verdict before", "after")
    rows = [
        (
            _percent(change.after),
            _amount(change.before.depth, "%", 3),
            _amount(change.after.depth, "%", 3),
            _amount(change.before.frequency, "Hz"),
            _amount(change.after.frequency, "Hz"),
            OUTCOME_WORDS[change.before.verdict],
            OUTCOME_WORDS[change.after.verdict],
        )
        for change in sorted(changes, key=lambda change: -(change.after.level or 0.0))
    ]
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    lines += [_row(row, wide, {0, 1, 2, 3, 4}, -1) for row in (head, *rows)]
    return "\n".join(lines)
