"""Whether an excerpt stands for the long recording that it was taken from."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from flicker.conditioning._shape import with_unit
from flicker.results import Note
from flicker.trace import FloatArray, Trace, Whole

_LEVEL_MOVED = 0.05  # of the mean: more is said
_SWING_MOVED = 0.2  # of the swing of a part; noise alone moves it by less


def with_excerpt_judged(trace: Trace) -> Trace:
    """Say what was measured of a long recording, and where the light was another one."""
    whole = trace.whole
    if whole is None:
        return trace
    excerpt = f"{trace.duration:.3g} s from its middle ({trace.start:.6g} s on)"
    message = (
        f"the recording is {_length(whole.duration)} long: all measures but Pst LM, and --window, look at {excerpt}; "
        "take another part with --start and --duration"
    )
    trace = trace.replace(note=Note("excerpt", "info", message))
    other = _other_light(trace, whole)
    return trace if other is None else trace.replace(note=other)


def _other_light(trace: Trace, whole: Whole) -> Note | None:
    """Compare level and swing of each part with those of the parts that the excerpt lies in."""
    starts = whole.first_part + whole.part * np.arange(whole.mean.size)
    inside = (starts + whole.part > trace.start) & (starts < trace.start + trace.duration)
    dark = trace.dark_level or 0.0
    level, swings = whole.mean - dark, whole.highest - whole.lowest
    usual_level, by_level = _off(level, inside, _LEVEL_MOVED)
    usual_swing, by_swing = _off(swings, inside, _SWING_MOVED)
    off = np.maximum(by_level if trace.mean_known else 0.0, by_swing)[:-1]  # the last part is shorter
    if not off.size or off.max() <= 1.0:
        return None
    worst = int(np.argmax(off))
    share = 100.0 * float(np.mean(off > 1.0))
    there = [f"swing {with_unit(swings[worst], trace)} instead of {with_unit(usual_swing, trace)}"]
    if trace.mean_known:
        there.insert(0, f"mean {with_unit(level[worst], trace)} instead of {with_unit(usual_level, trace)}")
    return Note(
        "excerpt-differs",
        "warning",
        f"the light was another one in {share:.2g} % of the recording than where it was measured, most of all at "
        f"{starts[worst]:.6g} s ({', '.join(there)}): measure there as well, with --start {starts[worst]:.6g} "
        f"--duration {trace.duration:.3g}",
    )


def _off(values: FloatArray, inside: npt.NDArray[np.bool_], allowed: float) -> tuple[float, FloatArray]:
    """
    Give the usual value of the parts inside, and how far each part is from it, in what is allowed.

    A share of the value is allowed, and as much as parts inside differ by: slow light is not alike in any two parts.
    """
    usual = float(np.median(values[inside]))
    tolerance = max(allowed * abs(usual), 2.0 * float(np.ptp(values[inside])), 1e-30)
    return usual, np.abs(values - usual) / tolerance


def _length(seconds: float) -> str:
    return f"{seconds / 60:.3g} min" if seconds >= 120 else f"{seconds:.3g} s"
