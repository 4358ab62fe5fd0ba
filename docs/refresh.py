"""
Write into the pages what the code itself says: help texts, tables, outputs.

`python docs/refresh.py` brings every page up to date, `--check` only names the pages that are not and then leaves
with status 1; `--pictures` draws the pictures of the manual.

In a page, `<!-- from the code: NAME WORDS -->` opens what is written, `<!-- end -->` closes it.
"""

from __future__ import annotations

import inspect
import os
import re
import shlex
import subprocess
import sys
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from flicker.sweep.course import Course

ROOT = Path(__file__).resolve().parent.parent
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").rglob("*.md"))]
_BLOCK = re.compile(r"(<!-- from the code: (.+?) -->\n)(.*?)(<!-- end -->)", re.DOTALL)
_WIDTH = "100"


def table(head: Iterable[str], rows: Iterable[Iterable[str]]) -> str:
    """Give a Markdown table."""
    lines = [tuple(head), tuple("---" for _ in head), *(tuple(row) for row in rows)]
    return "".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |\n" for line in lines)


def code(text: str) -> str:
    """Give a block of literal text."""
    return f"```\n{text.rstrip()}\n```\n"


def output_of(words: list[str]) -> str:
    """Run a command in the root of the repository as a person would; give what it printed, and its status if not 0."""
    done = subprocess.run(
        [sys.executable, "-m", *words],
        cwd=ROOT,
        env=os.environ | {"COLUMNS": _WIDTH, "NO_COLOR": "1", "PYTHONIOENCODING": "utf-8"},
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        encoding="utf-8",
        check=False,
    )
    return done.stdout.rstrip() + (f"\n(exit status {done.returncode})" if done.returncode else "")


def run(words: list[str]) -> str:
    """Give the line typed and what it printed."""
    return code(f"$ {shlex.join(words)}\n{output_of(words)}")


def help_text(words: list[str]) -> str:
    """Give the help of a command, or of the program when none is named."""
    return code(output_of(["flicker", *words, "--help"]))


def commands(_: list[str]) -> str:
    """Give the table of commands, each with its page."""
    import click

    from flicker.cli import program

    context = click.Context(program)
    rows = []
    for name in program.list_commands(context):
        command = program.get_command(context, name)
        assert command is not None
        first_line = inspect.cleandoc(command.help or "").partition("\n\n")[0].replace("\n", " ")
        rows.append((f"[`flicker {name}`](commands/{name}.md)", first_line))
    return table(("command", "does"), rows)


def exit_statuses(_: list[str]) -> str:
    """Give the table of exit statuses."""
    from flicker.errors import ExitStatus

    found = re.findall(r"^\s+\w+ = (\d+)  # (.+)$", inspect.getsource(ExitStatus), re.MULTILINE)
    assert len(found) == len(ExitStatus), "every exit status needs its comment"
    return table(("status", "meaning"), found)


def measures(_: list[str]) -> str:
    """Give the table of measures, each with its unit, its source and its method note."""
    from flicker.metrics import METRICS

    rows = [
        (f"[`{metric.name}`](methods/{method_note(metric.name)})", metric.unit, metric.source)
        for metric in sorted(METRICS.values(), key=lambda metric: metric.order)
    ]
    return table(("measure", "unit", "source"), rows)


def method_note(measure: str) -> str:
    """Name the file of a measure's method note; measures that differ only in a number share one."""
    return re.sub(r"_\d+hz$", "", measure) + ".md"


def limits(_: list[str]) -> str:
    """Give the table of limits."""
    from flicker.limits import Curve, known_limits

    def bound(limit) -> str:
        if not isinstance(limit.bound, Curve):
            return f"{'<' if limit.strict else '≤'} {limit.bound:g} {limit.unit if limit.unit != '1' else ''}".strip()
        parts = (
            f"{band.level:g} %" if band.level is not None else f"{band.slope:.4g} % × f/Hz"
            for band in limit.bound.bands
        )
        spans = (f"{band.start:g} to {band.end:g} Hz" for band in limit.bound.bands)
        return "; ".join(f"{span}: {part}" for span, part in zip(spans, parts, strict=True))

    rows = [(f"`{one.id}`", f"`{one.measure}`", bound(one), f"{one.source}: {one.clause}", one.basis)
            for one in known_limits().values()]  # fmt: skip
    return table(("limit", "measure", "bound", "source", "basis"), rows)


