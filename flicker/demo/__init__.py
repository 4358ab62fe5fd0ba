"""The demonstration: captures of a harbour pilot station whose truth is known, and a walk through them."""

from __future__ import annotations

from pathlib import Path

_SETTINGS = ("dock-camera.toml", "night-watch.toml", "night-watch-new-driver.toml")
_WALK_THROUGH = "walk-through.md"
_FILMS = "truth-of-films.json"


def demo_files() -> tuple[str, ...]:
    """Names of the files that `write_demo` makes, in the order in which it makes them."""
    from flicker.demo.films import films
    from flicker.demo.scenes import SCENES

    captures, clips = (scene.file for scene in SCENES), (film.file for film in films())
    return (*captures, "truth.json", *_SETTINGS, *clips, _FILMS, _WALK_THROUGH)


def write_demo(folder: Path) -> None:
    """Write the captures and all that goes with them, and a commented walk through the commands."""
    write_captures(folder)
    write_films(folder)
    _copy(_WALK_THROUGH, folder)


def write_captures(folder: Path) -> None:
    """Write the captures, `truth.json`, a camera file and plan files; the same bytes at every call."""
    import json

    from flicker.demo.scenes import SCENES
    from flicker.files import write_text

    for scene in SCENES:
        scene.write(folder / scene.file)
    truth = {scene.file: scene.truth() for scene in SCENES}
    write_text(folder / "truth.json", json.dumps(truth, indent=2, ensure_ascii=False) + "\n")
    for name in _SETTINGS:
        _copy(name, folder)


def write_films(folder: Path) -> None:
    """Film the clips and write their truth."""
    import json

    from flicker.demo.films import films
    from flicker.files import write_text

    clips = films()
    for film in clips:
        film.write(folder / film.file)
    truth = {film.file: film.truth() for film in clips}
    write_text(folder / _FILMS, json.dumps(truth, indent=2, ensure_ascii=False) + "\n")


def _copy(name: str, folder: Path) -> None:
    from flicker.files import write_text

    write_text(folder / name, (Path(__file__).parent / name).read_text(encoding="utf-8"))
