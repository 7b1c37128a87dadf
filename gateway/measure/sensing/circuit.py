"""Circuits that tell a capacitance: from what a circuit gives to farad, and from there to a level.

A file a circuit. `ByCapacitance` makes a sensing method of any of them, with a calibration or a model of the probe;
`Net` takes off what stands in parallel with the probe.
"""

import math
from dataclasses import dataclass
from typing import Protocol

from gateway.measure.calibration import Curve
from gateway.measure.sensing.method import Converted
from gateway.measure.status import Status


class Circuit(Protocol):
    """What makes a raw value, in SI units, of a capacitance in F."""

    def farad(self, raw: float) -> float:
        """Return the capacitance; raise ValueError, with the reason, when `raw` is no measurement."""

    def raw(self, farad: float) -> float:
        """Return the raw value; the inverse of `farad`. Raises ValueError for what no capacitor has."""


@dataclass(frozen=True, slots=True)
class Net:
    """C = C_total - parallel: the probe without the fixed capacitor and the stray capacitance beside it, in F.

    Source: capacitors in parallel add up.
    """

    circuit: Circuit
    parallel: float

    def farad(self, raw: float) -> float:
        """Return the probe's own capacitance in F; it may come out just below nothing, since strays are estimates."""
        return self.circuit.farad(raw) - self.parallel

    def raw(self, farad: float) -> float:
        """Return the raw value for a probe of `farad`."""
        return self.circuit.raw(farad + self.parallel)


@dataclass(frozen=True, slots=True)
class ByCapacitance:
    """level = curve(C), C as the circuit tells it. The curve has x in F: a calibration, or a model of the probe."""

    circuit: Circuit
    curve: Curve

    def convert(self, raw: float) -> Converted:
        """Return the level in m for a raw value of the circuit."""
        try:
            farad = self.circuit.farad(raw)
        except ValueError as problem:
            return Converted(None, Status.FAILURE, str(problem))
        return Converted(self.curve.level(farad))

    def raw(self, level: float) -> float:
        """Return the raw value at `level` in m; raise ValueError for a level that no capacitance belongs to."""
        return self.circuit.raw(self.curve.x(level))


def capacitor(farad: float) -> float:
    """Return `farad`; raise ValueError when no capacitor has it."""
    if not 0 < farad < math.inf:
        raise ValueError(f"no capacitor has {farad:g} F")
    return farad


LEAST, MOST = 1e-18, 1e18  # of any constant of a circuit, in SI units: products of them stay far from overflowing


def positive(**constants: float) -> None:
    """Raise ValueError, with a sentence, unless all constants of a circuit are more than nothing, and of this world."""
    for name, value in constants.items():
        if not LEAST <= value <= MOST:
            raise ValueError(f"the {name} of a circuit must be more than nothing; {value:g} is no {name} of one")
