"""Spheres, and buckets whose walls lean. Lengths in m. Source: solid geometry."""

import math
from dataclasses import dataclass

from gateway.measure.shapes.inverse import level_at


@dataclass(frozen=True, slots=True)
class Sphere:
    """V = π·h²·(R - h/3)."""

    diameter: float

    @property
    def height(self) -> float:
        """The total height inside."""
        return self.diameter

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""
        level = min(max(level, 0.0), self.diameter)
        return math.pi * level * level * (self.diameter / 2 - level / 3)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        return level_at(self, volume)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""
        level = min(max(level, 0.0), self.diameter)
        return math.pi * level * (self.diameter - level)


@dataclass(frozen=True, slots=True)
class Frustum:
    """A round tank that widens, or narrows, evenly from bottom to top: V = π·h/3 · (r0² + r0·r + r²)."""

    bottom: float  # diameter
    top: float  # diameter
    height: float

    def _radius(self, level: float) -> float:
        return (self.bottom + (self.top - self.bottom) * (level / self.height)) / 2

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level`."""
        level = min(max(level, 0.0), self.height)
        first, now = self.bottom / 2, self._radius(level)
        return math.pi * level / 3 * (first * first + first * now + now * now)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        return level_at(self, volume)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level`."""
        return math.pi * self._radius(min(max(level, 0.0), self.height)) ** 2
