"""Recordings larger than memory: read once, block by block, kept as an excerpt and as slow light."""

from __future__ import annotations

import queue
import threading
from collections.abc import Iterator
from contextlib import suppress
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from flicker.signal.severity import decimation
from flicker.trace import FloatArray, Whole

EXCERPT = 1 << 20  # samples
_FRAMES = 1 << 18  # of a part, about
_ALONE = 1 << 18  # products that the linear algebra makes in one thread; more would keep the reading from its core
_AHEAD = 4  # blocks that are read before they are wanted

Block = npt.NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class LongChannel:
    """One channel of a long recording: an excerpt from its middle, and the whole."""

    excerpt: FloatArray
    first: int  # number of the excerpt's first sample in what was read
    whole: Whole


class NotFinite(Exception):
    """The recording holds samples that are no numbers."""


def read_long(
    blocks: Iterator[Block], samples: int, channels: int, sample_rate: float, start: float
) -> list[LongChannel]:
    """
    Take in a long recording.

    Parameters
    ----------
    blocks : iterator of ndarray, shape (n, c)
        Blocks of `block_frames` frames, the last one shorter; read ahead in a thread.
    samples : int
        Frames that they hold together.
    channels : int
        c.
    sample_rate : float
        [Hz]
    start : float
        Time of the first frame. [s]

    Returns
    -------
    list of LongChannel
        One a channel.

    Raises
    ------
    NotFinite
        If a sample is no number.
    """
    first = max((samples - EXCERPT) // 2, 0)
    takers = [_Taker(first, min(EXCERPT, samples), sample_rate) for _ in range(channels)]
    for block in _ahead(blocks):
        for taker, light in zip(takers, np.ascontiguousarray(block.T), strict=True):
            taker.take(light)
    return [taker.done(samples, start) for taker in takers]


def block_frames(sample_rate: float) -> int:
    """Give the length that blocks must have."""
    factor, _ = decimation(sample_rate)
    return factor * max(round(_FRAMES / factor), 1)


class _Taker:
    """What is kept of one channel while its blocks go by."""

    def __init__(self, first: int, length: int, sample_rate: float) -> None:
        self._first, self._at, self._rate = first, 0, sample_rate
        self._excerpt = np.empty(length)
        self._factor, kernel = decimation(sample_rate)
        rows = -(-kernel.size // self._factor)
        padded = np.zeros(rows * self._factor, dtype=np.float32)
        padded[: kernel.size] = kernel
        self._centre = (kernel.size - 1) // 2  # sample of a window to which its value belongs
        self._kernel = np.ascontiguousarray(padded.reshape(rows, self._factor).T)
        self._rows = max(_ALONE // self._kernel.size, 1)
        self._products = np.empty((0, rows), dtype=np.float32)
        self._slow: list[Block] = []
        self._parts: list[tuple[float, float, float]] = []

    def take(self, light: Block) -> None:
        """Take in a block, shape (n,)."""
        low, high = light.min(), light.max()
        if not np.isfinite(low) or not np.isfinite(high):
            raise NotFinite
        self._parts.append((float(low), float(high), float(light.mean())))
        begin, end = max(self._first - self._at, 0), min(self._first + self._excerpt.size - self._at, light.size)
        if begin < end:
            place = self._at + begin - self._first
            self._excerpt[place : place + end - begin] = light[begin:end]
        self._at += light.size
        self._decimate(light)

    def _decimate(self, light: Block) -> None:
        """Filter by one product of matrices: rows of `factor` samples times the kernel cut into columns."""
        whole = light[: light.size // self._factor * self._factor].reshape(-1, self._factor)
        pieces = (whole[row : row + self._rows] @ self._kernel for row in range(0, len(whole), self._rows))
        products = np.concatenate([self._products, *pieces])
        columns = self._kernel.shape[1]
        count = max(len(products) - columns + 1, 0)
        if count:
            self._slow.append(sum(products[k : k + count, k] for k in range(columns)))  # type: ignore[arg-type]
        self._products = products[count:]

    def done(self, samples: int, start: float) -> LongChannel:
        """Give what was kept."""
        lowest, highest, mean = (np.array(values) for values in zip(*self._parts, strict=True))
        rate = self._rate / self._factor
        whole = Whole(
            samples=samples,
            duration=samples / self._rate,
            light=np.concatenate(self._slow) if self._slow else np.empty(0, dtype=np.float32),
            sample_rate=rate,
            start=start + self._centre / self._rate,
            lowest=lowest,
            highest=highest,
            mean=mean,
            part=block_frames(self._rate) / self._rate,
            first_part=start,
        )
        return LongChannel(self._excerpt, self._first, whole)


def _ahead(blocks: Iterator[Block]) -> Iterator[Block]:
    """Give the same blocks, read ahead in a thread; what it raises is raised here."""
    waiting: queue.Queue[Block | BaseException | None] = queue.Queue(_AHEAD)
    stopped = threading.Event()

    def hand_on(item: Block | BaseException | None) -> None:
        while not stopped.is_set():
            with suppress(queue.Full):
                waiting.put(item, timeout=0.1)
                break

    def run() -> None:
        try:
            for block in blocks:
                hand_on(block)
                if stopped.is_set():
                    return
            hand_on(None)
        except BaseException as error:
            hand_on(error)

    thread = threading.Thread(target=run, daemon=True)
    thread.start()
    try:
        while (item := waiting.get()) is not None:
            if isinstance(item, BaseException):
                raise item
            yield item
    finally:
        stopped.set()
        thread.join()
