"""The pages that commands write: captures measured or judged, a map, a light read back from a video."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from flicker.report.captures import Measured
from flicker.report.markup import Markup
from flicker.report.page import page, sections
from flicker.report.sheets import Statement, Sweep, article

if TYPE_CHECKING:
    from flicker.camera.screen import ScreenMap
    from flicker.filmed import FilmReport


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
    parts: list[Markup] = []
    entries = [entry for result in results for entry in result.entries]
    if len(entries) > 1:
        errors = [(result.data["capture"]["path"], result.error) for result in results if result.error]
        parts.append(article("Side by side", sections("overview", (entries, errors))))
    parts += [result.article for result in results if result.article is not None]
    hashes = tuple(
        (result.data["capture"]["path"], result.data["capture"]["sha256"] or "not a file")
        for result in results
        if not result.error
    )
    parts.append(article("Record", sections("record", Statement.measured(command_line, hashes)), short=True))
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
    parts.append(article("Record", sections("record", statement), short=True))
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


def _record(command_line: str, path: str, sha256: str | None) -> Markup:
    statement = Statement.measured(command_line, [(path, sha256 or "not a file")])
    return article("Record", sections("record", statement), short=True)
