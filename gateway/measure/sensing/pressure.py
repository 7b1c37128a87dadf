"""Sensing `pressure`: a pressure transmitter below the surface feels the column of liquid above it."""

import math
from dataclasses import dataclass

from gateway.measure.sensing.method import Converted

STANDARD_GRAVITY = 9.80665  # m/s2, exact; the local one is up to 0.27 % off. Source: 3rd CGPM, 1901


@dataclass(frozen=True, slots=True)
class Pressure:
    """level = mounted_at + (p - barometer) / (density · g). Pressures in Pa, `density` in kg/m3, `mounted_at` in m.

    A vented transmitter measures against the air outside: `barometer` stays 0. An unvented one measures the air's
    pressure too, and needs it taken off: 1 hPa is 10 mm of water. For the density of water see
    `gateway.measure.media.water`. Source: hydrostatics, p = density·g·h. Raises ValueError for a density or a
    barometer that cannot be.
    """

    density: float
    mounted_at: float = 0.0
    barometer: float = 0.0

    def __post_init__(self) -> None:
        if not (0 < self.density < math.inf and 0 <= self.barometer < math.inf):
            raise ValueError("a density is more than nothing, the air's pressure not less")

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a pressure in Pa."""
        return Converted(self.mounted_at + (raw - self.barometer) / (self.density * STANDARD_GRAVITY))

    def raw(self, level: float) -> float:
        """Return the pressure in Pa at `level` in m."""
        return self.barometer + (level - self.mounted_at) * self.density * STANDARD_GRAVITY
