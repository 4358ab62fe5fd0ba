"""The part of a laboratory report that stands beside the figures."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from flicker import __version__
from flicker.report.typesetting import wrap
from flicker.sweep.record import ITEMS

CAUTION = (
    "The results relate only to the items tested. This program is no accredited laboratory; limits and editions are "
    "those named above, and rules change."
)


def record_words(statement: Mapping[str, Any], hashes: Sequence[tuple[str, str]], *, width: int = 100) -> str:
    """
    Say who tested what, when, with which instrument, by which method, limits and decision rule.

    Parameters
    ----------
    statement : mapping
        `record`, `limits`, `decision_rule` and `command_line` of the JSON.
    hashes : sequence of (path, SHA-256)
        The captures.
    width : int
        Columns that a line may fill.

    Returns
    -------
    str
        The items after ISO/IEC 17025:2017, 7.8, an end mark last.
    """
    record, entries = statement["record"], record_entries(statement)
    column = max(len(label) for label, _ in entries) + 4
    lines = [f"Record of report {record['report_id']}" if "report_id" in record else "Record"]
    for label, text in entries:
        first, *rest = wrap(text, width, " " * column) or [""]
        lines += [f"  {label}".ljust(column) + first.lstrip(), *rest]
    lines.append("  captures (SHA-256)")
    lines += [f"    {digest}  {path}" for path, digest in hashes]
    lines += wrap(CAUTION, width, "  ")
    lines.append(f"End of report {record['report_id']}" if "report_id" in record else "End of record")
    return "\n".join(lines)


def record_entries(statement: Mapping[str, Any]) -> list[tuple[str, str]]:
    """Give the items of a statement, each with its label; of captures that were only measured no rule is stated."""
    entries = [(ITEMS[key], str(value)) for key, value in statement["record"].items()]
    entries.append(("program", f"flicker {__version__}"))
    if statement["command_line"]:
        entries.append(("command", statement["command_line"]))
    if statement["limits"]:
        entries.append(("decision rule", statement["decision_rule"]["meaning"]))
    sources = dict.fromkeys(f"{limit['source']} ({limit['basis']})" for limit in statement["limits"])
    return [*entries, *(("judged by", source) for source in sources)]
