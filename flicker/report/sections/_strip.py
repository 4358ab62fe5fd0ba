"""The light itself as a strip: as a lamp would paint it on a film drawn past it."""

from __future__ import annotations

import numpy as np

from flicker.markup import Markup, element, markup
from flicker.trace import FloatArray

_CYCLES = 4  # few, for fine stripes are unpleasant to look at
_STEPS = 240
_GREYS = 25  # that are told apart


def light_strip(levels: FloatArray, told: str) -> Markup:
    """
    Draw some cycles of a light as a strip, bright where the light is bright.

    Parameters
    ----------
    levels : array, shape (n,)
        One cycle of light above dark; the largest is drawn as full light.
    told : str
        What is to be seen, in words.

    Returns
    -------
    Markup
        An SVG that fills the width.
    """
    place = (np.arange(_STEPS) + 0.5) / _STEPS * _CYCLES % 1.0
    shown = np.clip(levels[(place * levels.size).astype(int)] / max(float(levels.max()), 1e-300), 0.0, 1.0)
    # neighbours that look alike are one piece
    grey = (np.round(shown ** (1 / 2.2) * _GREYS) * 100 / _GREYS).astype(int)
    starts = np.flatnonzero(np.diff(grey, prepend=-1))
    ends = np.append(starts[1:], _STEPS)
    pieces = [
        element("rect", x=start, y=0, width=end - start, height=10, fill=f"hsl(45 {40 if level > 4 else 0}% {level}%)")
        for start, end, level in zip(starts.tolist(), ends.tolist(), grey[starts].tolist(), strict=True)
    ]
    return element("svg", element("title", told), markup(*pieces), class_="strip", viewBox=f"0 0 {_STEPS} 10",
                   preserveAspectRatio="none", shape_rendering="crispEdges", role="img", aria_label=told)  # fmt: skip
