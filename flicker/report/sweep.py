"""Many captures in words: how many pass, each in a line, what happens over the dimming range."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path

from flicker.figures import quantity
from flicker.limits import OUTCOMES
from flicker.report.answer import REGION_WORDS
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
NUMBERS = ("level", "frequency", "flicker", "margin")  # columns that hold numbers
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
    lines = [sweep_headline(points, errors)]
    shown = list(points)
    if len(shown) > _MOST_ROWS:
        shown = sorted(points, key=weight)[:_MOST_ROWS]
        lines += [f"the {_MOST_ROWS} worst of {len(points)}; --csv writes them all"]
    if shown:
        lines += ["", *_table(shown, width)]
        reasons = undecided_reasons(shown)
        lines += [""] if reasons else []
        lines += [line for reason in reasons for line in wrap(reason, width, "  ", 2)]
    for path, reason in errors:
        lines += wrap(unread_words(path, reason), width, "  ", 2)
    return "\n".join(lines)


def unread_words(path: str, reason: str) -> str:
    """Name a capture that could not be read, and why; most reasons begin with its path."""
    return f"not read: {Path(path).name}: {reason.removeprefix(f'{path}: ')}"


def undecided_reasons(points: Sequence[Point]) -> list[str]:
    """Say why captures are undecided, each reason once with the captures that it holds for."""
    reasons: dict[str, list[str]] = {}
    for point in points:
        if point.verdict == "undecided" and point.reason:
            reasons.setdefault(f"{point.limit}: {point.reason}", []).append(Path(point.capture).name)
    return [
        f"undecided: {', '.join(names[:3])}{f' and {len(names) - 3} more' if len(names) > 3 else ''}: {reason}"
        for reason, names in reasons.items()
    ]


def sweep_headline(points: Sequence[Point], errors: Sequence[tuple[str, str]]) -> str:
    """Say how many captures keep the limits."""
    counts = Counter(point.verdict for point in points)
    judged = len({point.capture for point in points})
    captures = "capture" if judged == 1 else "captures"
    what = captures if judged == len(points) else f"channels of {judged} {captures}"
    parts = [f"{counts[outcome]} {_KEEP[outcome][counts[outcome] > 1]}" for outcome in OUTCOMES if counts[outcome]]
    if errors:
        parts.append(f"{len(errors)} more could not be read")
    answer = next((OUTCOME_WORDS[outcome].upper() for outcome in OUTCOMES if counts[outcome]), "NOTHING JUDGED")
    if errors and answer == OUTCOME_WORDS["pass"].upper():
        answer = "INCOMPLETE"
    return f"{answer}: of {len(points)} {what}, {', '.join(parts)}"


def point_rows(points: Sequence[Point]) -> tuple[list[str], list[list[str]]]:
    """Give the head and the cells of a table of captures; columns that would say the same throughout are left out."""
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
    return head, rows


def _table(points: Sequence[Point], width: int) -> list[str]:
    head, rows = point_rows(points)
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    place = head.index("capture")
    wide[place] = max(12, min(wide[place], width - sum(wide) + wide[place] - 2 * len(wide)))
    numbers = {head.index(name) for name in NUMBERS if name in head}
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
    lines = [f"{course_title(course)}:"]
    for sentence in course_sentences(course):
        lines += wrap(sentence, width, "  ", 2)
    return "\n".join(lines)


def course_title(course: Course) -> str:
    """Name a course by its specimen and channel."""
    return f"Over the dimming range of {course.unit} ({course.channel})" if course.unit else "Over the dimming range"


def course_sentences(course: Course) -> list[str]:
    """Give what there is to say of a course, a sentence each."""
    worst = course.worst
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
    return sentences


def _percent(point: Point) -> str:
    return "no level" if point.level is None else quantity(point.level, "%")


def change_words(changes: Sequence[Change], *, width: int = 100) -> str:
    """Say what became of each step between two sweeps, before and after."""
    lines = [change_headline(changes)]
    if not changes:
        return lines[0]
    head, rows = change_rows(changes)
    wide = [max(len(row[column]) for row in (head, *rows)) for column in range(len(head))]
    lines += [_row(row, wide, {0, 1, 2, 3, 4}, -1) for row in (head, *rows)]
    return "\n".join(lines)


def change_headline(changes: Sequence[Change]) -> str:
    """Say how many steps became better or worse."""
    if not changes:
        return "Before and after: the two sweeps share no step (specimen, channel and level)"
    counts = Counter(change.kind for change in changes)
    return (
        f"Before and after, {len(changes)} steps in both: {counts['better']} better, {counts['worse']} worse, "
        f"{counts['same']} with the same verdict"
    )


def change_rows(changes: Sequence[Change]) -> tuple[Sequence[str], Sequence[Sequence[str]]]:
    """Give the head and the cells of a table of changes, from the highest level to the lowest."""
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
    return head, rows
