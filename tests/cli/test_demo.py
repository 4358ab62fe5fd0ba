import pytest
from click.testing import CliRunner

from flicker.cli import program
from flicker.demo import demo_files


def run(*words):
    return CliRunner().invoke(program, list(words))


def test_writes_every_file_it_names_and_says_how_to_begin(tmp_path):
    done = run("demo", str(tmp_path / "harbour"))
    assert done.exit_code == 0
    assert {path.name for path in (tmp_path / "harbour").iterdir()} == set(demo_files())
    assert "walk-through.md" in done.stdout
    assert "flicker measure" in done.stdout


@pytest.mark.parametrize("name", ["truth.json", "walk-through.md", "bridge-display-dusk.csv"])
def test_leaves_what_is_there_alone(tmp_path, name):
    (tmp_path / name).write_text("mine")
    done = run("demo", str(tmp_path))
    assert done.exit_code == 2
    assert name in done.stderr
    assert len(done.stderr.splitlines()) == 1
    assert (tmp_path / name).read_text() == "mine"
    assert len(list(tmp_path.iterdir())) == 1
