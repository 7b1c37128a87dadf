"""Sensing `capacitance`: a probe whose capacitance rises in proportion to the wetted length."""

from dataclasses import dataclass

from gateway.measure.calibration import Curve
from gateway.measure.sensing.method import Converted


@dataclass(frozen=True, slots=True)
class Capacitance:
    """level is linear in capacitance: C(h) = C_dry + c·h. `line` has x in farad.

    Source: two capacitors in parallel, the wetted and the dry part (any text on electromagnetism).
    """

    line: Curve

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a capacitance in F."""
        return Converted(self.line.level(raw))

    def raw(self, level: float) -> float:
        """Return the capacitance in F at `level` in m."""
        return self.line.x(level)
