"""The level of a cycle at an extreme: plateau, slope, corner or rounded top, read over as wide a window as may be."""

from __future__ import annotations

import dataclasses
import itertools
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from flicker.signal.cycle import Cycle
from flicker.trace import FloatArray

_CONTRADICTION = 2.0  # standard errors by which a wide window may differ from a narrower one
_CORNER = 2.5  # a corner is preferred up to so many times the smallest error, for it bends least
_MISFIT = 3.7  # standard deviations by which a curve may miss the points more than noise does: one window in 10^4
_STEPS_BACK = 2  # from the widest window that is not contradicted, whose bias is of the size of its error
_WIDEST = 0.5  # of a window on one side [cycles]
_GROWTH = 1.25  # from one window to the next
_SPLITS = 64  # places tried for a corner, about
_FALSE = 0.15  # of the swing: a reading that lies further from what the bins say is none of the extreme
_GUARDS = (0.0, 0.5, 2.0)  # bins left out about the split, where nearer points fit on neither side
_SURE = 4.0  # standard errors by which a level is trusted less when the most extreme one is sought
_ALIKE = 2.5  # standard errors by which two readings of one level may differ
_REACH = 1.5  # bins to either side within which a corner is sought
# shape, degree of the curves that choose the width, and degree of those that read, whose bias is then small
_WAYS = (
    ("left", 0, 1),
    ("right", 0, 1),
    ("about", 0, 2),
    ("left", 1, 2),
    ("right", 1, 2),
    ("corner", 1, 2),
    ("about", 2, 4),
    ("corner", 2, 2),
    ("left", 2, 2),
    ("right", 2, 2),
)
_CROSSING = 0.25  # of the window, how far from the split two curves may cross


@dataclass(frozen=True, slots=True)
class Manner:
    """How a level is to be read: around which phase, over how wide a window, by which curves."""

    phase: float  # from the centre of the first bin; where left and right part [cycles]
    width: float  # to either side [cycles]
    shape: str  # left, right, about, corner
    degree: int  # of the curves
    guard: float = 0.0  # nearest place to the phase that is known to lie on the side that is read [cycles]
    plain: Manner | None = None  # to be taken where this one leads out of the bounds
    bounds: tuple[float, float] = (-np.inf, np.inf)  # of a level that can be the extreme

    @property
    def sides(self) -> tuple[int, ...]:
        """-1 for a curve over what comes before the phase, 1 for what comes after, 0 for one over both."""
        return {"left": (-1,), "right": (1,), "about": (0,), "corner": (-1, 1)}[self.shape]


@dataclass(frozen=True, slots=True, eq=False)
class Reading:
    """
    A level, its variance for unit white noise, what each group of cycles adds to its deviation, shape (groups,), and
    how far curves of a lower degree read otherwise.
    """

    level: float
    variance: float
    scores: FloatArray
    doubt: float = 0.0


@dataclass(frozen=True, slots=True, eq=False)
class _Points:
    """Fine bins about a phase that hold samples: offsets from it [cycles], shape (b,), counts and sums by group."""

    offsets: FloatArray
    group_counts: FloatArray  # shape (groups, b)
    group_sums: FloatArray  # shape (groups, b)

    @classmethod
    def about(cls, cycle: Cycle, phase: float, width: float) -> _Points:
        size = cycle.fine_sums.shape[1]
        middle = (phase + 0.5 / cycle.size) * size - 0.5  # both kinds of bins are counted by their centres
        first, last = int(np.ceil(middle - width * size)), int(np.floor(middle + width * size))
        last = min(last, first + size - 1)
        bins = np.arange(first, last + 1)
        bins = bins[cycle.fine_counts[:, bins % size].sum(axis=0) > 0]
        places = bins % size
        return cls((bins - middle) / size, cycle.fine_counts[:, places], cycle.fine_sums[:, places])

    def side(self, side: int) -> _Points:
        """What comes before (-1), after (1) or both (0)."""
        return self._part(self.offsets * side >= 0) if side else self

    def beyond(self, guard: float) -> _Points:
        """What lies no nearer than a distance [cycles]."""
        return self._part(np.abs(self.offsets) >= guard)

    def _part(self, kept: npt.NDArray[np.bool_]) -> _Points:
        return _Points(self.offsets[kept], self.group_counts[:, kept], self.group_sums[:, kept])


