"""Sensing `temperature`: no level, but what other sensors are corrected with."""

from dataclasses import dataclass

from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status


@dataclass(frozen=True, slots=True)
class Temperature:
    """T = raw, in K; here `Converted.level` and `level` are temperatures. Less than nothing is a failure.

    Source: the definition of the kelvin, which begins at absolute zero.
    """

    def convert(self, raw: float) -> Converted:
        """Return the temperature in K."""
        if raw < 0:
            return Converted(None, Status.FAILURE, "below absolute zero")
        return Converted(raw)

    def raw(self, level: float) -> float:
        """Return the temperature in K."""
        return level
