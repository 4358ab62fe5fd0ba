"""The command line: one module a command, found by its file name."""

from __future__ import annotations

import importlib
import sys
from pathlib import Path
from typing import Any

import click

from flicker import __version__
from flicker.errors import FlickerError
from flicker.registry import did_you_mean

_HELPERS = {"__init__", "options", "output"}


class Program(click.Group):
    """Finds the commands in this folder, and turns what goes wrong into one sentence and an exit status."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Name every module of this folder that holds a command."""
        folder = Path(__file__).parent
        return sorted(file.stem.replace("_", "-") for file in folder.glob("*.py") if file.stem not in _HELPERS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import the one command that is asked for."""
        if cmd_name not in self.list_commands(ctx):
            return None
        module = importlib.import_module(f"flicker.cli.{cmd_name.replace('-', '_')}")
        command: click.Command = module.command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Find the command, or say which one was probably meant."""
        if args and not args[0].startswith("-") and args[0] not in self.list_commands(ctx):
            raise click.UsageError(did_you_mean("command", args[0], self.list_commands(ctx)), ctx)
        return super().resolve_command(ctx, args)

    def main(self, *args: Any, **kwargs: Any) -> Any:
        """Run; a `FlickerError` becomes one sentence on standard error and its exit status."""
        try:
            return super().main(*args, **kwargs)
        except FlickerError as error:
            print(f"flicker: {error}", file=sys.stderr)
            sys.exit(int(error.exit_status))


@click.group(cls=Program, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="flicker")
def program() -> None:
    """Flicker of backlights and lamps: measured, judged, and predicted for a camera.

    Captures from a photodiode (WAV, CSV) or a video go in; depth, frequency, risk region, verdicts and what a
    camera will record come out.

    Example:

        flicker measure bridge-display-night.csv
    """
