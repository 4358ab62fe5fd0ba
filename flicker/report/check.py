"""The answer of a check: results taken in one by one, put into words, one JSON object and one table."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from typing import Any

from flicker import __version__
from flicker.limits import Limit, Outcome, Verdict, overall
from flicker.markup import Markup
from flicker.report.record import record_words
from flicker.report.results import Spool, table_head, table_rows, table_text
from flicker.report.sheets import Statement, Sweep
from flicker.report.sweep import change_words, course_words, sweep_words
from flicker.report.verdicts import RULES, cures, verdict_words
from flicker.sweep.course import Change, Course, Point, changes, courses, points_of


@dataclass(frozen=True, slots=True)
class Terms:
    """By what captures are judged, and what is stated beside the results."""

    limits: tuple[Limit, ...]
    decision: str
    command_line: str
    record: Mapping[str, Any]  # items of the laboratory's own


class Answer:
    """Results as they come in; of each capture only what tables and verdicts need stays in memory."""

    def __init__(self, terms: Terms) -> None:
        self._terms = terms
        self._by_id = {limit.id: limit for limit in terms.limits}
        self._spool = Spool()
        self._rows: list[list[Any]] = []
        self._articles: list[Markup] = []
        self._hashes: list[tuple[str, str]] = []
        self.points: list[Point] = []
        self.errors: list[tuple[str, str]] = []

    def __enter__(self) -> Answer:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._spool.close()

    def add(self, result: Mapping[str, Any]) -> None:
        """Take in the JSON form of one capture, and its part of the page where there is one."""
        if "article" in result:
            self._articles.append(Markup(result["article"]))
            result = {key: value for key, value in result.items() if key != "article"}
        self._spool.add(result)
        found = points_of(result)
        self.points += found
        self._rows += table_rows(result, list(self._by_id), [point.verdict for point in found])
        path = result["capture"]["path"]
        if "error" in result:
            self.errors.append((path, result["error"]))
        else:
            self._hashes.append((path, result["capture"]["sha256"] or "not a file"))

    def verdicts_in_words(self, result: Mapping[str, Any], width: int) -> Iterator[str]:
        """Say what the limits make of each channel of one capture."""
        name = Path(result["capture"]["path"]).name
        channels = result.get("channels", ())
        for channel in channels:
            title = name if len(channels) == 1 else f"{name}, {channel['name']}"
            verdicts = [Verdict.from_dict(self._by_id[one["limit"]], one) for one in channel["verdicts"]]
            yield verdict_words(title, verdicts, cures(channel["verdicts"]), width=width)

    @property
    def outcome(self) -> Outcome:
        """The verdict over all captures that could be read."""
        return overall(point.verdict for point in self.points)

    def closing_words(self, before: Sequence[Point], width: int) -> Iterator[str]:
        """Say what all captures together show, and what became of an earlier sweep; then the record."""
        if len(self.points) + len(self.errors) > 1:
            yield sweep_words(self.points, self.errors, width=width)
        for course in self.courses:
            yield course_words(course, width=width)
        if before:
            matched = self.changes(before)
            yield change_words(matched, width=width)
            alone = len(before) - len({id(change.before) for change in matched})
            alone += len(self.points) - len(matched)
            if matched and alone:
                yield f"{alone} of one sweep only, by specimen, channel or level: not compared"
        if self._terms.record:
            yield record_words(self._statement(), self._hashes, width=width)

    @property
    def courses(self) -> tuple[Course, ...]:
        """Every specimen and channel over its dimming levels."""
        return courses(self.points)

    def changes(self, before: Sequence[Point]) -> tuple[Change, ...]:
        """What became of each step of an earlier sweep."""
        return changes(before, self.points)

    def json_pieces(self, before: Sequence[Point]) -> Iterator[bytes]:
        """Give the JSON object piece by piece."""
        head = {"format": "flicker-report", "version": 1, "program": __version__}
        sweep: dict[str, Any] = {"courses": [course.to_dict() for course in self.courses]}
        if before:
            sweep["against"] = [change.to_dict() for change in self.changes(before)]
        return self._spool.pieces(head, {**self._statement(), "sweep": sweep, "verdict": self.outcome})

    def table(self) -> str:
        """Give the table, CSV."""
        return table_text(table_head(list(self._by_id)), self._rows)

    def page(self, before: Sequence[Point]) -> str:
        """Give the page: all captures together where there are several, then each, then the record."""
        from flicker.report.pages import judged_page

        head = table_head(list(self._by_id))
        swept = Sweep(
            tuple(self.points),
            tuple(self.errors),
            self.courses,
            self.changes(before) if before else None,
            tuple(dict(zip(head, row, strict=True)) for row in self._rows),
        )
        return judged_page(swept, self._articles, Statement(self._statement(), tuple(self._hashes)))

    def _statement(self) -> dict[str, Any]:
        """What a laboratory report must state beside the results."""
        return {
            "command_line": self._terms.command_line,
            "decision_rule": {
                "rule": self._terms.decision,
                "meaning": RULES[self._terms.decision],
                "interval_percent": 95,
            },
            "limits": [limit.to_dict() for limit in self._terms.limits],
            "record": dict(self._terms.record),
        }
