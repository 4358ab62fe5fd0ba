"""Check values in words: a table a group, and what came of it."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from itertools import groupby

from flicker.report.typesetting import wrap
from flicker.validation import Check

_HEAD = ("", "expected", "got", "deviation", "tolerance")


def validation_words(checks: Sequence[Check], *, width: int = 100) -> str:
    """
    Put check values into words for a terminal.

    Parameters
    ----------
    checks : sequence of Check
        In the order of their groups.
    width : int
        Columns that a line of text may fill; the figures stand in their columns whatever it is.

    Returns
    -------
    str
        The verdict first, then a table for each group, with its sources above it.
    """
    broken = [check for check in checks if not check.ok]
    total = f"{len(checks)} check values"
    first = f"all {total} hold" if not broken else f"{len(broken)} of {total} do NOT hold"
    blocks = [first, *("\n".join(_group(group, list(rows), width)) for group, rows in groupby(checks, _name))]
    if broken:
        names = "\n".join(f"  {check.group}: {check.what}" for check in broken)
        blocks.append(f"these do not hold; do not trust what depends on them\n{names}")
    return "\n\n".join(blocks)


def _name(check: Check) -> str:
    return check.group


def _group(name: str, checks: Sequence[Check], width: int) -> Iterable[str]:
    yield name
    for source in dict.fromkeys(check.source for check in checks):
        yield from wrap(f"source: {source}", width, "  ", hang=2)
    rows = [
        (
            check.what,
            _figure(check.expected, check),
            "not measurable" if check.got is None else _figure(check.got, check),
            "" if check.deviation is None else _figure(check.deviation, check, "+"),
            f"{check.tolerance:.2g}{'' if check.ok else '  BROKEN'}",
        )
        for check in checks
    ]
    widths = [max(len(row[column]) for row in (_HEAD, *rows)) for column in range(4)]
    for row in (_HEAD, *rows):
        cells = (f"{cell:>{size}}" for cell, size in zip(row[1:4], widths[1:], strict=True))
        yield f"  {row[0]:<{widths[0]}}  {'  '.join(cells)}  {row[4]}".rstrip()


def _figure(value: float, check: Check, sign: str = "") -> str:
    """Digits down to a tenth of the tolerance: what lies below decides nothing and differs between machines."""
    decimals = max(0, 1 - math.floor(math.log10(check.tolerance)))
    number = f"{value:{sign}.{decimals}f}"
    if float(number) == 0.0:
        number = f"{0:.{decimals}f}"
    return number if check.unit == "1" else f"{number} {check.unit}"
