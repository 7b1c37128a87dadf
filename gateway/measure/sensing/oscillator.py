"""Sensing `frequency` with a known oscillator: f = K/C, so that a frequency tells a capacitance."""

import math
from dataclasses import dataclass

from gateway.measure.sensing.circuit import capacitor, positive
from gateway.measure.sensing.frequency import SLOWEST


@dataclass(frozen=True, slots=True)
class Oscillator:
    """C = K/f, with K = 1/(k·R) in F·Hz. The functions below find K; the first is the one to trust.

    Source: v(t) = V∞ + (V0 - V∞)·exp(-t/RC), which fixes the period to k·R·C.
    """

    constant: float

    def __post_init__(self) -> None:
        positive(constant=self.constant)

    def farad(self, raw: float) -> float:
        """Return the whole capacitance in F for a frequency in Hz."""
        if not raw > SLOWEST:
            raise ValueError("the oscillator stands still")
        return self.constant / raw

    def raw(self, farad: float) -> float:
        """Return the frequency in Hz for the whole capacitance in F."""
        return self.constant / capacitor(farad)


def known_pair(frequency: float, total: float) -> Oscillator:
    """Return an oscillator that runs at `frequency` in Hz with `total` in F, as measured: K = f·C."""
    positive(frequency=frequency, capacitance=total)
    return Oscillator(frequency * total)


def schmitt_trigger(resistance: float, supply: float, upper: float, lower: float) -> Oscillator:
    """Return an inverter with a Schmitt trigger and a resistor in ohm from output to input; thresholds in V.

    k = ln((supply - lower) / (supply - upper)) + ln(upper / lower), for an output that reaches both rails. The same
    part of two makers has k three times apart, so this is a guess until one pair is known.
    """
    positive(resistance=resistance, supply=supply)
    if not 0 < lower < upper < supply:
        raise ValueError("the thresholds must be lower < upper, both between nothing and the supply")
    k = math.log((supply - lower) / (supply - upper)) + math.log(upper / lower)
    return Oscillator(1 / (k * resistance))


def timer_555(charging: float, discharging: float) -> Oscillator:
    """Return a 555 timer as a free-running multivibrator: charged through both resistors, discharged through one.

    K = 1/(ln 2 · (R1 + 2·R2)), R in ohm. Source: data sheets of the NE555, which round 1/ln 2 = 1.4427 to 1.44.
    """
    positive(resistance=discharging)
    if not 0 <= charging < math.inf:
        raise ValueError("the charging resistor has no less than nothing")
    return Oscillator(1 / (math.log(2) * (charging + 2 * discharging)))
