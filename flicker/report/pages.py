"""The pages that commands write: captures measured or judged, a map, a light read back from a video."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.markup import Markup, element, markup
from flicker.report.bands import light_words
from flicker.report.captures import Measured
from flicker.report.overview import OverviewEntry, overview_entries
from flicker.report.page import page, sections
from flicker.report.sheets import Statement, Sweep, article, capture_article
from flicker.report.verdicts import RULES

if TYPE_CHECKING:
    from flicker.camera.answer import Answer
    from flicker.camera.plan import Plan
    from flicker.camera.screen import ScreenMap
    from flicker.filmed import FilmReport
    from flicker.reports import Report


def report_page(report: Report) -> str:
    """
    Make the page of a report, as `flicker measure --html` and, with its verdicts, `flicker check --html` do.

    Parameters
    ----------
    report : Report
        From `flicker.measure`, or from `flicker.check`.

    Returns
    -------
    str
        HTML that needs no other file; write it as UTF-8.
    """
    limits = {verdict.limit.id: verdict.limit for found in report.captures for one in found.channels
              for verdict in one.verdicts}  # fmt: skip
    rules = {verdict.decision for found in report.captures for one in found.channels for verdict in one.verdicts}
    said = {
        "record": {},
        "command_line": "",
        "limits": [limit.to_dict() for limit in limits.values()],
        "decision_rule": {"meaning": "; ".join(RULES[rule] for rule in sorted(rules))},
    }
    entries = [entry for found in report.captures for entry in overview_entries(found)]
    parts = _side_by_side(entries, [(found.path or "", found.error) for found in report.captures if found.error])
    read = [(found, found.capture) for found in report.captures if found.capture is not None]
    parts += [capture_article(found) for found, _ in read]
    hashes = tuple((found.path or "capture", capture.sha256 or "not a file") for found, capture in read)
    parts.append(_closing(Statement(said, hashes)))
    return page(title_of(found.path or "capture" for found in report.captures), parts)


def measured_page(results: Sequence[Measured], command_line: str) -> str:
    """
    Make the page of a run of `flicker measure`.

    Parameters
    ----------
    results : sequence of Measured
        Captures in order, each with its part of the page where it could be read.
    command_line : str
        With which the program was called.

    Returns
    -------
    str
        HTML: of several captures first all side by side, then each, then the record.
    """
    entries = [entry for result in results for entry in result.entries]
    errors = [(result.data["capture"]["path"], result.error) for result in results if result.error]
    parts = _side_by_side(entries, errors)
    parts += [result.article for result in results if result.article is not None]
    hashes = tuple(
        (result.data["capture"]["path"], result.data["capture"]["sha256"] or "not a file")
        for result in results
        if not result.error
    )
    parts.append(_closing(Statement.measured(command_line, hashes)))
    return page(title_of(result.data["capture"]["path"] for result in results), parts)


def judged_page(swept: Sweep, articles: Sequence[Markup], statement: Statement) -> str:
    """
    Make the page of a run of `flicker check`.

    Parameters
    ----------
    swept : Sweep
        All captures.
    articles : sequence of Markup
        The captures that are shown in full.
    statement : Statement
        By which rules they were judged.

    Returns
    -------
    str
        HTML: of several captures first what they show together, then each, then the record.
    """
    parts = list(articles)
    if len(swept.points) + len(swept.errors) > 1 or swept.changes is not None:
        parts.insert(0, article("All captures", sections("sweep", swept)))
    parts.append(_closing(statement))
    paths = [*(point.capture for point in swept.points), *(path for path, _ in swept.errors)]
    return page(title_of(dict.fromkeys(paths)), parts)


def title_of(paths: Iterable[str]) -> str:
    """Name a page by its first file."""
    first, *others = [Path(path).name for path in paths] or ["nothing judged"]
    return f"{first} and {len(others)} more, flicker" if others else f"{first}, flicker"


def map_page(found: ScreenMap, path: str, command_line: str) -> str:
    """Make the page of a map of a video: the zones, the heat maps, the record."""
    shown = article(Path(path).name, sections("map", found))
    return page(title_of([path]), [shown, _record(command_line, path, found.footage.sha256)])


def film_page(report: FilmReport, command_line: str) -> str:
    """Make the page of a light read back from a video."""
    shown = article(Path(report.path).name, sections("film", report))
    return page(title_of([report.path]), [shown, _record(command_line, report.path, report.stripes.footage.sha256)])


def bands_page(answer: Answer, command_line: str, capture: str | None = None, source: str = "") -> str:
    """
    Make the page of a prediction, with the camera bench.

    Parameters
    ----------
    answer : Answer
        From `flicker.camera.answer.predict_all`.
    command_line : str
        With which the program was called.
    capture : str, optional
        Path of the capture that the light comes from.
    source : str
        How the light was read from it, if that needs saying.
    """
    name = light_words(answer.light) if capture is None else Path(capture).name
    read = element("p", f"The light was read from {source}.", class_="reason") if source else markup()
    captures = [] if capture is None else [(capture, _digest(capture))]
    closing = _closing(Statement.measured(command_line, captures))
    return page(f"{name}, flicker", [article(name, sections("bands", answer), read), closing])


def plan_page(plan: Plan, path: str, command_line: str) -> str:
    """Make the shoot card of a plan: one sheet to print."""
    name = Path(path).name
    made = element("p", f"Made by {command_line}", class_="reason")
    return page(f"{name}, flicker", [element("div", article(f"Shoot card: {name}", sections("plan", plan), made),
                                             class_="card")])  # fmt: skip


def _record(command_line: str, path: str, sha256: str | None) -> Markup:
    return _closing(Statement.measured(command_line, [(path, sha256 or "not a file")]))


def _digest(path: str) -> str:
    with Path(path).open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _closing(statement: Statement) -> Markup:
    return article("Record", sections("record", statement), short=True)


def _side_by_side(entries: Sequence[OverviewEntry], errors: Sequence[tuple[str, str]]) -> list[Markup]:
    return [article("Side by side", sections("overview", (entries, errors)))] if len(entries) > 1 else []
