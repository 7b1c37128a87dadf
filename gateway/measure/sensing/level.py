"""Sensing `level`: the device sends the level itself, as a length, as a share of the brim, or as a volume."""

from collections.abc import Callable
from dataclasses import dataclass

from gateway.measure.calibration import Line
from gateway.measure.sensing.method import Converted


@dataclass(frozen=True, slots=True)
class Level:
    """level = raw, or what `to_level` makes of it; a calibration may correct it."""

    to_level: Callable[[float], float] | None = None
    to_raw: Callable[[float], float] | None = None
    line: Line | None = None

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a raw value in m, as a share, or in m3."""
        level = raw if self.to_level is None else self.to_level(raw)
        return Converted(level if self.line is None else self.line.level(level))

    def raw(self, level: float) -> float:
        """Return the raw value at `level` in m."""
        level = level if self.line is None else self.line.x(level)
        return level if self.to_raw is None else self.to_raw(level)
