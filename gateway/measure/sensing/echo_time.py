"""Sensing `echo time`: a head above the liquid sends a pulse and times its echo from the surface."""

from dataclasses import dataclass

from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status

NEAR = 1e-9  # of the blanking distance: rounding on the way to a time and back


@dataclass(frozen=True, slots=True)
class EchoTime:
    """level = mounted_at - c·t/2: the pulse goes down to the surface and back. Lengths in m, `speed` c in m/s.

    Nearer than `blanking` the head still rings from its own pulse: what it hears there is a failure. No time at all is
    no echo. For the speed of sound see `gateway.measure.media.air`. Source: geometry. Raises ValueError for a speed or
    a blanking distance that cannot be.
    """

    mounted_at: float
    speed: float
    blanking: float = 0.0

    def __post_init__(self) -> None:
        if not (0 < self.speed < float("inf") and self.blanking >= 0):
            raise ValueError("a speed of sound is more than nothing, a blanking distance not less")

    def convert(self, raw: float) -> Converted:
        """Return the level in m for the time in s from the pulse to its echo."""
        if not raw > 0:
            return Converted(None, Status.FAILURE, "there is no echo")
        gap = self.speed * raw / 2
        if gap < self.blanking * (1 - NEAR):
            return Converted(None, Status.FAILURE, "inside the blanking distance")
        return Converted(self.mounted_at - gap)

    def raw(self, level: float) -> float:
        """Return the time in s at `level` in m; raise ValueError for a level that no echo comes from."""
        gap = self.mounted_at - level
        if not gap > 0 or gap < self.blanking:
            raise ValueError(f"no echo comes from a level of {level:g} m")
        return 2 * gap / self.speed
