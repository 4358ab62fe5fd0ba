"""`flicker check`: captures measured and judged against limits; the exit status is the answer."""

from __future__ import annotations

import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any, NoReturn

import click

from flicker.cli.options import (
    given,
    limit_options,
    many_options,
    output_options,
    page_option,
    reading_options,
    several,
    uncertainty_options,
)
from flicker.cli.output import (
    command_line,
    complain,
    make_folder,
    print_words,
    spare_the_captures,
    terminal_width,
    write_pieces,
)
from flicker.errors import ExitStatus, UnreadableFileError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from flicker.sweep.batch import Task
    from flicker.sweep.manifest import Step

_STATUS = {
    "fail": ExitStatus.LIMIT_BROKEN,
    "undecided": ExitStatus.UNDECIDED,
    "pass": ExitStatus.DONE,
    "not-applicable": ExitStatus.DONE,
}
_IN_FULL = 4  # captures up to which each is printed with all its verdicts

_sweep_options = several(
    click.option("--against", metavar="OTHER.csv", help="Manifest of an earlier sweep, to lay beside this one."),
    click.option("--resume", metavar="DIR", help="Keep each result there, and do only what is missing."),
)
_more_outputs = several(
    click.option("--csv", "csv_target", metavar="FILE", help="Write one row for each capture and channel."),
    click.option("--figures", metavar="DIR", help="Write a picture of each sweep over its dimming levels."),
    click.option("--record", "record_file", metavar="FILE.toml", help="Who, what, when, with what: put on the result."),
    click.option("--verbose", is_flag=True, help="Print every verdict of every capture, however many there are."),
)


@click.command(short_help="Judge captures against limits; the exit status is the answer.")
@click.argument("captures", nargs=-1, metavar="CAPTURE...")
@limit_options
@reading_options
@uncertainty_options
@many_options
@_sweep_options
@output_options
@page_option
@_more_outputs
def command(
    captures: tuple[str, ...],
    limits: tuple[str, ...],
    limits_file: str | None,
    on_date: str | None,
    decision: str,
    clock_ppm: float | None,
    dark_uncertainty: float | None,
    manifest: str | None,
    workers: int,
    against: str | None,
    resume: str | None,
    json_target: str | None,
    quiet: bool,
    html_target: str | None,
    csv_target: str | None,
    figures: str | None,
    record_file: str | None,
    verbose: bool,
    **reading: Any,
) -> None:
    """Measure every CAPTURE and judge it against limits.

    The exit status is the answer: 0 if every verdict is pass or not applicable, 1 if a limit is broken, 3 if none is
    broken but one cannot be decided, 2 if the words or a file are wrong. Levels of a sweep come from a manifest, or
    from the names of the captures (display-30pct.csv).

    Example:

        flicker check bridge-display-night.csv --dark-level 0.012 --limit ieee1789-low-risk
    """
    from dataclasses import replace

    from flicker.files import write_text
    from flicker.limits import chosen_limits
    from flicker.report.check import Answer, Terms
    from flicker.sweep.batch import Task
    from flicker.sweep.course import points_of
    from flicker.sweep.manifest import read_manifest, steps_from_names
    from flicker.sweep.record import read_record

    steps = (*(read_manifest(manifest) if manifest else ()), *steps_from_names(captures))
    if not steps:
        raise click.UsageError("no capture: name one, or a table of them with --manifest")
    earlier = read_manifest(against) if against else ()
    record = read_record(record_file) if record_file else {}
    sources = [*(step.capture for step in (*steps, *earlier)), manifest, against, limits_file, record_file]
    spare_the_captures(filter(None, [*sources, reading["dark_capture"]]), [json_target, csv_target, html_target])
    folder = make_folder(figures) if figures else None
    if resume:
        make_folder(resume)
    in_full = len(steps) <= _IN_FULL or verbose
    measuring = given(clock_ppm=clock_ppm, dark_uncertainty=dark_uncertainty)
    task = Task(chosen_limits(limits, limits_file, on_date), decision, given(**reading), measuring, resume, in_full)
    shown = task
    if html_target and in_full:
        from flicker.report.sheets import judged_article

        shown = replace(task, show=judged_article)
    width = terminal_width()
    terms = Terms(task.limits, decision, command_line(), record)
    with _ends_in_order(), Answer(terms) as answer:
        for result in _judged(steps, shown, workers):
            if "error" in result and len(steps) == 1:
                raise UnreadableFileError(result["error"])
            answer.add(result)
            for block in answer.verdicts_in_words(result, width) if in_full else ():
                print_words(block + "\n", json_target)
        before = [point for result in _judged(earlier, task, workers) for point in points_of(result)]
        for block in answer.closing_words(before, width):
            print_words(block + "\n", json_target)
        write_pieces(answer.json_pieces(before), json_target)
        if csv_target:
            write_text(csv_target, answer.table())
        if html_target:
            write_text(html_target, answer.page(before))
        if folder:
            from flicker.plots.sweep import save_sweeps

            save_sweeps(answer.courses, folder)
        status = ExitStatus.UNUSABLE_INPUT if answer.errors else _STATUS[answer.outcome]
    raise SystemExit(int(status))


def _judged(steps: Sequence[Step], task: Task, workers: int) -> Iterator[dict[str, Any]]:
    """Judge captures with progress; those that cannot be read are named on standard error."""
    from flicker.sweep.batch import judge_captures
    from flicker.workers import counted

    found = judge_captures(steps, task, workers=workers)
    for _, result in zip(counted(steps, "capture", len(steps)), found, strict=False):
        if "error" in result and len(steps) > 1:
            complain(result["error"])
        yield result


@contextmanager
def _ends_in_order() -> Iterator[None]:
    """End in order when asked to: no half-written file, no worker left behind."""

    def stop(*_: object) -> NoReturn:
        raise SystemExit(128 + signal.SIGTERM)

    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGTERM, stop)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)
