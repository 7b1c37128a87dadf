"""Models of capacitive probes: from their dimensions, their coating and the liquid to the line of C over the level.

A probe is two electrodes with the tank's liquid rising between them, plates or a rod in a tube. The wetted and the dry
part are two capacitors in parallel, so C is linear in the level:

    C = length · dry + (level - mounted_at) · (wet - dry), with dry and wet in F/m

In each part the coating and the gap beside it are in series, each with c = ε0·ε·F per metre; F is width / thickness for
plates and 2π / ln(outer / inner) for a rod in a tube. A liquid that conducts is itself an electrode that reaches to the
coating: the coating alone counts. Which of the two a liquid is depends on conductivity / (2π·f·ε0·εr).

Source: plate and coaxial capacitor, series and parallel, any text on electromagnetism. Ends are not counted, so a real
probe is off by some percent: a calibration on the spot is better where it can be had.
"""

import math
from dataclasses import dataclass
from enum import Enum

from gateway.measure.calibration import Curve, Line

EPSILON_0 = 8.8541878188e-12  # F/m. Source: CODATA 2022
AIR = 1.0  # relative permittivity; 1.0006 in truth
CONDUCTS, INSULATES = 10.0, 0.1  # ratio to 2π·f·ε0·εr: ten times either side of 1; common practice, no source


class Regime(Enum):
    """What a liquid is to a probe."""

    CONDUCTOR = "conductor"
    DIELECTRIC = "dielectric"
    NEITHER = "neither"


@dataclass(frozen=True, slots=True)
class Liquid:
    """A liquid by its relative permittivity and its conductivity in S/m. Raises ValueError for what no liquid has."""

    permittivity: float
    conductivity: float = 0.0

    def __post_init__(self) -> None:
        if not (AIR < self.permittivity < math.inf and 0 <= self.conductivity < math.inf):
            raise ValueError("a liquid has a permittivity above 1 and a conductivity of 0 or more")

    def ratio(self, frequency: float) -> float:
        """Return conductivity / (2π·f·ε0·εr) at `frequency` in Hz: the current conducted over the one displaced."""
        return self.conductivity / (2 * math.pi * frequency * EPSILON_0 * self.permittivity)

    def regime(self, frequency: float) -> Regime:
        """Return what the liquid is to a probe at `frequency` in Hz."""
        ratio = self.ratio(frequency)
        if ratio > CONDUCTS:
            return Regime.CONDUCTOR
        return Regime.DIELECTRIC if ratio < INSULATES else Regime.NEITHER


@dataclass(frozen=True, slots=True)
class Electrodes:
    """What lies between the electrodes, in F for each metre of probe: the gap as if empty, and the coating, if any."""

    gap: float
    coating: float | None = None

    def dielectric(self, permittivity: float) -> float:
        """Return the F/m with the gap full of something that does not conduct."""
        full = self.gap * permittivity
        return full if self.coating is None else full * self.coating / (full + self.coating)

    def conductor(self) -> float:
        """Return the F/m with the gap full of something that conducts; raise ValueError for a bare probe."""
        if self.coating is None:
            raise ValueError("a bare probe is shorted by a liquid that conducts: it needs a coating")
        return self.coating


@dataclass(frozen=True, slots=True)
class Coating:
    """What insulates an electrode: its thickness in m and its relative permittivity."""

    thickness: float
    permittivity: float

    def __post_init__(self) -> None:
        _lengths(thickness=self.thickness)
        if not 1 <= self.permittivity < math.inf:
            raise ValueError("a coating has a permittivity of 1 or more")


def plates(width: float, gap: float, coating: Coating | None = None) -> Electrodes:
    """Return two plates facing each other; lengths in m. `gap` is between the metals.

    The coating's thickness is that on both plates together: the two are in series, as one of that thickness.
    """
    _lengths(width=width, gap=gap)
    if coating is None:
        return Electrodes(EPSILON_0 * width / gap)
    free = gap - coating.thickness
    if not free > 0:
        raise ValueError("the coating fills the whole gap between the plates")
    return Electrodes(EPSILON_0 * width / free, EPSILON_0 * coating.permittivity * width / coating.thickness)


