"""Sensing `charge voltage`: the voltage that the probe has reached after a fixed time tells its capacitance.

The probe starts empty. A larger capacitance gives a lower voltage.
"""

import math
from dataclasses import dataclass

from gateway.measure.sensing.circuit import capacitor, positive

NO_CHARGE = "no charge arrives at the probe"


@dataclass(frozen=True, slots=True)
class ByCurrent:
    """C = I·t/v: a constant `current` in A flows for `after` in s. Source: definition of capacitance."""

    current: float
    after: float

    def __post_init__(self) -> None:
        positive(current=self.current, time=self.after)

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for a voltage in V."""
        if not raw > 0:
            raise ValueError(NO_CHARGE)
        return self.current * self.after / raw

    def raw(self, farad: float) -> float:
        """Return the voltage in V for a capacitance in F."""
        return self.current * self.after / capacitor(farad)


@dataclass(frozen=True, slots=True)
class ThroughResistor:
    """v = Vs·(1 - exp(-t/RC)), so C = -t / (R·ln(1 - v/Vs)): charged through a resistor for `after` in s.

    Ohm, V and s. A voltage at the supply says only that the capacitance is small: choose a shorter time. Source:
    charging of a capacitor, any text on electricity.
    """

    resistance: float
    supply: float
    after: float

    def __post_init__(self) -> None:
        positive(resistance=self.resistance, supply=self.supply, time=self.after)

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for a voltage in V."""
        share = raw / self.supply
        if not share > 0:
            raise ValueError(NO_CHARGE)
        if not share < 1:
            raise ValueError("the probe is charged up before it is measured; choose a shorter time")
        return self.after / self.resistance / -math.log1p(-share)

    def raw(self, farad: float) -> float:
        """Return the voltage in V for a capacitance in F."""
        return -self.supply * math.expm1(-(self.after / self.resistance) / capacitor(farad))
