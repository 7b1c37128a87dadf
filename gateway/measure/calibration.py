"""Calibration: the straight line through two points, in the quantity in which the method is linear."""

from dataclasses import dataclass


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
