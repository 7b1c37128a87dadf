"""Sensing `frequency`: a capacitive probe in an RC oscillator, which slows as the liquid rises."""

from dataclasses import dataclass

from gateway.measure.calibration import Curve
from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status

SLOWEST = 1e-9  # Hz; one period in thirty years


@dataclass(frozen=True, slots=True)
class Frequency:
    """level is linear in capacitance, and capacitance goes with 1/f: f = 1/(k·R·C). `line` has x in seconds, 1/f.

    Interpolating in hertz instead would be wrong by most of the span: between 80.6 kHz dry and 2.9 kHz wet, a half
    covered probe gives about 5.6 kHz, not 41.8 kHz. Source: v(t) = V(1 - exp(-t/RC)), which fixes the period to k·R·C.
    """

    line: Curve

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a frequency in Hz; no frequency at all is a failure of the oscillator."""
        if not raw > SLOWEST:
            return Converted(None, Status.FAILURE, "the oscillator stands still")
        return Converted(self.line.level(1 / raw))

    def raw(self, level: float) -> float:
        """Return the frequency in Hz at `level` in m; raise ValueError for a level that no capacitance belongs to."""
        period = self.line.x(level)
        if not 0 < period < 1 / SLOWEST:
            raise ValueError(f"no frequency belongs to a level of {level:g} m")
        return 1 / period
