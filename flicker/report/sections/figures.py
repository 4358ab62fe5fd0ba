"""Every figure with its interval, and why others could not be had."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import TYPE_CHECKING

from flicker.figures import measure_name, measured
from flicker.markup import Markup, element, markup, pairs, table
from flicker.report.answer import short_reason
from flicker.report.page import section

if TYPE_CHECKING:
    from flicker.report.sheets import ChannelSheet
    from flicker.results import Measure, Note


@section(of="channel", title="Figures", order=20)
def figures(sheet: ChannelSheet) -> Markup | None:
    """List what was measured with its 95 % interval, then what could not be and why."""
    channel = sheet.channel
    rows = [
        (measure_name(name), *measured(measure))
        for name, measure in channel.measures.items()
        if measure.value is not None
    ]
    families = [
        (
            *measured(family.fundamental),
            " ".join(measured(family.percent_flicker)) if family.percent_flicker.value is not None else "not known",
            family.origin,
        )
        for family in channel.families
        if family.fundamental.value is not None
    ]
    return markup(
        table(("measure", "value", "95 % interval"), rows, numbers=(1,), kind="tight") if rows else None,
        table(("frequency", "95 % interval", "percent flicker", "perhaps from"), families) if families[1:] else None,
        not_measured(channel.measures, channel.notes),
    )


def not_measured(measures: Mapping[str, Measure], notes: Iterable[Note]) -> Markup | None:
    """Say which measures could not be had, each reason once."""
    reasons: dict[str, list[str]] = {}
    for name, measure in measures.items():
        if measure.value is None:
            reasons.setdefault(short_reason(measure, notes), []).append(measure_name(name))
    if not reasons:
        return None
    entries = [(", ".join(names), reason) for reason, names in reasons.items()]
    return markup(element("h4", "Not measured"), pairs(entries, class_="missing"))
