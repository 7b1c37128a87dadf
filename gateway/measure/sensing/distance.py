"""Sensing `distance`: a head above the liquid measures down to the surface."""

from dataclasses import dataclass

from gateway.measure.sensing.method import Converted


@dataclass(frozen=True, slots=True)
class Distance:
    """level = mounted_at - distance; all in m, `mounted_at` from the lowest inside point. Source: geometry."""

    mounted_at: float

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a distance in m."""
        return Converted(self.mounted_at - raw)

    def raw(self, level: float) -> float:
        """Return the distance in m at `level` in m."""
        return self.mounted_at - level
