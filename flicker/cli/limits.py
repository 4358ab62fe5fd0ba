"""`flicker limits`: the limits known, each with its clause and its source."""

from __future__ import annotations

import click

from flicker.cli.output import print_words, terminal_width, write_json


@click.command(short_help="The limits known, each with its clause and its source.")
@click.argument("names", metavar="[ID]...", nargs=-1)
@click.option("--on-date", metavar="DATE", help="Limits as they stood on a day, such as 2024-08-31.")
@click.option("--limits-file", metavar="FILE.toml", help="A sheet of your own, beside those built in.")
@click.option("--json", "json_target", metavar="FILE|-", help="Write them as JSON; - for standard output.")
def command(names: tuple[str, ...], on_date: str | None, limits_file: str | None, json_target: str | None) -> None:
    """List the limits that `flicker check` knows, or only those named.

    Each comes with what it allows, since when, its clause, its source and how far that source was seen; named, also
    with what it holds for. Without a date the list holds what is in force and what has been replaced.

    Example:

        flicker limits --on-date 2024-08-31
    """
    from flicker.limits import all_rows, chosen_limits
    from flicker.report.verdicts import limits_words

    rows = chosen_limits(names, limits_file, on_date) if names or on_date else all_rows(limits_file)
    write_json({"limits": [row.to_dict() for row in rows]}, json_target)
    print_words(limits_words(rows, detailed=bool(names), width=terminal_width()), json_target)
