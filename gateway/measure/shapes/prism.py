"""Shapes with straight walls: the same area at every level."""

import math
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Prism:
    """volume = area · level. Source: solid geometry."""

    base: float  # m2
    height: float  # m

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level` in m."""
        return self.base * min(max(level, 0.0), self.height)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        return min(max(volume / self.base, 0.0), self.height)

    def area(self, level: float) -> float:  # noqa: ARG002 - the same at every level
        """Return the free surface in m2."""
        return self.base


def vertical_cylinder(diameter: float, height: float) -> Prism:
    """Return an upright cylinder with a flat bottom; lengths in m. Area π·d²/4."""
    return Prism(math.pi * diameter**2 / 4, height)


def rectangular(length: float, width: float, height: float) -> Prism:
    """Return a box; lengths in m. Area length · width."""
    return Prism(length * width, height)
