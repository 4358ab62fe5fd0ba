"""HTML and SVG built from elements, so that text can only ever come out as text."""

from __future__ import annotations

from collections.abc import Iterable
from html import escape

_EMPTY = {"br", "hr", "img", "input", "meta", "wbr"}  # elements that have no end tag in HTML

Content = object  # Markup is taken as it is, None is left out, anything else is written as text


class Markup(str):
    """HTML that is safe to put into a page as it stands."""

    __slots__ = ()


def markup(*contents: Content) -> Markup:
    """Join contents into markup; what is no markup is escaped."""
    return Markup("".join(one if isinstance(one, Markup) else escape(str(one)) for one in contents if one is not None))


def element(name: str, /, *contents: Content, **attributes: object) -> Markup:
    """
    Make an element.

    Parameters
    ----------
    name : str
        Such as `p` or `rect`.
    *contents
        Markup, or anything else as text.
    **attributes
        `class_` becomes `class`, an underscore inside a name becomes a hyphen; None and False are left out, True
        stands alone.

    Returns
    -------
    Markup
        The element with its contents and its end tag.
    """
    words = [name]
    for key, value in attributes.items():
        if value is None or value is False:
            continue
        key = key.rstrip("_").replace("_", "-")
        words.append(key if value is True else f'{key}="{escape(str(value))}"')
    opening = f"<{' '.join(words)}>"
    return Markup(opening if name in _EMPTY else f"{opening}{markup(*contents)}</{name}>")


def table(
    head: Iterable[Content], rows: Iterable[Iterable[Content]], *, numbers: Iterable[int] = (), kind: str = ""
) -> Markup:
    """
    Make a table that scrolls in itself where it is too wide.

    Parameters
    ----------
    head : iterable
        Names of the columns.
    rows : iterable of iterable
        Cells; the first of each row is its name.
    numbers : iterable of int
        Columns that are set to the right.
    kind : str
        Class of the style sheet: a `stacked` table puts its cells below each other where the page is narrow.
    """
    right = set(numbers)

    def row(kind: str, cells: Iterable[Content]) -> Markup:
        made = [
            element("th" if kind == "th" or column == 0 else "td", cell, class_="number" if column in right else None,
                    scope="col" if kind == "th" else "row" if column == 0 else None)
            for column, cell in enumerate(cells)
        ]  # fmt: skip
        return element("tr", *made)

    body = element("tbody", *(row("td", cells) for cells in rows))
    made = element("table", element("thead", row("th", head)), body)
    return element("div", made, class_=f"wide {kind}".strip(), tabindex=0, role="region", aria_label="table")


def items(contents: Iterable[Content]) -> Markup | None:
    """Make a list with points; None where there is nothing to list."""
    made = [element("li", one) for one in contents]
    return element("ul", *made) if made else None


def pairs(entries: Iterable[tuple[str, Content]], **attributes: object) -> Markup:
    """Make a list of labels, each with what it stands for."""
    made = [part for label, text in entries for part in (element("dt", label), element("dd", text))]
    return element("dl", *made, **attributes)
