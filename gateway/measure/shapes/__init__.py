"""Shapes of tanks: level to volume and back, one file a family; `FORMS` is the whole list.

Level 0 is the lowest inside point. Levels outside the tank count as its bottom or its top.
"""

from typing import Protocol

FORMS = ("vertical cylinder", "horizontal cylinder", "rectangular", "sphere", "frustum", "strapping")
"""Every form of the settings."""


class Shape(Protocol):
    """The inside of a tank. Lengths in m, areas in m2, volumes in m3."""

    @property
    def height(self) -> float:
        """The total height inside."""

    def volume(self, level: float) -> float:
        """Return the volume up to `level`."""

    def level(self, volume: float) -> float:
        """Return the level at which `volume` stands; the inverse of `volume` within the tank."""

    def area(self, level: float) -> float:
        """Return the free surface at `level`."""
