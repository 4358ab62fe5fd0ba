"""The command line: one module a command, found by its file name."""

from __future__ import annotations

import importlib
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, NoReturn

import click

from flicker import __version__
from flicker.cli.output import counting
from flicker.errors import ExitStatus, FlickerError
from flicker.registry import did_you_mean

_HELPERS = {"__init__", "options", "output"}


class Program(click.Group):
    """Finds the commands in this folder, and turns what goes wrong into one sentence and an exit status."""

    def make_context(self, info_name: str | None, args: list[str], *more: Any, **extra: Any) -> click.Context:
        """Keep the words of the command line, for results that state them."""
        extra.setdefault("obj", ["flicker", *args])
        return super().make_context(info_name, args, *more, **extra)

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
        """Run; what goes wrong becomes one sentence on standard error and its exit status."""
        run: Callable[..., Any] = super().main
        try:
            with counting(quiet="--quiet" in (kwargs.get("args") or (args[0] if args else None) or sys.argv)):
                answer = run(*args, **{**kwargs, "standalone_mode": False})
        except FlickerError as error:
            _fail(str(error), error.exit_status)
        except click.exceptions.NoArgsIsHelpError as error:
            error.show()
            sys.exit(int(ExitStatus.UNUSABLE_INPUT))
        except click.UsageError as error:
            where = error.ctx.command_path if error.ctx else "flicker"
            message = error.format_message()
            _fail(f"{message[:1].lower()}{message[1:]} ({where} --help)", ExitStatus.UNUSABLE_INPUT)
        except click.ClickException as error:
            _fail(error.format_message(), ExitStatus.UNUSABLE_INPUT)
        except click.Abort:
            _fail("interrupted", ExitStatus.INTERRUPTED)
        if kwargs.get("standalone_mode", True):
            sys.exit(answer if isinstance(answer, int) else int(ExitStatus.DONE))
        return answer


def _fail(sentence: str, status: ExitStatus) -> NoReturn:
    print(f"flicker: {' '.join(sentence.split())}", file=sys.stderr)
    sys.exit(int(status))


@click.group(cls=Program, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="flicker")
def program() -> None:
    """Flicker of backlights and lamps: measured, judged, and predicted for a camera.

    Captures from a photodiode (WAV, CSV) or a video go in; depth, frequency, risk region, verdicts and what a
    camera will record come out.

    Example:

        flicker measure bridge-display-night.csv
    """
