"""Shapes with straight walls: the same area at every level, above a bottom that may have a form of its own."""

import math
from dataclasses import dataclass

from gateway.measure.shapes.heads import Head
from gateway.measure.shapes.inverse import level_at


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


@dataclass(frozen=True, slots=True)
class OnHead:
    """A cylinder that stands on a head. `height` is the whole, from the head's lowest point.

    Raises ValueError when the head is deeper than the whole.
    """

    base: float  # m2
    height: float  # m
    head: Head

    def __post_init__(self) -> None:
        if not self.head.depth < self.height:
            raise ValueError(
                f"the bottom alone is {self.head.depth:g} m deep; the height is counted from its lowest point"
            )

    def volume(self, level: float) -> float:
        """Return the volume in m3 up to `level` in m."""
        level = min(max(level, 0.0), self.height)
        depth = self.head.depth
        return self.head.volume(level) if level <= depth else self.head.volume(depth) + self.base * (level - depth)

    def level(self, volume: float) -> float:
        """Return the level in m at which `volume` in m3 stands."""
        below = self.head.volume(self.head.depth)
        if volume >= below:
            return min(self.head.depth + (volume - below) / self.base, self.height)
        return level_at(self, volume)

    def area(self, level: float) -> float:
        """Return the free surface in m2 at `level` in m."""
        return self.base if level >= self.head.depth else self.head.area(max(level, 0.0))


def vertical_cylinder(diameter: float, height: float, bottom: Head | None = None) -> Prism | OnHead:
    """Return an upright cylinder; lengths in m. Area π·d²/4."""
    base = math.pi * diameter**2 / 4
    return Prism(base, height) if bottom is None else OnHead(base, height, bottom)


def rectangular(length: float, width: float, height: float) -> Prism:
    """Return a box; lengths in m. Area length · width."""
    return Prism(length * width, height)