def readers(_: list[str]) -> str:
    """Give the table of readers."""
    from flicker.readers import READERS

    rows = [
        (reader.kind, ", ".join(reader.suffixes), inspect.getdoc(reader.read).partition("\n\n")[0].replace("\n", " "))
        for reader in sorted(READERS.values(), key=lambda entry: entry.order)
    ]
    return table(("kind", "usual endings", "reads"), rows)


WRITERS: dict[str, Callable[[list[str]], str]] = {
    "commands": commands,
    "exit-statuses": exit_statuses,
    "help": help_text,
    "limits": limits,
    "measures": measures,
    "readers": readers,
    "run": run,
}


def refreshed(text: str) -> str:
    """Give a page with everything that comes from the code written anew."""

    def write(found: re.Match[str]) -> str:
        name, *words = shlex.split(found.group(2))
        return f"{found.group(1)}{WRITERS[name](words)}{found.group(4)}"

    return _BLOCK.sub(write, text)


def stale_pages() -> dict[Path, str]:
    """Give the pages that do not say what the code says, with the text that they should hold."""
    texts = {page: page.read_text(encoding="utf-8") for page in PAGES if page.exists()}
    return {page: new for page, old in texts.items() if (new := refreshed(old)) != old}


def draw_pictures() -> None:
    """Draw the pictures of the manual anew."""
    import flicker
    from flicker.camera import Camera
    from flicker.camera.answer import predict_all
    from flicker.light import pwm_light
    from flicker.plots.frame import draw_exposures, save_frames
    from flicker.plots.pictures import write_pictures
    from flicker.plots.style import save_figure
    from flicker.plots.sweep import draw_sweep

    name = "bridge-display-night"
    report = flicker.measure(flicker.read(ROOT / "fixtures" / f"{name}.csv", dark_level=0.012))
    write_pictures(report.captures[0], ROOT / "docs" / "pictures", name)
    light = pwm_light(frequency=240.0, duty=0.3, decay=(8.5e-3, 0.0, 0.0))
    camera = Camera.load(ROOT / "fixtures" / "dock-camera.toml")
    save_frames(predict_all(light, camera, exposures=(1 / 100,)), ROOT / "docs" / "pictures")
    night = predict_all(report.light, camera, exposures=(1 / 50, 1 / 60, 1 / 250))
    save_figure(draw_exposures(night), ROOT / "docs" / "pictures" / "night-on-the-dock-camera.png")
    save_figure(draw_sweep(display_sweep()), ROOT / "docs" / "pictures" / "sweep-display-1.png")


def display_sweep() -> Course:
    """Give the display at its three levels, held against the low-risk practice."""
    from flicker.limits import chosen_limits
    from flicker.sweep.batch import Task, judge_capture
    from flicker.sweep.course import courses, points_of
    from flicker.sweep.manifest import Step

    levels = {"day": 100, "dusk": 45, "night": 5}
    steps = [Step(str(ROOT / "fixtures" / f"bridge-display-{name}.csv"), "display 1", level, dark_level=0.012)
             for name, level in levels.items()]  # fmt: skip
    task = Task(chosen_limits(["ieee1789-low-risk"]))
    (course,) = courses([point for step in steps for point in points_of(judge_capture(step, task))])
    return course


def main(arguments: list[str]) -> int:
    """Refresh the pages, or with `--check` only name those that are stale."""
    if arguments == ["--pictures"]:
        draw_pictures()
        return 0
    stale = stale_pages()
    checking = arguments == ["--check"]
    for page, text in stale.items():
        print(f"{page.relative_to(ROOT)}: {'does not say what the code says' if checking else 'written'}")
        if not checking:
            page.write_text(text, encoding="utf-8")
    if checking and stale:
        print("run: python docs/refresh.py")
    return int(checking and bool(stale))


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
