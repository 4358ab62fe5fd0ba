"""Work done side by side, its results in order."""

from __future__ import annotations

import os
import signal
import threading
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, TypeVar

from flicker.errors import InputError

if TYPE_CHECKING:
    from concurrent.futures import Future

Item = TypeVar("Item")
Result = TypeVar("Result")

_AHEAD = 4  # items that wait for each worker
_ONE_THREAD = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")


Watcher = Callable[[str, int, int | None], None]  # is told what, which one, and of how many; 0 at the end
_watchers: list[Watcher] = []


@contextmanager
def watched_by(watcher: Watcher) -> Iterator[None]:
    """Tell somebody how far long work has come, for as long as the block runs."""
    _watchers.append(watcher)
    try:
        yield
    finally:
        _watchers.remove(watcher)


def counted(items: Iterable[Item], what: str, total: int | None = None) -> Iterator[Item]:
    """Go through items, and tell who watches which one is at work."""
    try:
        for number, item in enumerate(items, 1):
            for watcher in _watchers:
                watcher(what, number, total)
            yield item
    finally:
        for watcher in _watchers:
            watcher(what, 0, total)


def in_threads(function: Callable[[Item], Result], items: Sequence[Item]) -> list[Result]:
    """
    Apply a function of arrays to items, two at a time, in threads of this process.

    Arithmetic on long arrays lets other threads go on meanwhile; what goes through the interpreter does not.
    """
    if len(items) < 2:
        return [function(item) for item in items]
    from concurrent.futures import ThreadPoolExecutor

    with ThreadPoolExecutor(2) as pool:
        return list(pool.map(function, items))


def side_by_side(function: Callable[[Item], Result], items: Sequence[Item], workers: int = 1) -> Iterator[Result]:
    """
    Apply a function to items, several at a time, and give the results in the order of the items.

    Parameters
    ----------
    function : callable
        A function of a module, or a `functools.partial` of one: it travels to other processes.
    items : sequence
        What it is applied to.
    workers : int
        Processes; with 1 the work is done in this one.

    Yields
    ------
    object
        Results. Only a few wait in memory at any time.

    Raises
    ------
    InputError
        If the number of workers is below 1.
    """
    if workers < 1:
        raise InputError(f"--workers must be at least 1, not {workers}")
    if workers == 1 or len(items) < 2:
        yield from map(function, items)
        return
    import multiprocessing
    from concurrent.futures import ProcessPoolExecutor

    before = {name: os.environ.get(name) for name in _ONE_THREAD}
    os.environ.update(dict.fromkeys(_ONE_THREAD, "1"))  # the items are the parallel part
    spawn = multiprocessing.get_context("spawn")
    pool = ProcessPoolExecutor(min(workers, len(items)), mp_context=spawn, initializer=_end_with_parent)
    waiting: deque[Future[Result]] = deque()
    try:
        for item in items:
            waiting.append(pool.submit(function, item))
            if len(waiting) > _AHEAD * workers:
                yield waiting.popleft().result()
        while waiting:
            yield waiting.popleft().result()
    finally:
        with _undisturbed():
            pool.shutdown(wait=True, cancel_futures=True)
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


@contextmanager
def _undisturbed() -> Iterator[None]:
    """Put off signals: one that breaks into the end of a pool would leave it waiting for ever."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT, signal.SIGTERM})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _end_with_parent() -> None:
    """See to it that a worker does not outlive a program that was killed."""
    from multiprocessing import parent_process

    parent = parent_process()

    def watch() -> None:
        if parent is not None:
            parent.join()
            os._exit(1)

    threading.Thread(target=watch, daemon=True).start()
