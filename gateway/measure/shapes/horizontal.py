"""Cylinders that lie, with ends of any form. Lengths in m.

The part between the tangent lines: V = L·(R²·acos((R - h)/R) - (R - h)·√(2Rh - h²)). What the two ends add: for an
ellipsoid and a cone in closed form, for torispherical ends by numbers, once, when the shape is made. Source: D. Jones,
Computing Fluid Tank Volumes, and solid geometry.
"""

import math
from bisect import bisect_right
from dataclasses import dataclass, field
from typing import Protocol

from gateway.measure.shapes.heads import Cone, Ellipsoid, Head, Torisphere
from gateway.measure.shapes.inverse import level_at


class _Ends(Protocol):
    """What both ends together add, for a level within the bore."""

    def volume(self, level: float) -> float: ...

    def area(self, level: float) -> float: ...


@dataclass(frozen=True, slots=True)
class Horizontal:
    """A cylinder that lies; `length` is between the tangent lines."""

    diameter: float
    length: float
    ends: _Ends | None = None

    @property
    def height(self) -> float:
        """The total height inside."""
        return self.diameter

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level` in m."""
        level, radius = min(max(level, 0.0), self.diameter), self.diameter / 2
        off = radius - level
        chord = math.sqrt(max(0.0, level * (self.diameter - level)))
        segment = radius * radius * math.acos(min(max(off / radius, -1.0), 1.0)) - off * chord
        volume = self.length * max(segment, 0.0)  # at a hair's breadth, rounding may make it less than nothing
        return volume if self.ends is None else volume + self.ends.volume(level)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        return level_at(self, volume)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level` in m."""
        level = min(max(level, 0.0), self.diameter)
        area = self.length * 2 * math.sqrt(max(0.0, level * (self.diameter - level)))
        return area if self.ends is None else area + self.ends.area(level)


@dataclass(frozen=True, slots=True)
class _EllipsoidEnds:
    """Both ends make an ellipsoid: a sphere's volume, stretched by depth / R."""

    radius: float
    depth: float

    def volume(self, level: float) -> float:
        return self.depth / self.radius * math.pi * level * level * (self.radius - level / 3)

    def area(self, level: float) -> float:
        return self.depth / self.radius * math.pi * level * (2 * self.radius - level)


@dataclass(frozen=True, slots=True)
class _ConeEnds:
    """V = (2·a·R²/3)·K for the lower half, K = acos M + M³·acosh(1/M) - 2M·√(1 - M²), M = |R - h|/R."""

    radius: float
    depth: float

    def volume(self, level: float) -> float:
        m = min(abs(self.radius - level) / self.radius, 1.0)
        k = math.acos(m) - 2 * m * math.sqrt(1 - m * m) + (m**3 * math.acosh(1 / m) if m > 0 else 0.0)
        scale = 2 * self.depth * self.radius**2 / 3
        return scale * k if level < self.radius else scale * (math.pi - k)

    def area(self, level: float) -> float:
        """Return the two hyperbolic slices: 2·(a/R)·(R·w - y²·acosh(R/|y|)), w half the chord, y from the middle."""
        y = abs(self.radius - level)
        w = math.sqrt(max(0.0, self.radius**2 - y * y))
        hollow = y * y * math.acosh(self.radius / y) if 0 < y < self.radius else 0.0
        return 2 * self.depth / self.radius * (self.radius * w - hollow)


STRETCHES = 512


@dataclass(frozen=True, slots=True)
class _TorisphereEnds:
    """A table over the angle θ, h = R·(1 - cos θ), with cubic pieces that keep value and slope at its points."""

    head: Torisphere
    _thetas: tuple[float, ...] = field(init=False)
    _volumes: tuple[float, ...] = field(init=False)
    _slopes: tuple[float, ...] = field(init=False)

    def __post_init__(self) -> None:
        thetas = [math.pi * k / STRETCHES for k in range(STRETCHES + 1)]
        slopes = [self._slope(theta) for theta in thetas]
        volumes = [0.0]
        for k in range(STRETCHES):
            step = thetas[k + 1] - thetas[k]
            inner = sum(w * self._slope(thetas[k] + step * x) for x, w in _GAUSS_3)
            volumes.append(volumes[-1] + step * inner)
        for name, values in (("_thetas", thetas), ("_volumes", volumes), ("_slopes", slopes)):
            object.__setattr__(self, name, tuple(values))

    def _slope(self, theta: float) -> float:
        radius = self.head.radius
        return self._slice(-radius * math.cos(theta)) * radius * math.sin(theta)

    def _slice(self, y: float) -> float:
        """Return the area of both ends at `y` above the middle: 4·∫ bulge(√(x² + y²)) dx, with x = w·sin φ.

        The dish and the knuckle are integrated apart, since the bulge has a corner in its curvature between them.
        """
        head = self.head
        half_chord = math.sqrt(max(0.0, head.radius**2 - y * y))
        joint = (
            head.dish * (head.radius - head.knuckle) / (head.dish - head.knuckle) if head.dish > head.knuckle else 0.0
        )
        corner = math.asin(min(1.0, math.sqrt(joint * joint - y * y) / half_chord)) if abs(y) < joint else 0.0
        total = 0.0
        for low, high in ((0.0, corner), (corner, math.pi / 2)):
            for x, w in _GAUSS if high > low else ():
                phi = low + (high - low) * x
                across = half_chord * math.sin(phi)
                total += (high - low) * w * head.bulge(math.hypot(across, y)) * half_chord * math.cos(phi)
        return 4 * total

    def volume(self, level: float) -> float:
        theta = math.acos(min(max(1 - level / self.head.radius, -1.0), 1.0))
        if theta != theta:  # noqa: PLR0124 - NaN is not itself
            return theta
        k = min(bisect_right(self._thetas, theta), STRETCHES) - 1
        step = self._thetas[k + 1] - self._thetas[k]
        s = (theta - self._thetas[k]) / step
        r = 1 - s
        return (
            self._volumes[k] * r * r * (1 + 2 * s)
            + self._volumes[k + 1] * s * s * (3 - 2 * s)
            + step * s * r * (self._slopes[k] * r - self._slopes[k + 1] * s)
        )

    def area(self, level: float) -> float:
        return self._slice(level - self.head.radius)


def _gauss(n: int) -> tuple[tuple[float, float], ...]:
    """Return points and weights of Gauss and Legendre on 0 to 1. Source: any text on numerical integration."""
    found = []
    for k in range(n):
        x = math.cos(math.pi * (k + 0.75) / (n + 0.5))
        for _ in range(100):
            p, before = x, 1.0
            for j in range(2, n + 1):
                p, before = ((2 * j - 1) * x * p - (j - 1) * before) / j, p
            slope = n * (x * p - before) / (x * x - 1)
            x -= p / slope
            if abs(p / slope) < 1e-16:
                break
        found.append(((1 - x) / 2, 1 / ((1 - x * x) * slope * slope)))
    return tuple(found)


_GAUSS, _GAUSS_3 = _gauss(32), _gauss(3)


def horizontal_cylinder(diameter: float, length: float, end: Head | None = None) -> Horizontal:
    """Return a cylinder that lies, with two ends alike; None for flat ones."""
    ends: _Ends | None
    match end:
        case None:
            ends = None
        case Cone(radius=radius, depth=depth):
            ends = _ConeEnds(radius, depth)
        case Ellipsoid(radius=radius, depth=depth):
            ends = _EllipsoidEnds(radius, depth)
        case Torisphere():
            ends = _TorisphereEnds(end)
        case _:
            raise ValueError("no such end is known")
    return Horizontal(diameter, length, ends)
