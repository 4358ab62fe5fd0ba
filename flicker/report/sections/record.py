"""What a laboratory states beside the figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flicker.markup import Content, Markup, element, markup, pairs
from flicker.report.page import section
from flicker.report.record import CAUTION, record_entries

if TYPE_CHECKING:
    from flicker.report.sheets import Statement

_LISTED_OPENLY = 30


@section(of="record", title="For the laboratory", order=10)
def record(statement: Statement) -> Markup:
    """State who, what, when and with what, the program, the command, the files."""
    entries: list[tuple[str, Content]] = [*record_entries(statement.said)]
    files = [element("li", path, element("br"), element("code", digest)) for path, digest in statement.captures]
    if files:
        listed = element("ul", *files)
        if len(files) > _LISTED_OPENLY:
            listed = element("details", element("summary", f"{len(files)} captures"), listed)
        entries.append(("captures (SHA-256)", listed))
    return markup(pairs(entries), element("p", CAUTION, class_="reason"))
