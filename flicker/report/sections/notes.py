"""Doubts about the capture, each with its cure."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from flicker.markup import Markup, element, markup
from flicker.report.page import section

if TYPE_CHECKING:
    from flicker.report.sheets import ChannelSheet
    from flicker.results import Note

_WEIGHT = {"error": "not to be trusted", "warning": "read before use", "info": "good to know"}


@section(of="channel", title="Notes", order=70)
def notes(sheet: ChannelSheet) -> Markup | None:
    """List the doubts, the gravest first."""
    return note_list(sheet.channel.notes)


def note_list(found: Iterable[Note]) -> Markup | None:
    """List notes, the gravest first; nothing where there is none."""
    ordered = sorted(found, key=lambda note: list(_WEIGHT).index(note.severity))
    if not ordered:
        return None
    items = [
        markup(element("dt", note.code, element("small", _WEIGHT[note.severity])), element("dd", note.message))
        for note in ordered
    ]
    return element("dl", *items, class_="notes")
