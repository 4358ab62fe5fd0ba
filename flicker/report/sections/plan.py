"""The shoot card: what to dial in, what spoils it, lights by settings, and room to write."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.camera.shutter import exposure_label
from flicker.markup import Markup, element, items, markup, table
from flicker.report.page import section
from flicker.report.plan import (
    best_words,
    cell,
    chosen_columns,
    head_words,
    left_out_words,
    letter_of,
    spoiler_words,
    together_words,
)

if TYPE_CHECKING:
    from collections.abc import Iterable

    from flicker.camera.plan import Plan

_COLUMNS = 9  # that fit a sheet
_LINES_TO_WRITE = 5
_CAUTION = (
    "Predicted, not measured: check each setting with a test shot under every light. Standing bands look like "
    "lighting. Keep clear of mains wiring and of machines under modulated light, whose parts may seem to stand still."
)


@section(of="plan", title="Dial in", order=10)
def plan_best(plan: Plan) -> Markup:
    """Name the best setting of each camera, and of all together."""
    planned = " ".join([head_words(plan), *left_out_words(plan)])
    together = [element("p", words[0].upper() + words[1:], class_="together") for words in together_words(plan)]
    return markup(_list(best_words(plan)), *together, element("p", planned, class_="reason"))


@section(of="plan", title="Spoilt by", order=20)
def plan_spoilers(plan: Plan) -> Markup | None:
    """Name the lights that make settings unclean."""
    return _list(spoiler_words(plan))


@section(of="plan", title="Lights by settings", order=30)
def plan_table(plan: Plan) -> Markup | None:
    """Lay the lights out against the best settings of every camera."""
    if not plan.settings:
        return None
    columns = chosen_columns(plan, _COLUMNS)
    settings = [column.setting for column in columns]
    letters = {camera: letter_of(number) for number, camera in enumerate(plan.cameras)}
    head = [
        "light",
        *(
            markup(
                element("b", letters[column.setting.camera]),
                element("small", exposure_label(column.setting.exposure_s)),
                element("small", f"{column.rates} f/s"),
            )
            for column in columns
        ),
    ]
    rows: list[list[object]] = [
        [light, *(_shown(one.contrast_percent[light], plan.limit) for one in settings)] for light in plan.lights
    ]
    rows.append(["all lights clean", *(element("b", "yes" if one.clean else "NO") for one in settings)])
    if len(plan.lights) > 1:
        rows.append(["without the worst", *(_shown(one.without_worst_light_percent, plan.limit) for one in settings)])
    named = "; ".join(f"{letter}: {camera}" for camera, letter in letters.items())
    return markup(
        table(head, rows, numbers=range(1, len(head)), kind="grid-of-lights"),
        element("p", f"{named}. Deepest bands in % of light, over the tolerance; ! is above the limit.",
                class_="reason"),
    )  # fmt: skip


def _shown(value: float | None, limit: float) -> Markup:
    words = cell(value, limit).strip()
    return element("b", words) if words.endswith("!") else markup(words)


@section(of="plan", title="By hand", order=40)
def plan_notes(plan: Plan) -> Markup:
    """Leave room for what the shoot teaches."""
    lines = [element("div", class_="write") for _ in range(_LINES_TO_WRITE)]
    checked = [element("span", "☐ ", camera) for camera in plan.cameras]
    return markup(
        element("p", "Test shot done: ", *checked, class_="checked"),
        element("div", *lines, role="img", aria_label="lines to write on"),
        element("p", _CAUTION, class_="reason"),
    )


def _list(sentences: Iterable[str]) -> Markup | None:
    return items(words.replace(" %", "\N{NO-BREAK SPACE}%") for words in sentences)
