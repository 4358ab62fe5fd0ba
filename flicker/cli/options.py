"""Options that mean the same on every command."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

from flicker.errors import InputError
from flicker.quantities import parse_quantity

Function = TypeVar("Function", bound=Callable[..., Any])


class Quantity(click.ParamType[float]):
    """A time or a frequency, with a unit or as a fraction where people write one."""

    def __init__(self, dimension: str, *, positive: bool = True) -> None:
        self.dimension = dimension
        self.positive = positive
        self.name = "S" if dimension == "time" else "HZ"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """Parse, and refuse what is not above zero where that cannot be right."""
        try:
            quantity = parse_quantity(value, self.dimension)
        except InputError as error:
            self.fail(str(error), param, ctx)
        if self.positive and quantity <= 0:
            self.fail(f"'{value}' must be above 0", param, ctx)
        return quantity


TIME = Quantity("time")
FREQUENCY = Quantity("frequency")
MOMENT = Quantity("time", positive=False)


def several(*options: Callable[[Function], Function]) -> Callable[[Function], Function]:
    """Join options into one decorator, shown by `--help` in the order given."""

    def decorate(function: Function) -> Function:
        for option in reversed(options):
            function = option(function)
        return function

    return decorate


reading_options = several(
    click.option("--sample-rate", type=FREQUENCY, help="Sample rate of a CSV that does not state it."),
    click.option("--frame-rate", type=FREQUENCY, help="Frame rate at which a video was really shot."),
    click.option(
        "--column", "columns", multiple=True, metavar="NAME_OR_NUMBER", help="CSV column; numbers count from 1."
    ),
    click.option("--time-column", metavar="NAME_OR_NUMBER", help="CSV column that holds the time."),
    click.option("--channel", "channels", type=click.IntRange(min=1), multiple=True, help="WAV channel, from 1."),
    click.option("--dark-level", type=float, metavar="LEVEL", help="Reading with the light blocked."),
    click.option("--dark-capture", metavar="FILE", help="Capture taken with the light blocked."),
    click.option("--mean", type=float, metavar="LEVEL", help="True mean level above dark, where AC coupling lost it."),
    click.option("--dc-coupled", is_flag=True, help="The WAV really holds the mean level."),
    click.option("--inverted", is_flag=True, help="More light reads lower."),
    click.option("--detector-bandwidth", type=FREQUENCY, help="First-order -3 dB bandwidth to correct for."),
    click.option("--start", type=MOMENT, help="Where to begin in the capture."),
    click.option("--duration", type=TIME, help="How much of the capture to use."),
)
