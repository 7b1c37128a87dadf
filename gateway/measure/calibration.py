"""Calibration: from points (x, level) to a monotone curve, in the quantity in which the method is linear.

Three ways: the straight line through two points; the straight line of least squares; a smooth curve through all points
(PCHIP). Beyond the outermost points the curve goes on straight. Each can be turned around, for the simulator.
"""

import math
from bisect import bisect_right
from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Protocol

from rules.model import Bounds

Points = Sequence[tuple[float, float]]


class Curve(Protocol):
    """A monotone curve. `x` in SI units of the method's linear quantity, levels in m."""

    def level(self, x: float) -> float:
        """Return the level at `x`."""

    def x(self, level: float) -> float:
        """Return the x at `level`; the inverse of `level`."""


@dataclass(frozen=True, slots=True)
class Line:
    """level = level_0 + slope · (x - x_0), through two points (x, level). `x` in SI units, levels in m.

    Raises ValueError when the two points have the same x or the same level.
    """

    x_0: float
    level_0: float
    x_1: float
    level_1: float

    def __post_init__(self) -> None:
        if self.x_0 == self.x_1 or self.level_0 == self.level_1:
            raise ValueError("the two points of a calibration must differ, in raw value and in level")

    def level(self, x: float) -> float:
        """Return the level at `x`."""
        return self.level_0 + (x - self.x_0) * ((self.level_1 - self.level_0) / (self.x_1 - self.x_0))

    def x(self, level: float) -> float:
        """Return the x at `level`; the inverse of `level`."""
        return self.x_0 + (level - self.level_0) * ((self.x_1 - self.x_0) / (self.level_1 - self.level_0))


@dataclass(frozen=True, slots=True)
class Smooth:
    """A piecewise cubic through all points that is monotone where they are (PCHIP).

    Source: F. N. Fritsch and J. Butland, A method for constructing local monotone piecewise cubic interpolants, SIAM J.
    Sci. Stat. Comput. 5, 1984: slopes are weighted harmonic means of the slopes beside them; at the ends a three-point
    formula, held back to keep the shape.
    """

    xs: tuple[float, ...]
    levels: tuple[float, ...]
    slopes: tuple[float, ...] = field(default=())

    def level(self, x: float) -> float:
        """Return the level at `x`."""
        xs, levels, slopes = self.xs, self.levels, self.slopes
        if x <= xs[0]:
            return levels[0] + slopes[0] * (x - xs[0])
        if x >= xs[-1]:
            return levels[-1] + slopes[-1] * (x - xs[-1])
        k = bisect_right(xs, x) - 1
        width = xs[k + 1] - xs[k]
        s = (x - xs[k]) / width
        r = 1.0 - s
        return (
            levels[k] * r * r * (1 + 2 * s)
            + levels[k + 1] * s * s * (3 - 2 * s)
            + width * s * r * (slopes[k] * r - slopes[k + 1] * s)
        )

    def x(self, level: float) -> float:
        """Return the x at `level`; the inverse of `level`, by halving."""
        xs, levels, slopes = self.xs, self.levels, self.slopes
        rising = 1.0 if levels[-1] > levels[0] else -1.0
        for end in (0, -1):
            outside = (level - levels[end]) * rising * (-1.0 if end == 0 else 1.0)
            if outside >= 0:
                return xs[end] if outside == 0 or slopes[end] == 0 else xs[end] + (level - levels[end]) / slopes[end]
        low, high = xs[0], xs[-1]
        while low < (middle := (low + high) / 2) < high:
            if (self.level(middle) - level) * rising < 0:
                low = middle
            else:
                high = middle
        return high


def through(points: Points) -> Curve:
    """Return the line through two points, or the smooth curve through more. Raises ValueError with a sentence."""
    ordered = _ordered(points)
    if len(ordered) == 2:
        return Line(*ordered[0], *ordered[1])
    xs, levels = zip(*ordered, strict=True)
    return Smooth(xs, levels, tuple(_pchip_slopes(xs, levels)))


