"""`flicker demo`: captures to try the program on."""

from __future__ import annotations

import click

from flicker.cli.output import make_folder, print_words
from flicker.errors import InputError


@click.command(short_help="Write demonstration captures and a walk through them.")
@click.argument("folder", metavar="DIR")
def command(folder: str) -> None:
    """Write the demonstration captures into DIR, with a commented walk through them.

    The captures are lights of a harbour pilot station, computed from known waveforms: a display dimmed by day, at
    dusk and at night, lamps on direct current and on the mains. `truth.json` says what is true of each,
    `walk-through.md` which commands to try. Files that are there already are left alone.

    Example:

        flicker demo harbour
    """
    from flicker.demo import demo_files, write_demo

    place = make_folder(folder)
    taken = next((name for name in demo_files() if (place / name).exists()), None)
    if taken is not None:
        raise InputError(f"{place / taken} is there already: name a folder without it")
    write_demo(place)
    print_words(
        f"{len(demo_files())} files written into {folder}.\n"
        f"Read {place / 'walk-through.md'}, or begin with:\n\n"
        f"  cd {folder}\n"
        "  flicker measure bridge-display-night.csv --dark-level 0.012"
    )
