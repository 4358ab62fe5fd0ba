"""The demonstration: captures of a harbour pilot station whose truth is known, and a walk through them."""

from __future__ import annotations

from pathlib import Path

_TEXTS = ("dock-camera.toml", "night-watch.toml", "night-watch-new-driver.toml", "walk-through.md")


def demo_files() -> tuple[str, ...]:
    """Names of the files that `write_demo` makes, in the order in which it makes them."""
    from flicker.demo.scenes import SCENES

    return (*(scene.file for scene in SCENES), "truth.json", *_TEXTS)


def write_demo(folder: Path) -> None:
    """Write the captures, their truth, camera and plan files and a commented walk through the commands."""
    from flicker.files import write_text

    write_captures(folder)
    for name in _TEXTS:
        write_text(folder / name, (Path(__file__).parent / name).read_text(encoding="utf-8"))


def write_captures(folder: Path) -> None:
    """Write the captures and `truth.json` beside them; the same bytes at every call."""
    import json

    from flicker.demo.scenes import SCENES
    from flicker.files import write_text

    for scene in SCENES:
        scene.write(folder / scene.file)
    truth = {scene.file: scene.truth() for scene in SCENES}
    write_text(folder / "truth.json", json.dumps(truth, indent=2, ensure_ascii=False) + "\n")
