"""Figures drawn as SVG with real text: scales, axes, lines and marks in the page's own colours."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

import numpy as np

from flicker.markup import Markup, element, markup
from flicker.trace import FloatArray

WIDTH, HEIGHT = 460, 290
_LEFT, _RIGHT, _TOP, _BOTTOM = 58, 14, 14, 46
_TICKS = 5
SHAPES = {  # of about equal area around 0, 0
    "circle": "M-5 0a5 5 0 1 0 10 0a5 5 0 1 0-10 0z",
    "diamond": "M0-6.5L6.5 0L0 6.5L-6.5 0z",
    "triangle": "M0-6.5L6.2 4.8L-6.2 4.8z",
    "square": "M-4.6-4.6H4.6V4.6H-4.6z",
    "cross": "M-5-5L5 5M-5 5L5-5",
    "bar": "M0-6V6",
}


@dataclass(frozen=True, slots=True)
class Scale:
    """Values from `low` to `high` laid between two places of the drawing, evenly or by their logarithm."""

    low: float
    high: float
    start: float
    end: float
    logarithmic: bool = False

    def __call__(self, values: FloatArray | Sequence[float] | float) -> FloatArray:
        """Give the places of values; those outside the scale lie outside the drawing."""
        low, high, given = self.low, self.high, np.asarray(values, dtype=float)
        if self.logarithmic:
            low, high, given = math.log(low), math.log(high), np.log(np.maximum(given, 1e-300))
        return self.start + (given - low) / (high - low) * (self.end - self.start)

    def holds(self, value: float) -> bool:
        """Tell whether a value lies on the scale."""
        return self.low <= value <= self.high

    def ticks(self) -> list[float]:
        """Choose round values to be named."""
        return _decades(self.low, self.high) if self.logarithmic else _steps(self.low, self.high)


def _steps(low: float, high: float) -> list[float]:
    rough = (high - low) / _TICKS
    unit = 10.0 ** math.floor(math.log10(rough))
    step = next(unit * factor for factor in (1, 2, 5, 10) if unit * factor >= rough * 0.999)
    first = math.ceil(low / step - 1e-9)
    return [round(number * step, 12) for number in range(first, math.floor(high / step + 1e-9) + 1)]


def _decades(low: float, high: float) -> list[float]:
    span = math.log10(high / low)
    factors = (1, 2, 5) if span < 2.2 else (1,)
    every = max(1, round(span / 6))
    decades = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    values = [factor * 10.0**decade for decade in decades if decade % every == 0 for factor in factors]
    return [value for value in values if low * 0.999 <= value <= high * 1.001]


def plain(value: float) -> str:
    """Write a number of an axis as a number, thousands apart."""
    return f"{value:,.6g}".replace(",", "\N{NARROW NO-BREAK SPACE}").replace("-", "\N{MINUS SIGN}")


@dataclass
class Chart:
    """
    A pair of axes to draw into; the last thing drawn lies on top.

    `x` and `y` are (low, high) of the axes; `x_name` and `y_name` say what they show, with the unit.
    """

    x: tuple[float, float]
    y: tuple[float, float]
    x_name: str
    y_name: str
    logarithmic: tuple[bool, bool] = (False, False)
    right: int = _RIGHT
    _under: list[Markup] = field(default_factory=list)
    _over: list[Markup] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.across = Scale(*_apart(*self.x), _LEFT, WIDTH - self.right, self.logarithmic[0])
        self.up = Scale(*_apart(*self.y), HEIGHT - _BOTTOM, _TOP, self.logarithmic[1])

    @property
    def columns(self) -> int:
        """Places across: more points than two for each cannot be seen."""
        return WIDTH - _LEFT - self.right

    def line(self, x: FloatArray, y: FloatArray, kind: str) -> None:
        """Draw a line through points; `kind` is a class of the style sheet."""
        self._over.append(element("path", d=_path(self.across(x), self.up(y)), class_=f"line {kind}"))

    def area(self, x: FloatArray, low: FloatArray, high: FloatArray, kind: str) -> None:
        """Fill between two lines, cut off where the axes end."""
        self._over.append(element("path", d=self._outline(x, low, high), class_=f"area {kind}"))

    def ground(self, x: FloatArray, low: FloatArray, high: FloatArray, kind: str, pattern: str = "") -> None:
        """Fill between two lines under the grid, with a pattern over it where one is named."""
        path = self._outline(x, low, high)
        self._under.append(element("path", d=path, class_=f"area {kind}"))
        if pattern:
            self._under.append(element("path", d=path, fill=f"url(#{pattern})"))

    def _outline(self, x: FloatArray, low: FloatArray, high: FloatArray) -> str:
        across = self.across(x)
        low, high = (np.clip(self.up(edge), _TOP, HEIGHT - _BOTTOM) for edge in (low, high))
        return f"{_path(np.append(across, across[::-1]), np.append(low, high[::-1]))}Z"

    def marks(self, points: Iterable[tuple[float, float, str]], shape: str, kind: str) -> None:
        """Set marks at (x, y), each with what it says; those beyond the axes are left out."""
        for x, y, says in points:
            if not (self.across.holds(x) and self.up.holds(y)):
                continue
            self._over.append(
                element(
                    "g",
                    element("title", says),
                    element("path", d=SHAPES[shape]),
                    class_=f"mark {kind}",
                    transform=f"translate({self.across(x):.1f} {self.up(y):.1f})",
                )
            )

    def needles(self, points: Iterable[tuple[float, float, float]], kind: str) -> None:
        """Draw upright lines, each at x from one value to another."""
        parts = [
            f"M{self.across(x):.1f} {self.up(low):.1f}V{self.up(high):.1f}" for x, low, high in points
        ]  # fmt: skip
        self._over.append(element("path", d="".join(parts), class_=f"line {kind}"))

    def level(self, y: float, words: str, kind: str) -> None:
        """Draw a line across at one value and name it."""
        place = float(self.up(y))
        self._over.append(element("path", d=f"M{_LEFT} {place:.1f}H{WIDTH - self.right}", class_=f"line {kind}"))
        above = place > HEIGHT - _BOTTOM - 20
        self._write(WIDTH - self.right - 3, place + (-5 if above else 13), words, "end", kind)

    def upright(self, x: float, words: str, kind: str) -> None:
        """Draw an upright line at one value and name it at the top."""
        place = float(self.across(x))
        self._over.append(element("path", d=f"M{place:.1f} {_TOP}V{HEIGHT - _BOTTOM}", class_=f"line {kind}"))
        end = place > (WIDTH + _LEFT) / 2
        self._write(place + (-4 if end else 4), _TOP + 11, words, "end" if end else "start", kind)

    def name(
        self, x: float, y: float, words: str, *, anchor: str = "middle", kind: str = "", lift: float = 0.0
    ) -> None:
        """Write words at a place, lifted by some units; they never run out of the drawing."""
        half = 3.6 * len(words) if anchor == "middle" else 0.0
        place = min(max(float(self.across(x)), _LEFT + half), WIDTH - self.right - half)
        height = max(float(self.up(y)) - lift, _TOP + 25)
        self._write(place, height, words, anchor, kind)

    def along(self, x: float, y: float, words: str, kind: str) -> None:
        """Write words at a place of a drawing with two logarithmic axes, along the line of direct proportion."""
        run, rise = self.across(10 * x) - self.across(x), self.up(10 * y) - self.up(y)
        turn = f"translate({self.across(x):.1f} {self.up(y):.1f}) rotate({math.degrees(math.atan2(rise, run)):.1f})"
        self._over.append(element("text", words, transform=turn, dy="4", text_anchor="middle", class_=f"name {kind}"))

    def _write(self, x: float, y: float, words: str, anchor: str, kind: str) -> None:
        self._over.append(
            element("text", words, x=f"{x:.1f}", y=f"{y:.1f}", text_anchor=anchor, class_=f"name {kind}".strip())
        )

    def figure(self, caption: str, told: str) -> Markup:
        """Give the figure with its caption; `told` says in words what is to be seen."""
        return figure(self._drawn(), caption, told)

    def _drawn(self) -> Markup:
        bottom, right = HEIGHT - _BOTTOM, WIDTH - self.right
        grid, words = [], []
        for value in self.across.ticks():
            place = float(self.across(value))
            grid.append(f"M{place:.1f} {_TOP}V{bottom}")
            words.append(element("text", plain(value), x=f"{place:.1f}", y=bottom + 16, text_anchor="middle"))
        for value in self.up.ticks():
            place = float(self.up(value))
            grid.append(f"M{_LEFT} {place:.1f}H{right}")
            words.append(element("text", plain(value), x=_LEFT - 6, y=f"{place + 4:.1f}", text_anchor="end"))
        middle = (_TOP + bottom) / 2
        words.append(element("text", self.x_name, x=(_LEFT + right) / 2, y=HEIGHT - 8, text_anchor="middle"))
        words.append(
            element("text", self.y_name, transform=f"translate(12 {middle}) rotate(-90)", text_anchor="middle")
        )
        return markup(
            *self._under,
            element("path", d="".join(grid), class_="grid"),
            element("path", d=f"M{_LEFT} {_TOP}V{bottom}H{right}", class_="axis"),
            element("g", *words, class_="scale"),
            *self._over,
        )


def figure(drawn: Markup, caption: str, told: str, *, size: tuple[int, int] = (WIDTH, HEIGHT)) -> Markup:
    """Put a drawing into a figure: with a caption, and with words for those who cannot see it."""
    picture = element("svg", element("desc", told), drawn, viewBox=f"0 0 {size[0]} {size[1]}", role="img",
                      aria_label=f"{caption}. {told}")  # fmt: skip
    says = element("output", "\N{NO-BREAK SPACE}", aria_live="polite") if "<title>" in drawn else None
    return element("figure", picture, element("figcaption", caption), says)


def extent(x: FloatArray, y: FloatArray, columns: int) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Give place, smallest and largest of each of `columns` even pieces, so that nothing that shows is lost."""
    starts = np.linspace(0, y.size, columns, endpoint=False).astype(int)
    return x[starts], np.minimum.reduceat(y, starts), np.maximum.reduceat(y, starts)


def _path(x: FloatArray, y: FloatArray) -> str:
    return "M" + "L".join(f"{across:.1f} {up:.1f}" for across, up in zip(x.tolist(), y.tolist(), strict=True))


def _apart(low: float, high: float) -> tuple[float, float]:
    """Keep the ends of an axis apart where all values are the same."""
    return (low, high) if high > low else (low - (abs(low) or 1.0) / 2, low + (abs(low) or 1.0) / 2)
