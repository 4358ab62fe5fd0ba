"""Options that mean the same on every command."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any, TypeVar

import click

from flicker.errors import InputError
from flicker.quantities import parse_quantity

if TYPE_CHECKING:
    from flicker.camera import Camera
    from flicker.light import Light

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


class Times(click.ParamType[tuple[float, ...]]):
    """Several times in one word, with a separator between."""

    def __init__(self, name: str, separator: str, *, positive: bool = True) -> None:
        self.name = name
        self._separator = separator
        self._one = Quantity("time", positive=positive)

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> tuple[float, ...]:
        """Parse each of them."""
        if isinstance(value, tuple):
            return value
        return tuple(self._one.convert(one, param, ctx) for one in str(value).split(self._separator))


class Percent(click.ParamType[float]):
    """A share in per cent below a bound, with or without the sign; inside the program it is a share of 1."""

    name = "PERCENT"

    def __init__(self, below: float = 100.0) -> None:
        self._below = below

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """Parse, and refuse what lies outside its range."""
        try:
            percent = float(str(value).removesuffix("%"))
        except ValueError:
            self.fail(f"'{value}' is no number of per cent", param, ctx)
        if not 0 <= percent < self._below:
            self.fail(f"'{value}' must lie between 0 and {self._below:g} %", param, ctx)
        return percent / 100.0


class Region(click.ParamType[tuple[int, int, int, int]]):
    """Part of a picture: `X,Y,WIDTH,HEIGHT` in pixels."""

    name = "X,Y,WIDTH,HEIGHT"

    def convert(
        self, value: Any, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[int, int, int, int]:
        """Parse four whole numbers."""
        parts = str(value).split(",")
        if len(parts) != 4 or not all(part.strip().isdecimal() for part in parts):
            self.fail(f"'{value}' is no region: write four whole numbers, X,Y,WIDTH,HEIGHT", param, ctx)
        x, y, width, height = (int(part) for part in parts)
        return x, y, width, height


TIME = Quantity("time")
FREQUENCY = Quantity("frequency")
MOMENT = Quantity("time", positive=False)
STAGGERED = Times("S", "+")
DECAYS = Times("S[,S,S]", ",", positive=False)
PERCENT = Percent()
DEVIATION = Percent(below=50.0)


def several(*options: Callable[[Function], Function]) -> Callable[[Function], Function]:
    """Join options into one decorator, shown by `--help` in the order given."""

    def decorate(function: Function) -> Function:
        for option in reversed(options):
            function = option(function)
        return function

    return decorate


_READING = (
    *("sample_rate", "columns", "time_column", "channels", "dark_level", "dark_capture", "mean", "dc_coupled"),
    *("inverted", "detector_bandwidth", "start", "duration"),
)
_photodiode_options = several(
    click.option("--sample-rate", type=FREQUENCY, help="Sample rate of a CSV that does not state it."),
    click.option(
        "--column", "columns", multiple=True, metavar="NAME_OR_NUMBER", help="CSV column; numbers count from 1."
    ),
    click.option("--time-column", metavar="NAME_OR_NUMBER", help="CSV column that holds the time."),
    click.option(
        "--channel",
        "channels",
        type=click.IntRange(min=1),
        multiple=True,
        metavar="NUMBER",
        help="WAV channel, from 1.",
    ),
    click.option("--dark-level", type=float, metavar="LEVEL", help="Reading with the light blocked."),
    click.option("--dark-capture", metavar="FILE", help="Capture taken with the light blocked."),
    click.option("--mean", type=float, metavar="LEVEL", help="True mean level above dark, where AC coupling lost it."),
    click.option("--dc-coupled", is_flag=True, help="The WAV really holds the mean level."),
    click.option("--inverted", is_flag=True, help="More light reads lower."),
    click.option("--detector-bandwidth", type=FREQUENCY, help="First-order -3 dB bandwidth to correct for."),
    click.option("--start", type=MOMENT, help="Where to begin in the capture."),
    click.option("--duration", type=TIME, help="How much of the capture to use."),
)

_picture_options = several(
    click.option("--frame-rate", type=FREQUENCY, help="Frame rate at which a video was really shot."),
    click.option("--region", type=Region(), help="Part of the picture of a video, as stored, in pixels."),
    click.option(
        "--transfer",
        metavar="NAME|GAMMA",
        help="How code values of a video relate to light: srgb, bt709, linear, hlg, pq or an exponent.",
    ),
)

video_options = several(
    _picture_options,
    click.option("--line-time", type=TIME, help="From the start of one line to that of the next."),
    click.option("--line-rate", type=FREQUENCY, help="Its inverse, in place of it."),
    click.option("--readout-time", type=TIME, help="Of all lines of a frame, in place of it."),
    click.option(
        "--read-direction",
        metavar="down|up|left|right",
        help="The way the lines are read in the picture as stored.",
    ),
    click.option("--start", type=MOMENT, help="Where to begin in the video."),
    click.option("--duration", type=TIME, help="How much of the video to use."),
)

reading_options = several(
    _picture_options,
    click.option("--exposure", type=TIME, help="Exposure of each frame of a video, to undo what it takes."),
    _photodiode_options,
)

light_options = several(
    click.option("--frequency", type=FREQUENCY, help="PWM frequency of a light typed in."),
    click.option("--duty", type=float, metavar="SHARE", help="Share of the period that it is on, 0 to 1."),
    click.option("--low-level", type=float, metavar="RATIO", help="Its off level over its on level; 0 if left out."),
    click.option(
        "--decay",
        type=DECAYS,
        help="Its decay time (1/e), or three with commas for red, green and blue; 0 if left out.",
    ),
    _photodiode_options,
)

filmed_options = several(
    click.option(
        "--filmed-with", "filmed_camera_file", metavar="FILE.toml", help="Camera file of what filmed the capture."
    ),
    click.option("--filmed-line-time", type=TIME, help="Line time of what filmed the capture."),
    click.option("--filmed-exposure", type=TIME, help="Exposure at which the capture was filmed; fitted if left out."),
)

camera_options = several(
    click.option("--camera", "camera_file", metavar="FILE.toml", help="Camera file; the options below override it."),
    click.option("--lines", type=click.IntRange(min=1), metavar="N", help="Lines of a frame."),
    click.option("--line-time", type=TIME, help="From the start of one line to that of the next."),
    click.option("--line-rate", type=FREQUENCY, help="Its inverse, in place of it."),
    click.option(
        "--readout-time", type=TIME, help="Of all lines of a frame, or the travel of a curtain, in place of it."
    ),
    click.option("--frame-rate", type=FREQUENCY, help="Frame rate of the camera; 24000/1001 is understood."),
    click.option("--shutter", metavar="rolling|global", help="How lines are exposed; rolling if left out."),
    click.option(
        "--read-direction",
        metavar="down|up|left|right",
        help="The way the lines are read in the picture as stored; down if left out.",
    ),
    click.option(
        "--line-binning", type=click.IntRange(min=1), metavar="N", help="Sensor lines that make one of the picture."
    ),
)


limit_options = several(
    click.option("--limit", "limits", multiple=True, metavar="ID", help="Limit to keep, repeatable; all if left out."),
    click.option("--limits-file", metavar="FILE.toml", help="Limits of your own, beside those built in."),
    click.option("--on-date", metavar="DATE", help="Judge by what applied on a day, such as 2024-08-31."),
    click.option(
        "--decision",
        metavar="guarded|simple",
        default="guarded",
        help="Whether the whole 95 % interval must keep the limit, or the value alone; guarded if left out.",
    ),
)

uncertainty_options = several(
    click.option("--clock-ppm", type=float, metavar="PPM", help="Standard uncertainty of the sample clock."),
    click.option(
        "--dark-uncertainty", type=float, metavar="LEVEL", help="Standard uncertainty of the dark level, in its unit."
    ),
)

window_option = click.option(
    "--window", type=TIME, help="Take every measure along the capture too, in windows of this length."
)

many_options = several(
    click.option("--manifest", metavar="FILE.csv", help="Captures with their conditions: capture, unit, level, ..."),
    click.option("--workers", type=click.IntRange(min=1), default=1, metavar="N", help="Captures side by side."),
)

output_options = several(
    click.option("--json", "json_target", metavar="FILE|-", help="Write the results as JSON; - for standard output."),
    click.option("--quiet", is_flag=True, help="No progress on standard error."),
)

page_option = click.option("--html", "html_target", metavar="FILE", help="Write the results as one HTML page.")


def given(**options: Any) -> dict[str, Any]:
    """Keep the options that were given, to be passed on as keywords."""
    return {name: value for name, value in options.items() if value is not None and value is not False and value != ()}


def camera_from_options(options: dict[str, Any]) -> Camera:
    """Take the camera options out of `options` and make a camera of them."""
    from flicker.camera import Camera

    names = (
        "lines",
        "line_time",
        "line_rate",
        "readout_time",
        "frame_rate",
        "shutter",
        "read_direction",
        "line_binning",
    )
    file = options.pop("camera_file")
    camera = Camera() if file is None else Camera.load(file)
    return camera.changed(**{name: options.pop(name) for name in names})


def light_from_options(capture: str | None, options: dict[str, Any]) -> tuple[Light, str]:
    """
    Take the light and reading options out of `options`: a light typed in, or that of a capture.

    The second is what of a video it was read from, empty for others.
    """
    from flicker.light import pwm_light

    typed = {name: options.pop(name) for name in ("frequency", "duty", "low_level", "decay")}
    how = {name: options.pop(name) for name in _READING}
    filmed = {name: options.pop(f"filmed_{name}", None) for name in ("camera_file", "line_time", "exposure")}
    if capture is not None:
        word = next((name for name, value in typed.items() if value is not None), None)
        if word:
            raise InputError(
                f"--{word.replace('_', '-')} types a light in: give it, or the capture {capture}, not both"
            )
        from flicker.analysis import light_of

        return light_of(capture, filmed=filmed, **given(**how))
    for name in ("frequency", "duty"):
        if typed[name] is None:
            raise InputError(f"no light: give a capture, or --frequency and --duty (--{name} is missing)")
    return pwm_light(typed["frequency"], typed["duty"], typed["low_level"] or 0.0, typed["decay"] or 0.0), ""
