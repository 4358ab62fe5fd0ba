"""Many captures judged, side by side and in order, each result kept so that a stopped run can go on."""

from __future__ import annotations

import hashlib
import json
import multiprocessing
import os
from collections import deque
from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import Future, ProcessPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from flicker import __version__
from flicker.errors import FlickerError, InputError
from flicker.files import write_text
from flicker.limits import Limit
from flicker.sweep.manifest import Step

_AHEAD = 4  # captures that wait for each worker
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


@dataclass(frozen=True, slots=True)
class Task:
    """What is done to every capture of a run."""

    limits: tuple[Limit, ...]
    decision: str = "guarded"
    reading: Mapping[str, Any] = field(default_factory=dict)  # keywords of `flicker.read`
    measuring: Mapping[str, Any] = field(default_factory=dict)  # keywords of `flicker.measure`
    keep: str | None = None  # folder with the results of an earlier run


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
        return {"capture": {"path": step.capture}, "error": str(error), "conditions": step.to_dict()}
    report = check(report, task.limits, decision=task.decision, level=step.level, supply=step.supply or None)
    return {**report.captures[0].to_dict(), "conditions": step.to_dict()}


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

    Raises
    ------
    InputError
        If the number of workers is below 1.
    """
    if workers < 1:
        raise InputError(f"--workers must be at least 1, not {workers}")
    if workers == 1 or len(steps) < 2:
        for step in steps:
            yield _kept_or_judged(step, task)
        return
    before = {name: os.environ.get(name) for name in _ONE_THREAD}
    os.environ.update(dict.fromkeys(_ONE_THREAD, "1"))  # the captures are the parallel part
    pool = ProcessPoolExecutor(min(workers, len(steps)), mp_context=multiprocessing.get_context("spawn"))
    waiting: deque[Future[dict[str, Any]]] = deque()
    try:
        for step in steps:
            waiting.append(pool.submit(_kept_or_judged, step, task))
            if len(waiting) > _AHEAD * workers:
                yield waiting.popleft().result()
        while waiting:
            yield waiting.popleft().result()
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


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
    )
    digest.update(json.dumps(rest, ensure_ascii=False, default=str).encode())
    for path in (step.capture, task.reading.get("dark_capture")):
        if path and Path(path).is_file():
            with Path(path).open("rb") as file:
                digest.update(hashlib.file_digest(file, "sha256").digest())
    return digest.hexdigest()[:32]
