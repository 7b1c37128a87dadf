"""Sensing `level`: the device sends the level itself, as a length, as a share of the brim, or as a volume."""

import math
from collections.abc import Callable
from dataclasses import dataclass

from gateway.measure.calibration import Curve
from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status

NEAR = 1e-9  # of the value: rounding on the way to a level and back


@dataclass(frozen=True, slots=True)
class Level:
    """level = raw, or what `to_level` makes of it; a calibration may correct it.

    A volume that the tank cannot hold counts as an empty or a full tank, and as out of specification: too much may be a
    tank that stands above its rim, or a device that is wrong.
    """

    to_level: Callable[[float], float] | None = None
    to_raw: Callable[[float], float] | None = None
    line: Curve | None = None

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a raw value in m, as a share, or in m3."""
        level = raw if self.to_level is None else self.to_level(raw)
        corrected = level if self.line is None else self.line.level(level)
        if self.to_raw is not None and not math.isclose(self.to_raw(level), raw, rel_tol=NEAR, abs_tol=NEAR):
            reason = "less than nothing" if raw < 0 else "more than the tank holds"
            return Converted(corrected, Status.OUT_OF_SPECIFICATION, reason)
        return Converted(corrected)

    def raw(self, level: float) -> float:
        """Return the raw value at `level` in m."""
        level = level if self.line is None else self.line.x(level)
        return level if self.to_raw is None else self.to_raw(level)
