"""`flicker plan`: which exposure and frame rate keeps every light clean on every camera."""

from __future__ import annotations

import click

from flicker.cli.options import page_option
from flicker.cli.output import colour_wanted, command_line, print_words, spare_the_captures, terminal_width, write_json


@click.command(short_help="The exposure and frame rate that keep every light clean.")
@click.argument("plan_file", metavar="PLAN.toml")
@click.option("--json", "json_target", metavar="FILE|-", help="Write the plan as JSON; - for standard output.")
@page_option
def command(plan_file: str, json_target: str | None, html_target: str | None) -> None:
    """Find the exposure and frame rate that keeps every light clean on every camera.

    PLAN.toml lists lights (a capture each, or frequency_hz and duty), cameras (a camera file each) with the frame rates
    and exposures to choose from, the tolerance of the lights' frequencies and the contrast up to which bands may stay.
    Settings are ranked by the light that is worst for them. --html writes the shoot card, one page to print.

    Example:

        flicker plan night-watch.toml
    """
    from flicker.analysis import measure, read
    from flicker.camera.plan_file import plan_from_file
    from flicker.report.plan import plan_words

    spare_the_captures([plan_file], [json_target, html_target])
    plan = plan_from_file(plan_file, lambda capture, **how: measure(read(capture, **how)).light)
    write_json(plan.to_dict(), json_target)
    if html_target:
        from flicker.files import write_text
        from flicker.report.pages import plan_page

        write_text(html_target, plan_page(plan, plan_file, command_line()))
    print_words(plan_words(plan, width=terminal_width(), colour=colour_wanted()), json_target)
