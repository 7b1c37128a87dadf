"""Sensing `admittance`: the probe's admittance, or its impedance, at one frequency tells its capacitance."""

import math
from dataclasses import dataclass

from gateway.measure.sensing.circuit import capacitor, positive

RIGHT_ANGLE = math.pi / 2


@dataclass(frozen=True, slots=True)
class Admittance:
    """C = |Y|·sin φ / (2π·f), that is, from Im Y. `excitation` f in Hz, `phase` φ in rad.

    A probe that conducts a little has φ below 90 degrees (φ = 90 degrees - loss angle); counting all of |Y| then reads
    too high. Source: Y = G + j·2π·f·C. Raises ValueError for a phase that no capacitor has.
    """

    excitation: float
    phase: float = RIGHT_ANGLE

    def __post_init__(self) -> None:
        positive(excitation=self.excitation)
        if not 0 < self.phase <= RIGHT_ANGLE:
            raise ValueError("the phase of a capacitor lies between 0 and 90 degrees")

    @property
    def siemens(self) -> float:
        """|Y| of each farad."""
        return 2 * math.pi * self.excitation / math.sin(self.phase)

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for |Y| in S."""
        if not raw > 0:
            raise ValueError("no current flows through the probe")
        return raw / self.siemens

    def raw(self, farad: float) -> float:
        """Return |Y| in S for a capacitance in F."""
        return capacitor(farad) * self.siemens


@dataclass(frozen=True, slots=True)
class Impedance:
    """C = sin φ / (2π·f·|Z|), the same for a device that sends the impedance. Source: Z = 1/Y."""

    admittance: Admittance

    def farad(self, raw: float) -> float:
        """Return the capacitance in F for |Z| in ohm."""
        if not raw > 0:
            raise ValueError("the probe is shorted")
        return 1 / self.admittance.siemens / raw

    def raw(self, farad: float) -> float:
        """Return |Z| in ohm for a capacitance in F."""
        return 1 / self.admittance.siemens / capacitor(farad)
