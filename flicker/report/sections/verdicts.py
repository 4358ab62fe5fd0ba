"""What each limit says, with its clause and the rule by which it was decided."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.limits import OUTCOMES
from flicker.markup import Markup, element, items, markup, table
from flicker.report.page import section
from flicker.report.sections._chart import SHAPES
from flicker.report.verdicts import OUTCOME_WORDS, RULES, bound_words, headline, margin_in_words, value_words

if TYPE_CHECKING:
    from flicker.limits import Verdict
    from flicker.report.sheets import ChannelSheet

OUTCOME_SHAPES = {"fail": "cross", "undecided": "diamond", "pass": "circle", "not-applicable": "bar"}


@section(of="channel", title="Verdicts", order=60)
def verdicts(sheet: ChannelSheet) -> Markup | None:
    """List every verdict, what breaks first, then what would cure it and the rule of decision."""
    found = sorted(sheet.channel.verdicts, key=lambda verdict: OUTCOMES.index(verdict.verdict))
    if not found:
        return None
    rows = [
        (
            outcome_words(verdict.verdict),
            markup(verdict.limit.id, _small(f"{verdict.limit.source}: {verdict.limit.clause}")),
            markup(value_words(verdict), _small(_why(verdict))),
            bound_words(verdict),
            margin_in_words(verdict.margin),
        )
        for verdict in found
    ]
    head = ("verdict", "limit and clause", "value (95 % interval)", "bound", "margin")
    return markup(
        element("p", headline(found)),
        items(sheet.advice),
        table(head, rows, numbers=(3, 4), kind="stacked"),
        element("p", f"Decision rule, {RULES[found[0].decision]}.", class_="reason"),
    )


def outcome_words(outcome: str) -> Markup:
    """Write an outcome beside its mark."""
    sign = element("g", element("path", d=SHAPES[OUTCOME_SHAPES[outcome]]), class_=f"mark {outcome}")
    drawn = element("svg", sign, viewBox="-9 -9 18 18", class_="outcome", aria_hidden="true")
    return markup(drawn, OUTCOME_WORDS[outcome])


def _why(verdict: Verdict) -> str:
    return verdict.reason if verdict.verdict != "pass" else ""


def _small(text: str) -> Markup | None:
    return element("small", text) if text else None