def coaxial(rod: float, bore: float, coating: Coating | None = None) -> Electrodes:
    """Return a rod in the middle of a tube, or of a round tank of metal; diameters in m.

    `rod` is that of the metal, and the coating is on it.
    """
    _lengths(rod=rod, bore=bore)
    outer = rod if coating is None else rod + 2 * coating.thickness
    if not bore > outer:
        raise ValueError("the rod with its coating does not fit into the bore")
    gap = _around(rod=outer, bore=bore)
    return Electrodes(gap, None if coating is None else coating.permittivity * _around(rod=rod, bore=outer))


def _around(rod: float, bore: float) -> float:
    return 2 * math.pi * EPSILON_0 / math.log(bore / rod)


def _lengths(**lengths: float) -> None:
    for name, length in lengths.items():
        if not 1e-9 <= length <= 1e9:
            raise ValueError(f"the {name} of a probe must be more than nothing; {length:g} m is no {name} of one")


@dataclass(frozen=True, slots=True)
class Probe:
    """A probe in its place: `length` upright from `mounted_at`, the level at its lower end; both in m.

    `frequency` in Hz is the one at which it is measured while wet. Where the liquid is neither conductor nor
    dielectric, the nearer of the two counts, and `warning` says so. Raises ValueError for a bare probe in a liquid that
    conducts.
    """

    electrodes: Electrodes
    length: float
    liquid: Liquid
    frequency: float
    mounted_at: float = 0.0

    def __post_init__(self) -> None:
        _lengths(length=self.length)
        if not 1e-9 <= self.frequency <= 1e18:
            raise ValueError("the frequency at which a probe is measured must be more than nothing")
        self._wet_per_metre()

    @property
    def regime(self) -> Regime:
        """What the liquid is to this probe."""
        return self.liquid.regime(self.frequency)

    @property
    def warning(self) -> str | None:
        """What a person should know before trusting the model; None when nothing is the matter."""
        if self.regime is not Regime.NEITHER:
            return None
        return (
            f"at {self.frequency:g} Hz the liquid is neither a conductor nor a dielectric (ratio"
            f" {self.liquid.ratio(self.frequency):.2g}, where above {CONDUCTS:g} or below {INSULATES:g} is clear):"
            " calibrate on the spot, or measure at another frequency"
        )

    @property
    def dry(self) -> float:
        """The capacitance in F with no liquid."""
        return self.length * self.electrodes.dielectric(AIR)

    @property
    def wet(self) -> float:
        """The capacitance in F, covered to its upper end."""
        return self.length * self._wet_per_metre()

    @property
    def slope(self) -> float:
        """The rise of capacitance with the level, in F/m."""
        return self._wet_per_metre() - self.electrodes.dielectric(AIR)

    @property
    def picofarads_per_millimetre(self) -> float:
        """The slope, in the unit that people use."""
        return self.slope * 1e12 / 1e3

    def _wet_per_metre(self) -> float:
        regime, ratio = self.regime, self.liquid.ratio(self.frequency)
        bare_and_unclear = regime is Regime.NEITHER and self.electrodes.coating is None
        if regime is Regime.DIELECTRIC or bare_and_unclear or (regime is Regime.NEITHER and ratio < 1):
            return self.electrodes.dielectric(self.liquid.permittivity)
        return self.electrodes.conductor()

    def line(self) -> Line:
        """Return the line of the level over the probe's own capacitance in F."""
        return Line(self.dry, self.mounted_at, self.wet, self.mounted_at + self.length)


@dataclass(frozen=True, slots=True)
class Scaled:
    """A calibration carried over to a liquid of another permittivity: x above `dry` grows by `factor`.

    For a bare probe in a dielectric, where what the liquid adds goes with ε - 1: factor = (ε_now - 1) / (ε_then - 1).
    `dry` is the x of the probe with no liquid. A coated probe in a liquid that conducts does not change with ε.
    """

    curve: Curve
    dry: float
    factor: float

    def __post_init__(self) -> None:
        if not 0 < self.factor < math.inf:
            raise ValueError("the permittivity of a liquid is above 1")

    def level(self, x: float) -> float:
        """Return the level at `x`."""
        return self.curve.level(self.dry + (x - self.dry) / self.factor)

    def x(self, level: float) -> float:
        """Return the x at `level`; the inverse of `level`."""
        return self.dry + (self.curve.x(level) - self.dry) * self.factor
