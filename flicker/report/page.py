"""One self-contained HTML file: sections in a stated order, in a frame that asks nobody for anything."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path
from string import Template
from typing import Any

from flicker import __version__
from flicker.markup import Markup, element, markup
from flicker.registry import Registry

_HERE = Path(__file__).parent

_ALWAYS = ("style.css", "page.js")
_WHERE_NEEDED = {'class="desk"': ("bench.css", "bench.js", "bench_desk.js"), 'class="card"': ("card.css",)}

Make = Callable[[Any], Markup | None]


@dataclass(frozen=True, slots=True)
class Section:
    """
    A part of the page as the registry knows it.

    `of` says what it is made from: `channel` (`flicker.report.sheets.ChannelSheet`), `capture` (`CaptureReport`),
    `sweep`, `map`, `film`, `bands` (`Answer`), `plan` (`Plan`), or `record`, which closes the page.
    """

    name: str
    title: str  # shown beside it
    of: str
    order: int  # in the page, small numbers first
    make: Make


SECTIONS: Registry[Section] = Registry("flicker.report.sections", "section")


def section(*, of: str, title: str, order: int) -> Callable[[Make], Make]:
    """
    Register the decorated function as a section under its own name.

    Parameters
    ----------
    of : str
        What it is made from, see `Section`.
    title : str
        Shown beside it.
    order : int
        Place among the sections made from the same thing, small numbers first.

    Notes
    -----
    The function takes the object and gives the HTML of the section, or None where it does not apply.
    """

    def register(make: Make) -> Make:
        SECTIONS.add(make.__name__, Section(make.__name__, title, of, order, make))
        return make

    return register


def sections(of: str, subject: Any) -> Markup:
    """Make all sections of one thing, in their order; those that do not apply are left out."""
    made = []
    for one in sorted((known for known in SECTIONS.values() if known.of == of), key=lambda known: known.order):
        content = one.make(subject)
        if content:
            heading = element("h3", one.title, class_="margin")
            kind = one.name.replace("_", "-")
            made.append(element("section", heading, element("div", content, class_="matter"), class_=kind))
    return markup(*made)


def page(title: str, parts: Iterable[Markup]) -> str:
    """
    Put parts into the frame of a page.

    Parameters
    ----------
    title : str
        Of the page, as text.
    parts : iterable of Markup
        What it shows, from top to bottom.

    Returns
    -------
    str
        One HTML file that needs no other and may ask for none; write it with `flicker.files.write_text`.
    """
    shown = markup(*parts)
    files = [*_ALWAYS, *(name for needed, names in _WHERE_NEEDED.items() if needed in shown for name in names)]
    texts = {name: (_HERE / name).read_text(encoding="utf-8") for name in ("page.html", *files)}
    return Template(texts["page.html"]).substitute(
        title=markup(title),
        version=markup(__version__),
        style="".join(text for name, text in texts.items() if name.endswith(".css")),
        script="".join(text for name, text in texts.items() if name.endswith(".js")),
        parts=shown,
    )
