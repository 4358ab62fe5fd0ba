"""Rules of the house that hold for every file."""

from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
LONGEST = 450  # lines of a file
TOP = {"pyproject.toml", "README.md", "DEVELOPERS.md", "flicker", "tests", "fixtures", "docs"}
LEFT_BY_TOOLS = {"build", "dist", "flicker.egg-info"}
CODE = [file for room in ("flicker", "tests", "fixtures", "docs") for file in sorted((ROOT / room).rglob("*.py"))]


def test_no_file_grows_without_end():
    long = {str(file.relative_to(ROOT)): len(file.read_text(encoding="utf-8").splitlines()) for file in CODE}
    assert not {name: lines for name, lines in long.items() if lines > LONGEST}


def test_the_top_level_stays_as_it_is():
    found = {entry.name for entry in ROOT.iterdir() if not entry.name.startswith(".")}
    assert found - LEFT_BY_TOOLS == TOP


def test_the_same_rooms_stand_in_the_tests():
    rooms = {path.parent.name for path in (ROOT / "flicker").glob("*/__init__.py")}
    tested = {path.parent.name for path in (ROOT / "tests").glob("*/test_*.py")}
    assert rooms <= tested, f"no tests: {sorted(rooms - tested)}"
