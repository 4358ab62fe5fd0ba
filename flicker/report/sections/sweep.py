"""Many captures together: what they show over the dimming range, and what became of an earlier sweep."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from flicker.figures import measure_name, quantity
from flicker.limits import overall
from flicker.markup import Markup, element, items, markup, pairs, table
from flicker.metrics import METRICS
from flicker.report.page import section
from flicker.report.sections._chart import SHAPES, Chart
from flicker.report.sections.overview import not_read
from flicker.report.sections.verdicts import OUTCOME_SHAPES
from flicker.report.sweep import (
    NUMBERS,
    change_headline,
    change_rows,
    course_sentences,
    course_title,
    point_rows,
    sweep_headline,
    undecided_reasons,
)
from flicker.report.verdicts import OUTCOME_WORDS
from flicker.sweep.course import weight

if TYPE_CHECKING:
    from flicker.limits import Outcome
    from flicker.report.sheets import Sweep
    from flicker.sweep.course import Course, Point

_MOST_ROWS = 300
_MOST_COURSES = 12
_MEASURES = ("percent_flicker", "fundamental_frequency", "flicker_index", "svm", "pst_lm", "duty_cycle")
_VERDICTS = {"fail": "breaks a limit", "undecided": "undecided", "pass": "keeps every limit", "not-applicable": ""}
_MIDDLE = 50.0  # of the axis of levels [%]
_WIDE_RANGE = 20.0  # largest over smallest value from which the axis is logarithmic


@section(of="sweep", title="Answer", order=10)
def sweep_answer(swept: Sweep) -> Markup:
    """Say how many captures keep the limits, then what happens over each dimming range."""
    unread: list[Outcome] = ["undecided"] if swept.errors else []
    outcome = overall([*(point.verdict for point in swept.points), *unread])
    sign = element("svg", element("path", d=SHAPES[OUTCOME_SHAPES[outcome]]), viewBox="-8 -8 16 16",
                   class_="sign", aria_hidden="true")  # fmt: skip
    courses = [
        markup(
            element("h4", course_title(course)),
            items(course_sentences(course)),
        )
        for course in _worst(swept.courses)
    ]
    if len(swept.courses) > _MOST_COURSES:
        courses.insert(
            0, element("p", f"the {_MOST_COURSES} worst of {len(swept.courses)} dimming ranges", class_="reason")
        )
    changed = change_headline(swept.changes) if swept.changes is not None else None
    return markup(
        element("p", sign, sweep_headline(swept.points, swept.errors), class_=f"sentence {outcome}"),
        element("p", element("strong", changed)) if changed else None,
        _next_step(swept, outcome),
        *courses,
        not_read(swept.errors),
    )


def _worst(courses: Sequence[Course]) -> Sequence[Course]:
    """Of very many dimming ranges the worst, in the order in which they came."""
    kept = sorted(courses, key=lambda course: weight(course.worst))[:_MOST_COURSES]
    return [course for course in courses if course in kept]


def _next_step(swept: Sweep, outcome: Outcome) -> Markup | None:
    """Say where to begin: with the capture that weighs most."""
    if outcome not in ("fail", "undecided"):
        return None
    worst = min(swept.points, key=weight)
    cure = {
        "fail": f"begin with the worst capture: flicker margin {worst.capture} says what would cure it",
        "undecided": "cure what keeps captures undecided; the reasons stand under the table",
    }
    return pairs([("Next", element("strong", cure[outcome]))], class_="answers")


@section(of="sweep", title="Over the level", order=20)
def sweep_courses(swept: Sweep) -> Markup | None:
    """Draw each measure over the dimming level, one mark a capture."""
    drawn = [
        markup(element("h4", course_title(course)), element("div", *charts, class_="drawings"))
        for course in _worst(swept.courses)
        if (charts := _charts(course, swept))
    ]
    return markup(*drawn) or None


@section(of="sweep", title="Captures", order=30)
def sweep_table(swept: Sweep) -> Markup | None:
    """List the captures, of very many the worst ones."""
    points: Sequence[Point] = swept.points
    if not points:
        return None
    cut = None
    if len(points) > _MOST_ROWS:
        cut = element("p", f"the {_MOST_ROWS} worst of {len(points)}; --csv writes them all", class_="reason")
        points = sorted(points, key=weight)[:_MOST_ROWS]
    head, rows = point_rows(points)
    reasons = undecided_reasons(points)
    return markup(
        cut,
        table(head, rows, numbers=[place for place, name in enumerate(head) if name in NUMBERS]),
        items(reasons),
    )


@section(of="sweep", title="Before and after", order=40)
def sweep_changes(swept: Sweep) -> Markup | None:
    """Lay two sweeps beside each other, step by step."""
    if not swept.changes:
        return None
    shown = sorted(swept.changes, key=lambda change: weight(change.after))[:_MOST_ROWS]
    head, rows = change_rows(shown)
    more = len(swept.changes) - len(shown)
    return markup(
        table(head, rows, numbers=range(5)),
        element("p", f"and {more} milder ones: --json lists them all", class_="reason") if more else None,
    )


def _charts(course: Course, swept: Sweep) -> list[Markup]:
    """Draw every measure that is known at two levels at least."""
    rows = {(row["capture"], row["channel"]): row for row in swept.rows}
    before = {id(change.after): change.before for change in swept.changes or ()}
    charts = []
    for name in _MEASURES:
        known = [
            (point, value)
            for point in course.points
            if (value := rows[point.capture, point.channel].get(name)) is not None and point.level is not None
        ]
        if len(known) > 1:
            charts.append(_chart(name, known, course, before))
    return charts


def _chart(name: str, known: Sequence[tuple[Point, float]], course: Course, before: Mapping[int, Point]) -> Markup:
    unit = METRICS[name].unit
    earlier = [
        (point.level, value, before[id(point)])
        for point, _ in known
        if id(point) in before and (value := _earlier(name, before[id(point)])) is not None
    ]
    values = [value for _, value in known] + [value for _, value, _ in earlier]
    low, high = min(values), max(values)
    logarithmic = low > 0 and high > _WIDE_RANGE * low
    spelled = measure_name(name)
    chart = Chart(
        (0.0, max(100.0, *(point.level or 0.0 for point, _ in known))),
        (low / 1.5, high * 2) if logarithmic else (0.0, 1.18 * (high or 1.0)),
        "dimming level (%)",
        spelled if unit == "1" else f"{spelled} ({unit})",
        (False, logarithmic),
    )
    for span in course.spans[1:]:
        chart.upright(span.high, "mode changes" if span is course.spans[1] else "", "step")
    levels = np.array([point.level for point, _ in known])
    if earlier:
        chart.line(np.array([one[0] for one in earlier]), np.array([one[1] for one in earlier]), "other")
        chart.marks(
            [(level or 0.0, value, f"before: {_says(point, name, value, unit)}") for level, value, point in earlier],
            "square",
            "faint",
        )
    chart.line(levels, np.array([value for _, value in known]), "bare")
    for outcome, shape in OUTCOME_SHAPES.items():
        chart.marks(
            [
                (point.level or 0.0, value, _says(point, name, value, unit))
                for point, value in known
                if point.verdict == outcome
            ],
            shape,
            outcome,
        )
    worst = next((value for point, value in known if point is course.worst), None)
    if worst is not None and course.worst.level is not None and name == _MEASURES[0]:
        words = f"worst step: {quantity(course.worst.level, '%')}"
        left = course.worst.level < _MIDDLE
        chart.name(course.worst.level + (3 if left else -3), worst, words, anchor="start" if left else "end", lift=-16)
    seen = dict.fromkeys(point.verdict for point, _ in known)
    signs = {"fail": "cross", "undecided": "open diamond", "pass": "disc"}
    legend = [
        f"{signs[outcome]}: {_VERDICTS[outcome]}" for outcome in OUTCOME_SHAPES if outcome in seen and outcome in signs
    ]
    legend += ["open square: before"] if earlier else []
    told = "; ".join(f"{_percent(point)}: {quantity(value, unit, 3)}" for point, value in known)
    head = spelled[:1].upper() + spelled[1:]
    return chart.figure(f"{head} over the dimming level" + (f" ({'; '.join(legend)})" if legend else ""), told)


def _earlier(name: str, point: Point) -> float | None:
    known: Mapping[str, Any] = {
        "percent_flicker": point.depth,
        "fundamental_frequency": point.frequency,
        "duty_cycle": point.duty,
    }
    return known.get(name)


def _percent(point: Point) -> str:
    return "no level" if point.level is None else quantity(point.level, "%")


def _says(point: Point, name: str, value: float, unit: str) -> str:
    words = f"{_percent(point)}: {measure_name(name)} {quantity(value, unit)}, {Path(point.capture).name}"
    verdict = OUTCOME_WORDS[point.verdict]
    return f"{words}: {verdict}" + (f" by {point.limit}" if point.limit else "")
