"""Long work says on a terminal how far it has come, and nowhere else."""

import io
import itertools
import sys

import pytest

from flicker.cli import output
from flicker.workers import counted, watched_by


class Terminal(io.StringIO):
    def isatty(self):
        return True


@pytest.fixture
def slow(monkeypatch):
    """Let a second pass whenever somebody looks at the clock."""
    clock = itertools.count()
    monkeypatch.setattr(output.time, "monotonic", lambda: float(next(clock)))


def test_who_watches_is_told_each_item_and_the_end():
    told = []
    with watched_by(lambda *words: told.append(words)):
        assert list(counted("ab", "window", 2)) == ["a", "b"]
    assert told == [("window", 1, 2), ("window", 2, 2), ("window", 0, 2)]
    assert list(counted("ab", "window")) == ["a", "b"]
    assert len(told) == 3, "nobody watches any more"


@pytest.mark.parametrize("quiet", [False, True])
def test_progress_goes_to_a_terminal_and_leaves_nothing_there(monkeypatch, capsys, slow, quiet):
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    with output.counting(quiet=quiet):
        assert list(counted("abcd", "capture", 4)) == ["a", "b", "c", "d"]
    assert ("capture 3 of 4" in terminal.getvalue()) is not quiet
    assert "capture 1" not in terminal.getvalue(), "work of a second says nothing"
    assert quiet or terminal.getvalue().endswith("\r\x1b[K")
    assert capsys.readouterr().out == ""


def test_progress_is_silent_away_from_a_terminal(monkeypatch, slow):
    file = io.StringIO()
    monkeypatch.setattr(sys, "stderr", file)
    with output.counting(quiet=False):
        list(counted(range(5), "frame"))
    assert file.getvalue() == ""
