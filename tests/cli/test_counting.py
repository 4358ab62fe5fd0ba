"""Long work says on a terminal how far it has come, and nowhere else."""

import sys

from flicker.cli import output
from flicker.workers import counted, watched_by


def test_who_watches_is_told_each_item_and_the_end():
    told = []
    with watched_by(lambda *words: told.append(words)):
        assert list(counted("ab", "window", 2)) == ["a", "b"]
    assert told == [("window", 1, 2), ("window", 2, 2), ("window", 0, 2)]
    assert list(counted("ab", "window")) == ["a", "b"]
    assert len(told) == 3, "nobody watches any more"


def test_only_a_terminal_is_told_and_only_of_long_work(monkeypatch, capsys):
    clock = iter(range(100))
    monkeypatch.setattr(output.time, "monotonic", lambda: float(next(clock)))
    with output.counting(quiet=False):
        list(counted(range(5), "frame"))
    assert capsys.readouterr().err == ""
    monkeypatch.setattr(output, "_is_terminal", lambda stream: stream is sys.stderr)
    with output.counting(quiet=True):
        list(counted(range(5), "frame"))
    assert capsys.readouterr().err == ""
    with output.counting(quiet=False):
        list(counted(range(5), "frame", 5))
    said = capsys.readouterr().err
    assert "frame 4 of 5" in said
    assert said.endswith("\r"), "the line is wiped"
    assert "frame 1" not in said, "work of a second says nothing"
