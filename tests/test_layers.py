"""The order of the rooms: imports run downhill only, and rooms of one floor do not know each other."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import flicker

PACKAGE = Path(flicker.__file__).parent

FLOORS = (
    ("__main__",),
    ("cli",),
    ("demo",),
    ("report",),
    ("plots",),
    ("sweep",),
    ("tunable", "validation"),
    ("analysis",),
    ("filmed", "reports", "aliases", "doubts"),
    ("along",),
    ("readers", "camera", "limits", "metrics", "conditioning"),
    ("signal",),
    ("waveforms",),
    ("light",),
    ("footage",),
    ("trace", "figures"),
    ("results",),
    ("registry", "quantities", "files", "workers", "markup"),
    ("errors",),
    ("__init__",),
)
FLOOR_OF = {room: floor for floor, rooms in enumerate(FLOORS) for room in rooms}
HEAVY = ("numpy", "scipy", "matplotlib", "cv2", "soundfile", "av")


def room_of(file: Path) -> str:
    return file.relative_to(PACKAGE).parts[0].removesuffix(".py")


def imports_of(file: Path):
    for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{file}:{node.lineno}: write imports in full"
            names = [f"{node.module}.{alias.name}" for alias in node.names]
        else:
            continue
        for name in names:
            if name.split(".")[0] == "flicker":
                target = name.split(".")[1] if "." in name else "__init__"
                yield node.lineno, target if target in FLOOR_OF else "__init__"


def test_every_room_stands_on_a_floor():
    rooms = {room_of(file) for file in PACKAGE.rglob("*.py")}
    assert rooms <= set(FLOOR_OF), f"give these a floor: {sorted(rooms - set(FLOOR_OF))}"


def test_imports_run_downhill():
    uphill = [
        f"{file.relative_to(PACKAGE)}:{line} imports {target}"
        for file in sorted(PACKAGE.rglob("*.py"))
        for line, target in imports_of(file)
        if target != room_of(file) and FLOOR_OF[target] <= FLOOR_OF[room_of(file)]
    ]
    assert not uphill, "\n".join(uphill)


@pytest.mark.parametrize(
    "code",
    ["import flicker", "from flicker.cli import program; program(['--help'], standalone_mode=False)"],
)
def test_a_fresh_interpreter_loads_nothing_heavy(code):
    check = f"import sys; {code}; sys.exit(' '.join(sorted(set({HEAVY!r}) & set(sys.modules))) or 0)"
    done = subprocess.run([sys.executable, "-c", check], capture_output=True, text=True, check=False)
    assert done.returncode == 0, f"loaded: {done.stderr}"
