"""Sensing `current`: a 4-20 mA transmitter, with the bands of NAMUR NE 43."""

from dataclasses import dataclass

from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status

MILLI = 1e-3
FAILED_LOW, UNDER, LOW, HIGH, OVER, FAILED_HIGH = 3.6, 3.8, 4.0, 20.0, 20.5, 21.0  # mA, NAMUR NE 43
NOISE = 1e-6  # mA: below what a converter resolves; keeps 3.8 mA from falling out of its band by rounding


@dataclass(frozen=True, slots=True)
class Current:
    """value = low + (I - 4 mA) / 16 mA · (high - low), as a level; or as a distance, if `mounted_at` is given.

    NAMUR NE 43: up to 3.6 mA and from 21 mA on the device signals its own failure; 3.8 to 20.5 mA measures, outside
    4 to 20 mA out of specification; what the gaps between mean is not settled by the sources at hand: here a value in
    use stays in use, and one that is not stays so. Levels in m, currents in A. `low` and `high` differ.
    """

    low: float
    high: float
    mounted_at: float | None = None

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a current in A."""
        milliamperes = raw / MILLI
        if not FAILED_LOW + NOISE < milliamperes < FAILED_HIGH - NOISE:
            side = "low" if milliamperes < LOW else "high"
            reason = f"the transmitter signals a failure ({milliamperes:.4g} mA, {side})"
            return Converted(None, Status.FAILURE, reason, signalled=True)
        level = self._level(milliamperes)
        if LOW - NOISE <= milliamperes <= HIGH + NOISE:
            return Converted(level)
        if UNDER - NOISE <= milliamperes <= OVER + NOISE:
            side = "under" if milliamperes < LOW else "over"
            return Converted(level, Status.OUT_OF_SPECIFICATION, f"{side} range ({milliamperes:.4g} mA)")
        reason = f"between the bands of NE 43 ({milliamperes:.4g} mA)"
        return Converted(level, Status.OUT_OF_SPECIFICATION, reason, held=True)

    def _level(self, milliamperes: float) -> float:
        value = self.low + (milliamperes - LOW) / (HIGH - LOW) * (self.high - self.low)
        return value if self.mounted_at is None else self.mounted_at - value

    def raw(self, level: float) -> float:
        """Return the current in A at `level` in m."""
        value = level if self.mounted_at is None else self.mounted_at - level
        return (LOW + (value - self.low) / (self.high - self.low) * (HIGH - LOW)) * MILLI
