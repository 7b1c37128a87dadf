"""Sensing `charge time`: how long the probe takes from one voltage to another tells its capacitance."""

import math
from dataclasses import dataclass

from gateway.measure.sensing.circuit import capacitor, positive


def _duration(raw: float) -> float:
    if not raw > 0:
        raise ValueError(f"nothing charges in {raw:g} s")
    return raw


@dataclass(frozen=True, slots=True)
class ByCurrent:
    """C = I·t/V: a constant `current` in A raises the voltage by `rise` in V. Source: definition of capacitance."""

    current: float
    rise: float

    def __post_init__(self) -> None:
        positive(current=self.current, rise=self.rise)

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for a time in s."""
        return self.current / self.rise * _duration(raw)

    def raw(self, farad: float) -> float:
        """Return the time in s for a capacitance in F."""
        return capacitor(farad) / (self.current / self.rise)


@dataclass(frozen=True, slots=True)
class ThroughResistor:
    """C = t / (R·ln((Vs - V0) / (Vs - Vth))): charged from `start` to `threshold` through a resistor from `supply`.

    Ohm and V. Discharging is the same with a supply of 0 V. Source: v(t) = Vs + (V0 - Vs)·exp(-t/RC). Raises ValueError
    for a threshold that lies not between start and supply.
    """

    resistance: float
    supply: float
    start: float
    threshold: float

    def __post_init__(self) -> None:
        positive(resistance=self.resistance)
        start, left = self.supply - self.start, self.supply - self.threshold
        if not (start * left > 0 and abs(left) < abs(start)):
            raise ValueError("the voltage measured to must lie between the one measured from and the supply")

    @property
    def ohms(self) -> float:
        """R·ln(…): the time for each farad."""
        return self.resistance * math.log((self.supply - self.start) / (self.supply - self.threshold))

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for a time in s."""
        return _duration(raw) / self.ohms

    def raw(self, farad: float) -> float:
        """Return the time in s for a capacitance in F."""
        return capacitor(farad) * self.ohms
