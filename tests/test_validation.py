"""The check values hold, say so, and say when they do not."""

import dataclasses
import json
import re

import pytest
from click.testing import CliRunner

import flicker.validation
from flicker.cli import program
from flicker.report.validation import validation_words
from flicker.validation import Check, run_checks

ONE = Check("bands", "contrast", "by hand", "%", 11.11, 11.112, 0.005)


@pytest.fixture(scope="module")
def checks():
    return list(run_checks())


def test_every_check_value_holds(checks):
    assert len(checks) > 100
    assert not [check for check in checks if not check.ok]


def test_every_check_value_names_its_source_and_is_named_once(checks):
    assert all(check.source.strip() and check.tolerance > 0 for check in checks)
    named = [(check.group, check.what) for check in checks]
    assert len(set(named)) == len(named)


def test_the_words_hold_every_check(checks):
    words = validation_words(checks)
    assert words.startswith(f"all {len(checks)} check values hold")
    for check in checks:
        assert check.what in words
        assert check.source.split()[0] in words


@pytest.mark.parametrize("got", [11.2, None])
def test_a_broken_one_is_named_at_the_top_and_at_the_end(got):
    broken = dataclasses.replace(ONE, got=got)
    words = validation_words([ONE, broken])
    assert not broken.ok
    assert words.startswith("1 of 2 check values do NOT hold")
    assert words.rstrip().endswith("bands: contrast")
    assert re.search(r"BROKEN$", words, re.M)


def test_the_command(monkeypatch):
    monkeypatch.setattr(flicker.validation, "run_checks", lambda: iter([ONE]))
    done = CliRunner().invoke(program, ["validate", "--json", "-"])
    data = json.loads(done.stdout)
    assert done.exit_code == 0
    assert data["holds"] is True
    assert data["checks"][0]["deviation"] == pytest.approx(0.002)
    assert set(data["checks"][0]) >= {"what", "source", "expected", "got", "deviation", "tolerance", "ok"}


def test_the_exit_status_says_when_one_does_not_hold(monkeypatch):
    monkeypatch.setattr(flicker.validation, "run_checks", lambda: iter([dataclasses.replace(ONE, got=12.0)]))
    done = CliRunner().invoke(program, ["validate"])
    assert done.exit_code == 1
    assert "do NOT hold" in done.stdout
