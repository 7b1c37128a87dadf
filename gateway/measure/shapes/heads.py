"""Heads of vessels standing upright: solids of revolution from a lowest point to the full bore. Lengths in m.

Sources: cone, ellipsoid, spherical cap and torus from solid geometry; the forms and their names as D. Jones, Computing
Fluid Tank Volumes, uses them: `dish` and `knuckle` are radii as parts of the diameter.
"""

import math
from dataclasses import dataclass
from typing import Protocol


class Head(Protocol):
    """A head that widens from 0 at its lowest point to the full bore at `depth`; levels are within it."""

    @property
    def depth(self) -> float:
        """From the lowest point to the tangent line."""

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""


@dataclass(frozen=True, slots=True)
class Cone:
    """r = R · h/a; V = π·R²·h³/(3·a²)."""

    radius: float
    depth: float

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""
        return math.pi * self.radius**2 * level**3 / (3 * self.depth**2)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""
        return math.pi * (self.radius * level / self.depth) ** 2


@dataclass(frozen=True, slots=True)
class Ellipsoid:
    """r² = R²·(2h/a - h²/a²); V = π·(R·h/a)²·(a - h/3). A hemisphere has a = R."""

    radius: float
    depth: float

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""
        return math.pi * (self.radius * level / self.depth) ** 2 * (self.depth - level / 3)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""
        part = level / self.depth
        return math.pi * self.radius**2 * part * (2 - part)


@dataclass(frozen=True, slots=True)
class Torisphere:
    """A spherical dish with a torus for a knuckle. `dish` and `knuckle` are their radii in m.

    Dish: r² = 2·dish·h - h². Knuckle, at u below the tangent line: r = c + √(knuckle² - u²), c = R - knuckle. The two
    meet where the angle from the axis is asin(c / (dish - knuckle)). Raises ValueError for what is no such head.
    """

    radius: float
    dish: float
    knuckle: float

    def __post_init__(self) -> None:
        if not 0 < self.knuckle <= self.radius <= self.dish:
            raise ValueError("a torispherical head has knuckle radius ≤ half the diameter ≤ dish radius, all above 0")

    @property
    def _cosine(self) -> float:
        if self.dish == self.knuckle:
            return 0.0  # a hemisphere: all of it is knuckle
        sine = (self.radius - self.knuckle) / (self.dish - self.knuckle)
        return math.sqrt(1 - sine * sine)

    @property
    def depth(self) -> float:
        """From the lowest point to the tangent line."""
        return self.junction + self.knuckle * self._cosine if self.dish > self.knuckle else self.knuckle

    @property
    def junction(self) -> float:
        """The level at which dish and knuckle meet."""
        return self.dish * (1 - self._cosine) if self.dish > self.knuckle else 0.0

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""
        joint = self.junction
        in_dish = min(level, joint)
        volume = math.pi * in_dish**2 * (self.dish - in_dish / 3)
        if level > joint:
            volume += self._torus(self.depth - joint) - self._torus(self.depth - level)
        return volume

    def _torus(self, u: float) -> float:
        """Return ∫π·(c + √(k² - u²))² du from 0 to `u`."""
        c, k = self.radius - self.knuckle, self.knuckle
        u = min(u, k)
        root = math.sqrt(k * k - u * u)
        return math.pi * (c * c * u + k * k * u - u**3 / 3 + c * (u * root + k * k * math.asin(u / k)))

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""
        if level <= self.junction:
            return math.pi * (2 * self.dish * level - level * level)
        u = min(self.depth - level, self.knuckle)
        return math.pi * (self.radius - self.knuckle + math.sqrt(self.knuckle**2 - u * u)) ** 2

    def bulge(self, radius: float) -> float:
        """Return how far the head reaches beyond the tangent line at a distance from its axis."""
        c = self.radius - self.knuckle
        if self.dish > self.knuckle and radius <= self.dish * (c / (self.dish - self.knuckle)):
            return self.depth - self.dish + math.sqrt(self.dish**2 - radius * radius)
        return math.sqrt(max(0.0, self.knuckle**2 - (radius - c) ** 2))


def head_of(form: str, diameter: float, depth: float | None, dish: float | None, knuckle: float | None) -> Head | None:
    """Return a head by its form in the settings; None for flat. Raises ValueError, with a sentence."""
    radius = diameter / 2
    match form:
        case "flat":
            return None
        case "hemispherical":
            return Ellipsoid(radius, radius)
        case "torispherical":
            return Torisphere(radius, (dish or 1.0) * diameter, (knuckle or 0.06) * diameter)
        case "conical" | "ellipsoidal" if depth is not None and depth > 0:
            return Cone(radius, depth) if form == "conical" else Ellipsoid(radius, depth)
        case _:
            raise ValueError(f"a {form} head needs its `depth`")
