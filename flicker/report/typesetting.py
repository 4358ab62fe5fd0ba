"""Text for a terminal: weight and colour where wanted, lines of a given width."""

from __future__ import annotations

import re
import textwrap


class Paint:
    """Bold, faint and coloured text where that is wanted, plain text elsewhere."""

    def __init__(self, *, colour: bool) -> None:
        self._colour = colour

    def __call__(self, text: str, *codes: str) -> str:
        """Give the text in these terminal codes."""
        return f"\x1b[{';'.join(codes)}m{text}\x1b[0m" if self._colour and text else text

    def bold(self, text: str) -> str:
        """Give the text in bold."""
        return self(text, "1")

    def faint(self, text: str) -> str:
        """Give the text faint."""
        return self(text, "2")


def wrap(text: str, width: int, indent: str, hang: int = 0) -> list[str]:
    """Break text into lines, never between a number and its unit, nor inside the name of a standard."""
    kept = re.sub(r"(?<=\d) (?=%|[kMmµn]?(?:Hz|s|V)\b)|(?<=\bIEEE) (?=\d)", "\N{NO-BREAK SPACE}", text)
    lines = textwrap.wrap(kept, width, initial_indent=indent, subsequent_indent=indent + " " * hang)
    return [line.replace("\N{NO-BREAK SPACE}", " ") for line in lines]
