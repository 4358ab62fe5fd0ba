"""`flicker margin`: how far from every limit, and the smallest change that reaches it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from flicker.cli.options import (
    FREQUENCY,
    PERCENT,
    TIME,
    given,
    light_from_options,
    light_options,
    limit_options,
    output_options,
    several,
)
from flicker.cli.output import print_words, spare_the_captures, terminal_width, write_json
from flicker.errors import InputError

if TYPE_CHECKING:
    from flicker.camera.frequencies import CleanFrequencies
    from flicker.limits import Limit, Verdict
    from flicker.tunable import TunableLight

_camera_options = several(
    click.option(
        "--camera", "cameras", multiple=True, metavar="FILE.toml", help="Camera to stay clean on, repeatable."
    ),
    click.option("--exposure", "exposures", type=TIME, multiple=True, help="Exposure, in place of those of the files."),
    click.option("--contrast", type=PERCENT, help="Band contrast to stay within on every camera."),
    click.option("--duty-range", metavar="LOW,HIGH", help="Range of the duty cycle over which the light is dimmed."),
    click.option("--tolerance", type=PERCENT, help="How far the oscillator may be off."),
    click.option("--from-frequency", type=FREQUENCY, help="Lowest PWM frequency to propose; 50 Hz if left out."),
)


@click.command(short_help="What change of a light would keep each limit.")
@click.argument("capture", metavar="[CAPTURE]", required=False)
@light_options
@limit_options
@_camera_options
@output_options
def command(
    capture: str | None,
    limits: tuple[str, ...],
    limits_file: str | None,
    on_date: str | None,
    decision: str,
    cameras: tuple[str, ...],
    exposures: tuple[float, ...],
    contrast: float | None,
    duty_range: str | None,
    tolerance: float | None,
    from_frequency: float | None,
    json_target: str | None,
    quiet: bool,
    **options: Any,
) -> None:
    """Say for each limit what change of a light would keep it, and how much room is left.

    The light comes from a CAPTURE, or is typed in with --frequency and --duty. With --camera and --contrast it also
    finds PWM frequencies that leave no deeper bands on any of these cameras, at any of their exposures.

    Example:

        flicker margin --frequency 240 --duty 0.3 --limit ieee1789-low-risk
    """
    from flicker.limits import chosen_limits, margin_of
    from flicker.report.margin import camera_words, column_notes, margin_words

    spare_the_captures(filter(None, [capture, limits_file, *cameras]), [json_target])
    rows = chosen_limits(limits, limits_file, on_date)
    low_level = options["low_level"] or 0.0
    settings = _settings(cameras, exposures)
    clean = (
        _clean(settings, contrast, duty_range, tolerance, low_level, from_frequency) if settings or contrast else None
    )
    width = terminal_width()
    lights = _lights(capture, rows, decision, options)
    entries, shown = [], []
    for title, light, verdicts in lights:
        margins = [margin_of(verdict, light) for verdict in verdicts]
        channel = {"channel": light.channel.name} if len(lights) > 1 else {}
        entries += [{**channel, **one.to_dict()} for one in margins]
        print_words(margin_words(title, light, margins, width=width) + "\n", json_target)
        shown += margins
    print_words(column_notes(shown, width=width), json_target)
    data: dict[str, Any] = {"light": [_light_data(light) for _, light, _ in lights], "limits": entries}
    data["light"] = data["light"][0] if len(lights) == 1 else data["light"]
    if clean is not None:
        data["cameras"] = {
            "contrast_limit_percent": 100.0 * (contrast or 0.0),
            "all_from_hz": clean.all_from,
            "frequencies": [choice.to_dict() for choice in clean.choices],
        }
        print_words("\n" + camera_words(clean, contrast or 0.0, len(settings), width=width), json_target)
    write_json(data, json_target)


def _lights(
    capture: str | None, rows: tuple[Limit, ...], decision: str, options: dict[str, Any]
) -> list[tuple[str, TunableLight, list[Verdict]]]:
    """Give each channel with its verdicts: measured, or typed in and exact."""
    from flicker.limits import judge
    from flicker.tunable import TunableLight

    if capture is None:
        lights = [TunableLight.typed(channel) for channel in light_from_options(None, options)[0]]
        titles = ["light typed in"] if len(lights) == 1 else [light.channel.name for light in lights]
        return [
            (title, light, [judge(row, *light.findings(), decision) for row in rows])
            for title, light in zip(titles, lights, strict=True)
        ]
    typed = next((name for name in ("frequency", "duty", "low_level", "decay") if options.pop(name) is not None), None)
    if typed:
        raise InputError(f"--{typed.replace('_', '-')} types a light in: give it, or the capture {capture}, not both")
    from flicker.analysis import check, measure, read

    (report,) = check(measure(read(capture, **given(**options))), rows, decision=decision).captures
    names = [capture if len(report.channels) == 1 else f"{capture}, {one.trace.name}" for one in report.channels]
    return [
        (name, TunableLight.measured(channel), list(channel.verdicts))
        for name, channel in zip(names, report.channels, strict=True)
    ]


def _light_data(light: TunableLight) -> dict[str, Any]:
    pulse = light.channel.pulse
    data = {"frequency_hz": light.frequency, "percent_flicker": light.percent_flicker(1.0)}
    if pulse is None:
        return data
    return {**data, "duty": pulse.duty, "low_level": pulse.low_level, "decay_s": pulse.decay}


def _settings(cameras: tuple[str, ...], exposures: tuple[float, ...]) -> list[tuple[Any, float]]:
    """Give every camera with every exposure that it must stay clean at."""
    from flicker.camera import Camera

    settings = []
    for file in cameras:
        camera = Camera.load(file)
        chosen = exposures or camera.exposures
        if not chosen:
            raise InputError(f"{file}: lists no exposures_s: add them, or give --exposure")
        settings += [(camera, exposure) for exposure in chosen]
    return settings


def _clean(
    settings: list[tuple[Any, float]],
    limit: float | None,
    duty_range: str | None,
    tolerance: float | None,
    low_level: float,
    from_frequency: float | None,
) -> CleanFrequencies:
    from flicker.camera.frequencies import clean_frequencies

    for value, name in ((limit, "--contrast"), (duty_range, "--duty-range"), (tolerance, "--tolerance")):
        if value is None:
            raise InputError(f"cameras as limits need {name}: nothing is taken for granted about the driver")
    ends = str(duty_range).split(",")
    try:
        low, high = (float(end) for end in ends)
    except ValueError:
        raise InputError(f"'{duty_range}' is no duty range: write it as 0.05,0.95") from None
    return clean_frequencies(
        settings,
        limit or 0.0,
        duties=(low, high),
        low_level=low_level,
        tolerance=tolerance or 0.0,
        lowest=from_frequency or 50.0,
    )
