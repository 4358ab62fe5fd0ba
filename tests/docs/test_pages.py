"""The manual says what the code says, and everything in it can be run."""

import importlib.util
import re
import shlex
import shutil
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.testing import CliRunner

from flicker.cli import program
from flicker.demo import demo_files, write_demo

ROOT = Path(__file__).resolve().parents[2]
_SPEC = importlib.util.spec_from_file_location("refresh", ROOT / "docs" / "refresh.py")
refresh = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(refresh)

PAGES = [pytest.param(page, id=str(page.relative_to(ROOT))) for page in refresh.PAGES]
COMMANDS = program.list_commands(click.Context(program))
PYTHON = [
    pytest.param(block, id=f"{page.relative_to(ROOT)}-{number}")
    for page in refresh.PAGES
    for number, block in enumerate(
        re.findall(r"^```python\n(.*?)^```", page.read_text(encoding="utf-8"), re.M | re.S), 1
    )
]


def example_of(name):
    """The lines below `Example:` in a command's help, each a command line."""
    command = program.get_command(click.Context(program), name)
    lines = (command.help or "").partition("Example:")[2].splitlines()
    return [line.strip() for line in lines if line.strip().startswith("flicker ")]


@pytest.fixture(scope="session")
def demo(tmp_path_factory):
    folder = tmp_path_factory.mktemp("demo")
    write_demo(folder)
    return folder


@pytest.fixture
def demo_folder(tmp_path, monkeypatch, demo):
    shutil.copytree(demo, tmp_path, dirs_exist_ok=True)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize("page", PAGES)
def test_no_page_is_stale(page):
    text = page.read_text(encoding="utf-8")
    assert refresh.refreshed(text) == text, "run: python docs/refresh.py"


@pytest.mark.parametrize("page", PAGES)
def test_every_link_leads_somewhere(page):
    for target in re.findall(r"\]\((?!https?:)([^)#]+)", page.read_text(encoding="utf-8")):
        assert (page.parent / target).exists(), target


@pytest.mark.parametrize("block", PYTHON)
def test_every_python_example_runs(block):
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", block], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip(), "an example shows something"


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help_and_a_place_in_the_manual(name):
    assert example_of(name), "the help needs an `Example:` with a command line"
    page = ROOT / "docs" / "commands" / f"{name}.md"
    assert page.exists(), f"write docs/commands/{name}.md"
    assert f"<!-- from the code: help {name} -->" in page.read_text(encoding="utf-8")
    command = program.get_command(click.Context(program), name)
    for parameter in command.params:
        assert isinstance(parameter, click.Argument) or parameter.help, f"{parameter.name} needs a help text"


@pytest.mark.parametrize("name", COMMANDS)
def test_the_example_in_the_help_runs(name, demo_folder):
    for line in example_of(name):
        words = shlex.split(line)[1:]
        assert words[0] == name
        files = [
            word
            for word in words
            if "." in word and not (demo_folder / word).exists() and Path(word).suffix[1:].isalpha()
        ]
        command = program.get_command(click.Context(program), name)
        if files and not set(files) & set(demo_files()):  # an answer to be written, or a capture that the demo lacks
            command.make_context(name, words[1:])
            continue
        done = CliRunner().invoke(program, words)
        assert done.exit_code in (0, 1, 3), f"{line}\n{done.output}"


def test_every_measure_has_its_method_note():
    from flicker.metrics import METRICS

    missing = {name for name in METRICS if not (ROOT / "docs" / "methods" / refresh.method_note(name)).exists()}
    assert not missing


def test_the_walk_through_runs(demo_folder):
    text = (demo_folder / "walk-through.md").read_text(encoding="utf-8")
    lines = [line for block in re.findall(r"^```\n(.*?)^```", text, re.M | re.S) for line in block.splitlines()]
    commands = [shlex.split(line)[1:] for line in lines if line.startswith("flicker ")]
    assert len(commands) >= 10
    for words in commands:
        done = CliRunner().invoke(program, words)
        expected = 1 if words[0] == "check" else 0
        assert done.exit_code == expected, f"{shlex.join(words)}\n{done.output}"


def test_ci_calls_the_test_command_of_the_readme_word_for_word():
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    commands = re.findall(r"^```sh\n(.+)\n```", readme, re.M)
    assert len(commands) == 2
    assert commands[1] in (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert commands[1] in (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    measured = commands[0].split(".venv/bin/")[-1]
    assert f"$ {measured}\n" in readme, "the output shown is that of the first command"


def test_a_stale_page_is_found(tmp_path):
    page = "<!-- from the code: exit-statuses -->\n| status | meaning |\n<!-- end -->"
    assert refresh.refreshed(page) != page
    assert refresh.refreshed(refresh.refreshed(page)) == refresh.refreshed(page)


def test_no_path_of_a_machine_is_in_the_pages():
    for page in refresh.PAGES:
        text = page.read_text(encoding="utf-8")
        assert str(ROOT) not in text, page
        assert not re.search(r"(^|[\s\"'`(=])/(home|root|tmp|usr|var|opt|mnt|Users)/|[A-Z]:\\", text), page


def test_pictures_named_in_the_pages_are_small():
    pictures = list((ROOT / "docs" / "pictures").iterdir())
    assert pictures
    assert all(picture.stat().st_size < 200_000 for picture in pictures)
