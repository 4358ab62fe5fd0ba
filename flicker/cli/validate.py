"""`flicker validate`: the program's own check values against their sources."""

from __future__ import annotations

import click

from flicker.cli.output import print_words, terminal_width, write_json


@click.command(short_help="Hold the program against its check values.")
@click.option("--json", "json_target", metavar="FILE|-", help="Write the check values as JSON; - for standard output.")
def command(json_target: str | None) -> None:
    """Hold the program against closed forms, tables and worked values, and print source, expected, got, deviation.

    Takes some seconds and needs no file. The exit status is 0 when every value keeps its tolerance, 1 when one does
    not. Run it after an installation, and keep its output with a report that must stand.

    Example:

        flicker validate
    """
    from flicker import __version__
    from flicker.errors import ExitStatus
    from flicker.report.validation import validation_words
    from flicker.validation import run_checks

    checks = list(run_checks())
    holds = all(check.ok for check in checks)
    entries = [check.to_dict() for check in checks]
    write_json({"program": __version__, "holds": holds, "checks": entries}, json_target)
    print_words(validation_words(checks, width=terminal_width()), json_target)
    if not holds:
        raise SystemExit(int(ExitStatus.LIMIT_BROKEN))
