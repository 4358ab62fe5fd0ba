"""A capture as a part of the page: its channels, then what holds for all of them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from flicker.markup import Markup, element, markup
from flicker.report.overview import channel_title
from flicker.report.page import sections
from flicker.report.verdicts import cures

if TYPE_CHECKING:
    from flicker.reports import CaptureReport, ChannelReport
    from flicker.sweep.course import Change, Course, Point


@dataclass(frozen=True, slots=True)
class ChannelSheet:
    """What the sections of a channel are made from."""

    capture: CaptureReport
    channel: ChannelReport
    advice: tuple[str, ...] = ()  # what would make broken limits pass, a sentence each

    @property
    def title(self) -> str:
        """File, and channel where the file holds several."""
        return channel_title(self.capture, self.channel)


@dataclass(frozen=True, slots=True)
class Statement:
    """What closes the page: how the program was called, on which files, by which rules."""

    said: Mapping[str, Any]  # `record`, `limits`, `decision_rule` and `command_line` of the JSON
    captures: tuple[tuple[str, str], ...] = ()  # path, SHA-256

    @classmethod
    def measured(cls, command_line: str, captures: Iterable[tuple[str, str]]) -> Statement:
        """State what was only measured, and held against no limit."""
        return cls({"record": {}, "limits": (), "command_line": command_line}, tuple(captures))


@dataclass(frozen=True, slots=True)
class Sweep:
    """Many captures that were judged, and what became of an earlier sweep."""

    points: tuple[Point, ...]
    errors: tuple[tuple[str, str], ...]  # path, reason
    courses: tuple[Course, ...]
    changes: tuple[Change, ...] | None  # None where there is no earlier sweep
    rows: tuple[Mapping[str, Any], ...]  # of the table of results, by the names of its columns


def judged_article(capture: CaptureReport, data: Mapping[str, Any]) -> str:
    """Make the part of a page that shows a capture that was judged; `data` is its JSON form with what would cure it."""
    return capture_article(capture, [cures(channel["verdicts"]) for channel in data["channels"]])


def capture_article(capture: CaptureReport, advice: Iterable[Iterable[str]] | None = None) -> Markup:
    """
    Make the part of the page that shows one capture that was read.

    Parameters
    ----------
    capture : CaptureReport
        What was found.
    advice : iterable of iterable of str, optional
        For each channel what would make its broken limits pass, a sentence each.

    Returns
    -------
    Markup
        Every channel with its sections, then the sections of the capture.
    """
    sentences = [()] * len(capture.channels) if advice is None else [tuple(one) for one in advice]
    sheets = [ChannelSheet(capture, *both) for both in zip(capture.channels, sentences, strict=True)]
    if len(sheets) == 1:
        return article(sheets[0].title, sections("channel", sheets[0]), sections("capture", capture))
    channels = [article(sheet.title, sections("channel", sheet)) for sheet in sheets]
    name = Path(capture.path).name if capture.path else "capture"
    return markup(*channels, article(f"{name}, all channels", sections("capture", capture)))


def article(title: str, *contents: Markup, short: bool = False) -> Markup:
    """Make a part of the page under its own heading; on paper it begins a new sheet unless it is short."""
    return element("article", element("h2", title), *contents, class_="short" if short else None)