def _moments(points: _Points, degree: int, order: npt.NDArray[np.intp]) -> tuple[FloatArray, FloatArray, FloatArray]:
    """
    Running sums in an order: of counts and of readings times powers of the offset, and of squares.

    Shapes (b + 1, 2 d + 1), (b + 1, d + 1), (b + 1,).
    """
    powers = np.vander(points.offsets[order], 2 * degree + 1, increasing=True)
    counts, sums = points.group_counts.sum(axis=0)[order], points.group_sums.sum(axis=0)[order]
    columns = [powers * counts[:, None], powers[:, : degree + 1] * sums[:, None], (sums**2 / counts)[:, None]]
    running = [np.vstack([np.zeros((1, part.shape[1])), np.cumsum(part, axis=0)]) for part in columns]
    return running[0], running[1], running[2][:, 0]


def _solve(moments: FloatArray, right: FloatArray, widths: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Coefficients of polynomials, shape (w, d + 1), and their covariance for unit noise, shape (w, d + 1, d + 1)."""
    degree = right.shape[1] - 1
    number = np.arange(degree + 1)
    scale = widths[:, None] ** number
    normal = moments[:, number[:, None] + number] / (scale[:, :, None] * scale[:, None, :])
    ridge = (1e-12 * np.trace(normal, axis1=1, axis2=2) + 1e-9)[:, None, None] * np.eye(degree + 1)
    inverse = np.linalg.inv(normal + ridge) / (scale[:, :, None] * scale[:, None, :])
    return np.einsum("wij,wj->wi", inverse, right), inverse


@dataclass(frozen=True, slots=True, eq=False)
class _Ladder:
    """One way of reading at every width: levels and their standard errors for unit noise, shape (w,); nan for none."""

    shape: str
    degree: int
    levels: FloatArray
    errors: FloatArray
    misfits: FloatArray  # weighted sum of squares that the curves leave
    freedoms: FloatArray
    places: FloatArray  # where two curves cross [cycles]


def _ladders(points: _Points, widths: FloatArray, degrees: tuple[int, ...]) -> list[_Ladder]:
    """Read left, right and about the split by polynomials of each degree, and where the two sides cross."""
    ladders: list[_Ladder] = []
    sides: dict[tuple[int, int], _Side] = {}
    for side, shape in ((-1, "left"), (1, "right"), (0, "about")):
        part = points.side(side)
        order = np.argsort(np.abs(part.offsets), kind="stable")
        inside = np.searchsorted(np.abs(part.offsets)[order], widths, side="right")
        for degree in degrees:
            counts, sums, squares = (one[inside] for one in _moments(part, degree, order))
            enough = inside >= 2 * degree + 2
            solved, covariance = _solve(counts, sums, widths)
            levels = np.where(enough, solved[:, 0], np.nan)
            errors = np.where(enough, np.sqrt(np.maximum(covariance[:, 0, 0], 0.0)), np.nan)
            misfits = squares - np.einsum("wi,wi->w", solved, sums)
            freedoms = np.asarray(inside - (degree + 1), dtype=np.float64)
            ladders.append(_Ladder(shape, degree, levels, errors, misfits, freedoms, np.zeros(widths.size)))
            sides[side, degree] = solved, covariance, ladders[-1]
    return ladders + [_crossing(sides[-1, degree], sides[1, degree], widths) for degree in degrees if degree]


_Side = tuple[FloatArray, FloatArray, _Ladder]  # coefficients, their covariance, and the readings on one side


def _crossing(left: _Side, right: _Side, widths: FloatArray) -> _Ladder:
    (a, cov_a, of_a), (b, cov_b, of_b) = left, right
    degree = a.shape[1] - 1
    place = np.zeros(widths.size)
    powers = np.arange(degree + 1)
    with np.errstate(all="ignore"):
        for _ in range(4):
            value = np.sum((a - b) * place[:, None] ** powers, axis=1)
            slope = np.sum(((a - b) * powers)[:, 1:] * place[:, None] ** powers[:-1], axis=1)
            place = np.clip(place - value / slope, -widths, widths)
        rows = place[:, None] ** powers
        value = np.sum((a - b) * rows, axis=1)
        slopes = [np.sum((one * powers)[:, 1:] * place[:, None] ** powers[:-1], axis=1) for one in (a, b)]
        share = slopes[0] / (slopes[0] - slopes[1])
        spreads = [np.einsum("wi,wij,wj->w", rows, cov, rows) for cov in (cov_a, cov_b)]
        errors = np.sqrt((1 - share) ** 2 * spreads[0] + share**2 * spreads[1])
    good = np.isfinite(of_a.errors + of_b.errors + errors) & (np.abs(place) <= _CROSSING * widths)
    levels = np.where(good, np.sum(a * rows, axis=1), np.nan)
    misfits, freedoms = of_a.misfits + of_b.misfits, of_a.freedoms + of_b.freedoms
    return _Ladder("corner", degree, levels, np.where(good, errors, np.nan), misfits, freedoms, place)


def _widest(ladder: _Ladder, noise: float) -> int:
    """Index of the widest window that no narrower one contradicts, some steps back; -1 for none."""
    below, above, reached, first = -np.inf, np.inf, -1, None
    freedoms = np.maximum(ladder.freedoms, 1.0)  # quantile of chi-squared after Wilson and Hilferty 1931
    bounds = noise**2 * freedoms * (1 - 2 / (9 * freedoms) + _MISFIT * np.sqrt(2 / (9 * freedoms))) ** 3
    for step in np.flatnonzero(np.isfinite(ladder.errors)).tolist():
        level, doubt = float(ladder.levels[step]), _CONTRADICTION * noise * float(ladder.errors[step])
        below, above = max(below, level - doubt), min(above, level + doubt)
        if below > above or ladder.misfits[step] > bounds[step]:
            break
        first = step if first is None else first
        reached = step
    return -1 if first is None else max(reached - _STEPS_BACK, first)


def find_manner(cycle: Cycle, phase: float, noise: float, sign: float, blur: float) -> Manner:
    """
    Choose how to read an extreme near a phase.

    Parameters
    ----------
    cycle : Cycle
        Some of the cycles; others are to be read.
    phase : float
        Near the extreme, from the centre of the first bin. [cycles]
    noise : float
        Standard deviation of single samples.
    sign : float
        1 for a largest level, -1 for a smallest.
    blur : float
        Phase by which the cycles may be shifted against each other. [cycles]

    Returns
    -------
    Manner

    Notes
    -----
    For each shape the widest window is sought that no narrower one contradicts (intersection of confidence intervals;
    Goldenshluger and Nemirovski, Math. Methods Statist. 6 (1997) 135) and whose curve misses the points by no more than
    noise. The level is then read over that window by curves of a higher degree, whose bias is small beside its error
    (after Calonico, Cattaneo and Titiunik, Econometrica 82 (2014) 2295, for regressions that end at a jump). The shape
    with the smallest error wins, a corner before others.
    """
    plain = Manner(phase, 0.75 / cycle.size, "about", 0)
    split = _split(cycle, phase)
    points = _Points.about(cycle, split, _WIDEST)
    about, reach = float(cycle.levels[round(phase * cycle.size) % cycle.size]), _FALSE * float(np.ptp(cycle.levels))
    for guard in _GUARDS:
        candidates = _candidates(points.beyond(blur + guard / cycle.size), split, noise, blur)
        candidates = [one for one in candidates if abs(one.level - about) <= reach]
        if candidates:
            return dataclasses.replace(_best(candidates, sign), plain=plain, bounds=(about - reach, about + reach))
    return plain


@dataclass(frozen=True, slots=True)
class _Candidate:
    """One manner of reading, and the level that it gives on the cycles that choose."""

    level: float
    error: float
    manner: Manner


def _candidates(points: _Points, split: float, noise: float, blur: float) -> list[_Candidate]:
    """Every shape over the widest window that its points allow."""
    widths = _WIDEST * _GROWTH ** -np.arange(30.0)[::-1]
    ladders = {(one.shape, one.degree): one for one in _ladders(points, widths, (0, 1, 2, 4))}
    guards = {shape: _nearest(points.side(side)) + blur for shape, side in (("left", -1), ("right", 1))}
    found = []
    for shape, degree, higher in _WAYS:
        step, better = _widest(ladders[shape, degree], noise), ladders[shape, higher]
        if step >= 0 and np.isfinite(better.errors[step]):
            phase = split + float(ladders[shape, degree].places[step])
            manner = Manner(phase, float(widths[step]), shape, higher, guards.get(shape, 0.0))
            found.append(_Candidate(float(better.levels[step]), noise * float(better.errors[step]), manner))
    return found


def _nearest(points: _Points) -> float:
    return float(np.abs(points.offsets).min()) if points.offsets.size else 0.0


def _best(candidates: list[_Candidate], sign: float) -> Manner:
    """
    Choose the candidate with the smallest error among those that agree with the most extreme one.

    Where the two sides meet in a corner, what one side alone says does not count, for its slope would be drawn on
    beyond the corner; and the corner is preferred, for it bends least.
    """
    cornered = any(one.manner.shape == "corner" for one in candidates)
    trusted = [one for one in candidates if not cornered or one.manner.shape in ("corner", "about")]
    top = max(trusted, key=lambda one: sign * one.level - _SURE * one.error)
    alike = [one for one in candidates if abs(one.level - top.level) <= _ALIKE * np.hypot(one.error, top.error)]
    least = min(one.error for one in alike)
    corners = [one for one in alike if one.manner.shape == "corner" and one.error <= _CORNER * least]
    return min(corners or alike, key=lambda one: one.error).manner


def _split(cycle: Cycle, phase: float) -> float:
    """Phase near another at which two curves that part there describe the cycle best. [cycles]"""
    reach = _REACH / cycle.size
    width = 4 * reach
    points = _Points.about(cycle, phase, width)
    counts, sums, _ = _moments(points, 2, np.arange(points.offsets.size))
    near = np.flatnonzero(np.abs(points.offsets) <= reach)
    between = near[:: max(near.size // _SPLITS, 1)]
    if between.size == 0:
        return phase
    cuts = [np.zeros_like(between), between, np.full_like(between, len(counts) - 1)]
    explained = np.zeros(between.size)
    for first, last in itertools.pairwise(cuts):
        right = sums[last] - sums[first]
        solved, _ = _solve(counts[last] - counts[first], right, np.full(between.size, width))
        explained += np.einsum("wi,wi->w", solved, right)
    cut = int(between[int(np.argmax(explained))])
    place = phase + float(points.offsets[max(cut - 1, 0) : cut + 1].mean())
    (corner,) = _ladders(_Points.about(cycle, place, width), np.array([width]), (2,))[3:]
    return place + float(corner.places[0]) if np.isfinite(corner.errors[0]) else place


def read(cycle: Cycle, manner: Manner) -> Reading:
    """Read a level of a cycle in a given manner."""
    reading = _read(cycle, manner)
    if manner.plain is not None and not manner.bounds[0] <= reading.level <= manner.bounds[1]:
        return _read(cycle, manner.plain)  # these cycles hold too few points
    if manner.degree < 2:
        return reading
    lower = _read(cycle, dataclasses.replace(manner, degree=manner.degree - 1))
    return dataclasses.replace(reading, doubt=abs(reading.level - lower.level))


def _read(cycle: Cycle, manner: Manner) -> Reading:
    points = _Points.about(cycle, manner.phase, max(manner.width, 2.0 * manner.guard)).beyond(manner.guard)
    curves = [_Curve(points.side(side), manner.degree, manner.width) for side in manner.sides]
    if len(curves) == 1:
        return curves[0].reading(0.0)
    left, right = curves
    place, reach = 0.0, _CROSSING * manner.width
    for _ in range(4):
        slope = left.slope(place) - right.slope(place)
        step = (left.at(place) - right.at(place)) / slope if slope else 0.0
        place = float(np.clip(place - step, -reach, reach))
    rise, fall = left.slope(place), right.slope(place)
    share = float(np.clip(rise / (rise - fall), 0.0, 1.0)) if rise != fall else 0.5
    one, other = left.reading(place), right.reading(place)
    return Reading(
        (1 - share) * one.level + share * other.level,
        (1 - share) ** 2 * one.variance + share**2 * other.variance,
        (1 - share) * one.scores + share * other.scores,
    )


class _Curve:
    """Weighted least-squares polynomial through points."""

    def __init__(self, points: _Points, degree: int, scale: float) -> None:
        degree = max(0, min(degree, points.offsets.size // 2 - 1))
        self._points, self._scale = points, scale
        powers = np.vander(points.offsets / scale, degree + 1, increasing=True)
        counts = points.group_counts.sum(axis=0)
        self._solver = np.linalg.pinv(powers.T @ (powers * counts[:, None])) @ powers.T  # times sums
        self._coefficients = self._solver @ points.group_sums.sum(axis=0)
        self._fitted = powers @ self._coefficients

    def at(self, place: float) -> float:
        """Value at an offset [cycles]."""
        return float(np.polynomial.polynomial.polyval(place / self._scale, self._coefficients))

    def slope(self, place: float) -> float:
        """Slope at an offset, per cycle."""
        change = np.polynomial.polynomial.polyder(self._coefficients)
        return float(np.polynomial.polynomial.polyval(place / self._scale, change)) / self._scale

    def reading(self, place: float) -> Reading:
        """Read the value at an offset [cycles]."""
        weights = np.power(place / self._scale, np.arange(self._coefficients.size)) @ self._solver
        left = self._points.group_sums - self._points.group_counts * self._fitted
        variance = float(np.sum(self._points.group_counts.sum(axis=0) * weights**2))
        return Reading(self.at(place), variance, np.asarray(left @ weights))
