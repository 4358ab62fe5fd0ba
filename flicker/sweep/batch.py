"""Many captures judged, side by side and in order, each result kept so that a stopped run can go on."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from flicker import __version__
from flicker.errors import FlickerError
from flicker.files import write_text
from flicker.limits import Limit, margin_of
from flicker.sweep.manifest import Step
from flicker.workers import side_by_side

if TYPE_CHECKING:
    from flicker.reports import CaptureReport, ChannelReport

_CURES = ("least_frequency_hz", "most_percent_flicker", "ripple_factor", "ripple_db", "reason")


@dataclass(frozen=True, slots=True)
class Task:
    """What is done to every capture of a run."""

    limits: tuple[Limit, ...]
    decision: str = "guarded"
    reading: Mapping[str, Any] = field(default_factory=dict)  # keywords of `flicker.read`
    measuring: Mapping[str, Any] = field(default_factory=dict)  # keywords of `flicker.measure`
    keep: str | None = None  # folder with the results of an earlier run
    advise: bool = False  # whether to work out what would make each broken limit pass
    show: Callable[[CaptureReport, Mapping[str, Any]], str] | None = None  # makes the part of a page, key `article`


def judge_capture(step: Step, task: Task) -> dict[str, Any]:
    """
    Read, measure and judge one capture.

    Returns
    -------
    dict
        The JSON form of the capture, with the conditions that the manifest states; a capture that cannot be
        read has the key `error` instead of channels.
    """
    from flicker.analysis import check, measure, read

    reading = dict(task.reading)
    if step.dark_level is not None:
        reading["dark_level"] = step.dark_level
    try:
        report = measure(read(step.capture, **reading), **task.measuring)
    except FlickerError as error:
        return {"capture": {"path": step.capture}, "error": str(error), **_conditions(step)}
    report = check(report, task.limits, decision=task.decision, level=step.level, supply=step.supply or None)
    (capture,) = report.captures
    data = {**capture.to_dict(), **_conditions(step)}
    if task.advise:
        for channel, judged in zip(data["channels"], capture.channels, strict=True):
            _advise(channel["verdicts"], judged)
    if task.show is not None:
        data["article"] = task.show(capture, data)
    return data


def _advise(entries: list[dict[str, Any]], channel: ChannelReport) -> None:
    """Add to every broken limit what change of the light would keep it."""
    from flicker.tunable import TunableLight

    if all(verdict.verdict != "fail" for verdict in channel.verdicts):
        return
    light = TunableLight.measured(channel)
    for entry, verdict in zip(entries, channel.verdicts, strict=True):
        if verdict.verdict == "fail":
            found = margin_of(verdict, light).to_dict()
            entry["to_pass"] = {key: found[key] for key in _CURES}


def _conditions(step: Step) -> dict[str, Any]:
    known = step.to_dict()
    return {"conditions": known} if known else {}


def judge_captures(steps: Sequence[Step], task: Task, *, workers: int = 1) -> Iterator[dict[str, Any]]:
    """
    Judge captures, several side by side, and give their results in order.

    Parameters
    ----------
    steps : sequence of Step
        The captures.
    task : Task
        What is done to each. With a folder to keep results in, what lies there already is not done again, and
        every new result is written there, whole or not at all.
    workers : int
        Processes.

    Yields
    ------
    dict
        As `judge_capture` gives them. Only a few results wait in memory at any time.
    """
    return side_by_side(partial(_kept_or_judged, task=task), steps, workers)


def _kept_or_judged(step: Step, task: Task) -> dict[str, Any]:
    if task.keep is None:
        return judge_capture(step, task)
    kept = Path(task.keep) / f"{_key(step, task)}.json"
    try:
        found: dict[str, Any] = json.loads(kept.read_text(encoding="utf-8"))
        return found
    except (OSError, ValueError):
        pass
    result = judge_capture(step, task)
    if "error" not in result:
        write_text(kept, json.dumps(result, ensure_ascii=False, allow_nan=False))
    return result


def _key(step: Step, task: Task) -> str:
    """Name a result by all that it depends on: the capture's bytes, how it was read, the limits, the program."""
    digest = hashlib.sha256()
    rest = (
        __version__,
        step.capture,
        step.to_dict(),
        step.dark_level,
        sorted({**task.reading, **task.measuring}.items(), key=lambda item: item[0]),
        [limit.to_dict() for limit in task.limits],
        task.decision,
        task.advise,
        task.show is not None,
    )
    digest.update(json.dumps(rest, ensure_ascii=False, default=str).encode())
    for path in (step.capture, task.reading.get("dark_capture")):
        if path and Path(path).is_file():
            with Path(path).open("rb") as file:
                digest.update(hashlib.file_digest(file, "sha256").digest())
    return digest.hexdigest()[:32]
