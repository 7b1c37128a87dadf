"""Sensing `voltage`: a transmitter with a voltage output, 0-10 V, 1-5 V and the like."""

from dataclasses import dataclass

from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status

BEYOND = 0.5 / 16  # of the span: how far NAMUR NE 43 lets a current go above 20 mA. Common practice, no source
NEAR = 1e-9  # of the span: rounding


@dataclass(frozen=True, slots=True)
class Voltage:
    """value = low + (U - U_0) / (U_1 - U_0) · (high - low), as a level; or as a distance, if `mounted_at` is given.

    Up to 3.125 % of the span beyond either end the value is out of specification, further it is a failure (common
    practice, no source: no standard fixes such bands for voltages). Where `volts`, U_0 to U_1, begin at 0 V, a broken
    wire looks like the low end: prefer outputs that do not. Voltages in V, the rest in m. Raises ValueError when two
    ends are the same.
    """

    volts: tuple[float, float]
    low: float
    high: float
    mounted_at: float | None = None

    def __post_init__(self) -> None:
        if self.volts[0] == self.volts[1] or self.low == self.high:
            raise ValueError("the two ends of a span must differ, in volts and in what they stand for")

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a voltage in V."""
        share = (raw - self.volts[0]) / (self.volts[1] - self.volts[0])
        if not -BEYOND - NEAR <= share <= 1 + BEYOND + NEAR:
            return Converted(None, Status.FAILURE, f"far outside the span ({raw:.4g} V)")
        value = self.low + share * (self.high - self.low)
        level = value if self.mounted_at is None else self.mounted_at - value
        if -NEAR <= share <= 1 + NEAR:
            return Converted(level)
        side = "under" if share < 0 else "over"
        return Converted(level, Status.OUT_OF_SPECIFICATION, f"{side} range ({raw:.4g} V)")

    def raw(self, level: float) -> float:
        """Return the voltage in V at `level` in m."""
        value = level if self.mounted_at is None else self.mounted_at - level
        return self.volts[0] + (value - self.low) / (self.high - self.low) * (self.volts[1] - self.volts[0])
