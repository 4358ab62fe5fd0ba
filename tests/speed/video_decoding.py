"""
Reading a video against decoding it: `python tests/speed/video_decoding.py VIDEO LINE_TIME [ROUNDS]`.

Prints the time of decoding alone, of the traces that flicker measure reads and of the whole of flicker stripes, best of
the rounds, and the peak memory of the process.
"""

from __future__ import annotations

import resource
import sys
import time
from collections.abc import Callable
from pathlib import Path

import av

from flicker.errors import NotMeasurable
from flicker.filmed import read_back
from flicker.readers import read


def decoding(path: Path) -> None:
    """Decode every frame with the threads that the reader uses."""
    with av.open(str(path)) as container:
        container.streams.video[0].thread_type = "AUTO"
        for _ in container.decode(video=0):
            pass


def stripes(path: Path, line_time: float) -> None:
    """Read the light back, or be told that there is none."""
    try:
        read_back(path, line_time=line_time, exposure=1 / 1000, transfer="bt709")
    except NotMeasurable as problem:
        print("refused:", problem)


def best(work: Callable[[], object], rounds: int) -> float:
    """Give the shortest time of some rounds [s]."""
    times = []
    for _ in range(rounds):
        begin = time.perf_counter()
        work()
        times.append(time.perf_counter() - begin)
    return min(times)


def main() -> None:
    """Print the times and their ratios to decoding."""
    path, line_time = Path(sys.argv[1]), float(sys.argv[2])
    rounds = int(sys.argv[3]) if len(sys.argv) > 3 else 3
    alone = best(lambda: decoding(path), rounds)
    print(f"decoding alone  {alone:.2f} s")
    for name, work in (("measure", lambda: read(path)), ("stripes", lambda: stripes(path, line_time))):
        took = best(work, rounds)
        print(f"{name:14}  {took:.2f} s, {took / alone:.2f} times decoding")
    print(f"peak memory     {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:.0f} MB")


if __name__ == "__main__":
    main()
