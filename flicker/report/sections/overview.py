"""Several captures side by side."""

from __future__ import annotations

from collections.abc import Sequence

from flicker.markup import Markup, element, items, markup, table
from flicker.report.overview import HEAD, OverviewEntry, riskiest
from flicker.report.page import section
from flicker.report.sweep import unread_words


@section(of="overview", title="All captures", order=10)
def overview(found: tuple[Sequence[OverviewEntry], Sequence[tuple[str, str]]]) -> Markup:
    """Hold all channels side by side, the riskiest named first, and say what was not read."""
    entries, errors = found
    worst = riskiest(entries)
    return markup(
        element("p", f"Riskiest: {worst.cells[0]}: {worst.risk}") if worst else None,
        table(HEAD, (entry.cells for entry in entries), numbers=(1, 2, 3)),
        not_read(errors),
    )


def not_read(errors: Sequence[tuple[str, str]]) -> Markup | None:
    """Name the captures that could not be read, each with the reason."""
    if not errors:
        return None
    return items(unread_words(path, reason) for path, reason in errors)