def _ordered(points: Points) -> list[tuple[float, float]]:
    """Return the points in the order of x; raise ValueError where levels do not all rise, or all fall, with it."""
    if len(points) < 2:
        raise ValueError("a calibration needs two points or more")
    ordered = sorted(points)
    rising = ordered[-1][1] > ordered[0][1]
    for (x_0, level_0), (x_1, level_1) in pairwise(ordered):
        if x_0 == x_1 or level_0 == level_1:
            raise ValueError("the points of a calibration must differ, in raw value and in level")
        if (level_1 > level_0) != rising:
            odd = level_1 if rising else level_0
            raise ValueError(f"the points of a calibration rise and fall: the one at {odd:g} m is out of order")
    return ordered


def _pchip_slopes(xs: Sequence[float], levels: Sequence[float]) -> list[float]:
    widths = [b - a for a, b in pairwise(xs)]
    secants = [(b - a) / width for (a, b), width in zip(pairwise(levels), widths, strict=True)]
    inner = [
        (w_0 + w_1) / (w_0 / d_0 + w_1 / d_1)
        for w_0, w_1, d_0, d_1 in (
            (2 * h_1 + h_0, h_1 + 2 * h_0, d_0, d_1)
            for (h_0, h_1), (d_0, d_1) in zip(pairwise(widths), pairwise(secants), strict=True)
        )
    ]
    return [_end_slope(widths[:2], secants[:2]), *inner, _end_slope(widths[:-3:-1], secants[:-3:-1])]


def _end_slope(widths: Sequence[float], secants: Sequence[float]) -> float:
    """Return the slope at an end, from the two stretches next to it, nearest first; never against their direction."""
    (h_0, h_1), (d_0, d_1) = widths, secants
    slope = ((2 * h_0 + h_1) * d_0 - h_0 * d_1) / (h_0 + h_1)
    return slope if slope * d_0 > 0 else 0.0


@dataclass(frozen=True, slots=True)
class Fitted:
    """The straight line of least squares, with how well the points keep to it. Source: ordinary least squares."""

    line: Line
    residuals: tuple[float, ...]  # m, in the order of the points given
    error: float  # m, the standard error of one point about the line; NaN for two points
    mean_x: float
    spread: float  # Σ(x - x̄)²

    def level(self, x: float) -> float:
        """Return the level at `x`."""
        return self.line.level(x)

    def x(self, level: float) -> float:
        """Return the x at `level`."""
        return self.line.x(level)

    def error_at(self, level: float) -> float:
        """Return the standard error in m of the line at `level`: s · √(1/n + (x - x̄)²/Σ(x - x̄)²)."""
        n = len(self.residuals)
        return self.error * math.sqrt(1 / n + (self.line.x(level) - self.mean_x) ** 2 / self.spread)


def least_squares(points: Points) -> Fitted:
    """Return the line of least squares; raise ValueError, with a sentence, when the points give none."""
    ordered = _ordered(points)
    n = len(ordered)
    mean_x, mean_y = (math.fsum(values) / n for values in zip(*ordered, strict=True))
    spread = math.fsum((x - mean_x) ** 2 for x, _ in ordered)
    slope = math.fsum((x - mean_x) * (y - mean_y) for x, y in ordered) / spread
    first, last = ordered[0][0], ordered[-1][0]
    line = Line(first, mean_y + slope * (first - mean_x), last, mean_y + slope * (last - mean_x))
    residuals = tuple(y - line.level(x) for x, y in points)
    error = math.sqrt(math.fsum(r * r for r in residuals) / (n - 2)) if n > 2 else math.nan
    return Fitted(line, residuals, error, mean_x, spread)


@dataclass(frozen=True, slots=True)
class Covered:
    """A probe that sees only part of the tank: at its ends a level is known to be at most, or at least, the end."""

    low: float
    high: float

    def of(self, level: float) -> float | Bounds:
        """Return what is known when the curve says `level`."""
        if level <= self.low:
            return Bounds(-math.inf, self.low)
        return Bounds(self.high, math.inf) if level >= self.high else level
