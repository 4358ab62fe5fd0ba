import io
import json
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from flicker.cli import output
from flicker.errors import InputError, UnreadableFileError

PLAIN = st.recursive(
    st.none() | st.booleans() | st.integers(-(10**12), 10**12) | st.floats() | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(), inner, max_size=4),
    max_leaves=20,
)


class Terminal(io.StringIO):
    def isatty(self):
        return True


def refuse(constant):
    raise AssertionError(f"{constant} in the JSON")


@given(PLAIN)
def test_json_never_holds_what_is_not_json(data):
    json.loads(output.json_text(data), parse_constant=refuse)


def test_arrays_and_their_scalars_become_lists_and_numbers():
    data = {"grid": np.array([[1.0, np.nan], [np.inf, 2.5]]), "n": np.int64(3), "x": np.float32(0.5), "t": (1, 2)}
    assert json.loads(output.json_text(data)) == {"grid": [[1.0, None], [None, 2.5]], "n": 3, "x": 0.5, "t": [1, 2]}


def test_a_dash_writes_the_json_on_standard_output_and_silences_words(capsys):
    output.print_words("words", "-")
    output.write_json({"unit": "µm"}, "-")
    assert json.loads(capsys.readouterr().out) == {"unit": "µm"}


def test_words_are_printed_when_the_json_goes_to_a_file(tmp_path, capsys):
    target = tmp_path / "answer.json"
    output.print_words("words", str(target))
    output.write_json([1], str(target))
    output.write_json([1], None)
    assert capsys.readouterr().out == "words\n"
    assert target.read_text() == "[\n  1\n]\n"


def test_a_file_that_cannot_be_written_is_named_and_leaves_nothing(tmp_path):
    with pytest.raises(UnreadableFileError, match="no-such-folder"):
        output.write_json({}, str(tmp_path / "no-such-folder" / "answer.json"))
    assert list(tmp_path.iterdir()) == []


def test_what_the_terminal_cannot_spell_is_replaced(monkeypatch):
    narrow = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    monkeypatch.setattr(sys, "stdout", narrow)
    output.print_words("± 5 µs")
    narrow.flush()
    assert narrow.buffer.getvalue() == b"? 5 ?s\n"


def test_colour_is_for_terminals_that_want_it(monkeypatch):
    for name in ("NO_COLOR", "TERM"):
        monkeypatch.delenv(name, raising=False)
    assert output.colour_wanted(Terminal())
    assert not output.colour_wanted(io.StringIO())
    monkeypatch.setenv("TERM", "dumb")
    assert not output.colour_wanted(Terminal())
    monkeypatch.delenv("TERM")
    monkeypatch.setenv("NO_COLOR", "1")
    assert not output.colour_wanted(Terminal())


def test_the_width_is_that_of_the_terminal_and_100_in_a_file(monkeypatch):
    monkeypatch.delenv("COLUMNS", raising=False)
    assert output.terminal_width(io.StringIO()) == 100
    monkeypatch.setenv("COLUMNS", "72")
    assert output.terminal_width(io.StringIO()) == output.terminal_width(Terminal()) == 72
    monkeypatch.setenv("COLUMNS", "7")
    assert output.terminal_width(Terminal()) == 40


def test_no_answer_is_written_over_a_capture(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "dock.csv").write_text("1\n")
    output.spare_the_captures(["dock.csv"], [None, "-", "dock.json"])
    with pytest.raises(InputError, match=r"dock\.csv"):
        output.spare_the_captures(["dock.csv"], ["./dock.csv"])


def test_a_folder_is_made_with_its_parents_or_refused(tmp_path):
    assert output.make_folder(str(tmp_path / "a" / "b")).is_dir()
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="is a file"):
        output.make_folder(str(tmp_path / "file"))
    with pytest.raises(InputError, match="no folder"):
        output.make_folder(str(tmp_path / "file" / "below"))


def test_the_list_of_commands_is_not_cut_short():
    from click.testing import CliRunner

    from flicker.cli import program

    listed = CliRunner().invoke(program, ["--help"], terminal_width=80).output.split("Commands:")[1]
    assert "..." not in listed
    assert all(line.rstrip().endswith(".") for line in listed.splitlines() if line.strip())
