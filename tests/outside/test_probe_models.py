"""Models of probes against exercises of textbooks, worked tables and the energy of the field."""

import math

import pytest
import scipy.constants
import scipy.integrate

from gateway.measure.calibration import Line
from gateway.measure.media.water import permittivity
from gateway.measure.probe import EPSILON_0, Coating, Electrodes, Liquid, Probe, Regime, Scaled, coaxial, plates

PICO = 1e-12
WATER_20 = 80.2226381265094  # relative permittivity at 20 degC. Source: IAPWS R8-97, by the iapws library 1.5.5
TAP, RAIN, DEMINERALISED = 0.05, 0.002, 1e-4  # S/m, typical; from memory
KILOHERTZ = 1e3


def test_the_constant_is_that_of_codata() -> None:
    """CODATA 2022, as scipy.constants has it; an older scipy has 2018, 7e-10 apart."""
    assert pytest.approx(scipy.constants.epsilon_0, rel=1e-9) == EPSILON_0


# What, the electrodes, their length in m, the permittivity of the filling, the capacitance in pF and how near. Sources:
# worked out beforehand from eps0·A/d and 2·pi·eps0·L/ln(b/a), and the answers to exercises. Liquid nitrogen: Giancoli,
# Physics, chapter 24 (K = 1.4; a public answer rounds to 1482 pF). Oil: an exam exercise on capacitors of the same
# publisher. Transducer: after Bentley, Principles of Measurement Systems, there with eps0 rounded to 8.85 pF/m.
FILLED: dict[str, tuple[Electrodes, float, float, float, float]] = {
    "plates, air": (plates(0.02, 0.002), 0.5, 1.0, 44.270939094, 1e-9),
    "plates, water": (plates(0.02, 0.002), 0.5, WATER_20, 3551.5315264587, 1e-9),
    "coaxial, a metre, air": (coaxial(0.006, 0.025), 1.0, 1.0, 38.98245759024897, 1e-9),
    "nitrogen, empty": (coaxial(0.009, 0.010), 2.0, 1.0, 1056.0408225557155, 1e-9),
    "nitrogen, full": (coaxial(0.009, 0.010), 2.0, 1.4, 1478.4571515780015, 1e-9),
    "nitrogen, full, as answered": (coaxial(0.009, 0.010), 2.0, 1.4, 1482.0, 5e-3),
    "oil, empty": (coaxial(0.007, 0.008), 1.5, 1.0, 624.9373467540238, 1e-9),
    "oil, full": (coaxial(0.007, 0.008), 1.5, 2.2, 1374.8621628588523, 1e-9),
}


@pytest.mark.parametrize("case", FILLED)
def test_a_filled_capacitor(case: str) -> None:
    """Each as its source has it."""
    electrodes, length, filling, picofarad, rel = FILLED[case]
    assert length * electrodes.dielectric(filling) == pytest.approx(picofarad * PICO, rel=rel)


@pytest.mark.parametrize(("h", "picofarad"), [(0.0, 802.2), (4.5, 1307.6), (9.0, 1813.0)])
def test_the_transducer_of_an_exercise(h: float, picofarad: float) -> None:
    """Length 10 m, b/a = 2, permittivity 2.4, after Bentley; eps0 is rounded there, by 5e-4."""
    probe = Probe(coaxial(0.01, 0.02), 10.0, Liquid(2.4), 1e4)
    assert probe.line().x(h) == pytest.approx(picofarad * PICO, rel=6e-4)


def test_the_coaxial_formula_is_the_energy_of_the_field() -> None:
    """C = 2·W/V², W the integral of eps0·E²/2 over the gap with E = V/(r·ln(b/a)); integrated live by scipy."""
    a, b = 0.003, 0.0125
    energy, _ = scipy.integrate.quad(lambda r: EPSILON_0 / 2 / (r * math.log(b / a)) ** 2 * 2 * math.pi * r, a, b)
    assert coaxial(2 * a, 2 * b).dielectric(1.0) == pytest.approx(2 * energy, rel=1e-9)


# Permittivities of the CRC Handbook's table of liquids, as carried by the library chemicals 1.5.2.
LIQUIDS = {
    "ethanol": 25.3,
    "methanol": 33.0,
    "ethylene glycol": 41.4,
    "glycerol": 46.53,
    "n-hexane": 1.8865,
    "toluene": 2.379,
}


@pytest.mark.parametrize("liquid", LIQUIDS)
def test_a_bare_probe_tells_the_permittivity_of_what_fills_it(liquid: str) -> None:
    """Wet over dry is the definition of the relative permittivity."""
    for electrodes in (plates(0.03, 0.004), coaxial(0.01, 0.04)):
        probe = Probe(electrodes, 0.8, Liquid(LIQUIDS[liquid]), 1e5)
        assert probe.wet / probe.dry == pytest.approx(LIQUIDS[liquid], rel=1e-12)


BARE = Probe(coaxial(0.006, 0.025), 1.0, Liquid(WATER_20), 1e5)
# h in m, C in pF with 52 pF in parallel, worked out beforehand: rod 6 mm, bore 25 mm, 1 m, in water that insulates.
BARE_TABLE = {
    0.0: 90.98245759024897,
    0.25: 863.055740328822,
    0.5: 1635.129023067395,
    0.75: 2407.2023058059685,
    1.0: 3179.2755885445413,
}


@pytest.mark.parametrize("h", BARE_TABLE)
def test_a_bare_probe_in_clean_water(h: float) -> None:
    """In both directions, to 1e-9; 3.08829 pF/mm."""
    net = (BARE_TABLE[h] - 52) * PICO
    assert BARE.line().x(h) == pytest.approx(net, rel=1e-9)
    assert BARE.line().level(net) == pytest.approx(h, abs=1e-9)
    assert BARE.picofarads_per_millimetre == pytest.approx(3.08829, abs=5e-6)


SLEEVED = coaxial(0.004, 0.5, Coating(0.001, 2.1))  # PTFE, 2.1 from memory
# As before: metal 4 mm in a sleeve of PTFE to 6 mm, in a tank of radius 0.25 m, in water that conducts.
SLEEVED_TABLE = {
    0.0: 64.05229193868887,
    0.25: 133.0727019621456,
    0.5: 202.09311198560235,
    0.75: 271.1135220090591,
    1.0: 340.13393203251593,
}


@pytest.mark.parametrize("h", SLEEVED_TABLE)
def test_an_insulated_probe_in_water_that_conducts(h: float) -> None:
    """In both directions, to 1e-9; 0.27608 pF/mm."""
    probe = Probe(SLEEVED, 1.0, Liquid(WATER_20, TAP), 10 * KILOHERTZ)
    net = (SLEEVED_TABLE[h] - 52) * PICO
    assert probe.line().x(h) == pytest.approx(net, rel=1e-9)
    assert probe.line().level(net) == pytest.approx(h, abs=1e-9)
    assert probe.slope == pytest.approx(276.08164009382705 * PICO, rel=1e-9)
    assert probe.picofarads_per_millimetre == pytest.approx(0.27608, abs=5e-6)


def test_the_parts_of_an_insulated_probe() -> None:
    """Sleeve, air, both in series, water, and water that does not conduct: pF/m, worked out beforehand."""
    assert SLEEVED.conductor() / PICO == pytest.approx(288.1339320325159, rel=1e-9)
    assert SLEEVED.gap / PICO == pytest.approx(12.578432470619987, rel=1e-9)
    assert SLEEVED.dielectric(1.0) / PICO == pytest.approx(12.052291938688859, rel=1e-9)
    assert SLEEVED.gap * WATER_20 / PICO == pytest.approx(1009.0750362892827, rel=1e-9)
    assert SLEEVED.dielectric(WATER_20) / PICO == pytest.approx(224.13409483132608, rel=1e-9)


def test_tap_water_is_no_insulator() -> None:
    """Taking it for one would put the wet end 22.2 % low."""
    wet = [Probe(SLEEVED, 1.0, Liquid(WATER_20, sigma), 1e4).wet for sigma in (0.0, TAP)]
    assert wet[0] / wet[1] - 1 == pytest.approx(-0.222, abs=5e-4)


# Conductivity in S/m, frequency in Hz, the ratio (worked out beforehand from sigma/(2·pi·f·eps0·eps), three digits),
# and what the liquid is where above 10 is a conductor and below 0.1 a dielectric.
RATIOS = [
    (TAP, 2.9e3, 3.86e3, Regime.CONDUCTOR),
    (TAP, 80.6e3, 139.0, Regime.CONDUCTOR),
    (TAP, 1e6, 11.2, Regime.CONDUCTOR),
    (RAIN, 2.9e3, 155.0, Regime.CONDUCTOR),
    (RAIN, 80.6e3, 5.56, Regime.NEITHER),
    (RAIN, 1e6, 0.448, Regime.NEITHER),
    (DEMINERALISED, 2.9e3, 7.73, Regime.NEITHER),
    (DEMINERALISED, 80.6e3, 0.278, Regime.NEITHER),
    (DEMINERALISED, 1e6, 0.0224, Regime.DIELECTRIC),
]


@pytest.mark.parametrize(("conductivity", "frequency", "ratio", "regime"), RATIOS)
def test_what_water_is_to_a_probe(conductivity: float, frequency: float, ratio: float, regime: Regime) -> None:
    """A conductor, a dielectric, or neither; then a person is warned, and the nearer of the two counts."""
    probe = Probe(SLEEVED, 1.0, Liquid(WATER_20, conductivity), frequency)
    assert probe.liquid.ratio(frequency) == pytest.approx(ratio, rel=5e-3)
    assert probe.regime is regime
    assert (probe.warning is None) == (regime is not Regime.NEITHER)
    nearer = SLEEVED.conductor() if ratio > 1 else SLEEVED.dielectric(WATER_20)
    assert probe.wet == pytest.approx(nearer, rel=1e-12)


def test_the_warning_says_what_to_do() -> None:
    """In words, with the ratio found."""
    warning = Probe(SLEEVED, 1.0, Liquid(WATER_20, RAIN), 80.6e3).warning
    assert warning is not None
    assert warning.startswith("at 80600 Hz the liquid is neither a conductor nor a dielectric (ratio 5.6, ")
    assert warning.endswith("calibrate on the spot, or measure at another frequency")


def test_a_bare_probe_is_shorted_by_water_that_conducts() -> None:
    """It is refused when it is made; where the water hardly conducts, it is warned of."""
    with pytest.raises(ValueError, match="a bare probe is shorted by a liquid that conducts"):
        Probe(coaxial(0.006, 0.025), 1.0, Liquid(WATER_20, TAP), 1e4)
    unclear = Probe(coaxial(0.006, 0.025), 1.0, Liquid(WATER_20, RAIN), 80.6e3)
    assert unclear.warning is not None
    assert unclear.wet == pytest.approx(BARE.wet)


def test_coated_plates_are_three_capacitors_in_series() -> None:
    """Coating, gap, coating: 1/C adds up. Plates 20 mm wide, 4 mm apart, 0.25 mm of permittivity 3 on each."""
    one = EPSILON_0 * 3 * 0.02 / 0.25e-3
    gap = EPSILON_0 * 2 * 0.02 / 3.5e-3
    series = 1 / (1 / one + 1 / gap + 1 / one)
    assert plates(0.02, 4e-3, Coating(0.5e-3, 3.0)).dielectric(2.0) == pytest.approx(series, rel=1e-12)


def test_the_lower_end_is_where_the_level_begins() -> None:
    """A probe from 0.10 to 0.90 m reads 0.10 m dry and 0.90 m when covered."""
    probe = Probe(SLEEVED, 0.8, Liquid(WATER_20, TAP), 1e4, mounted_at=0.1)
    assert probe.line() == Line(probe.dry, 0.1, probe.wet, 0.9)
    assert probe.line().level(probe.dry) == pytest.approx(0.1)


def test_a_calibration_is_carried_over_to_water_of_another_temperature() -> None:
    """Calibrated at 20 degC, used at 50 degC; the model at 50 degC (Malmberg and Maryott 1956) says the same."""
    then, now = (permittivity(kelvin) for kelvin in (293.15, 323.15))
    cold, warm = (Probe(coaxial(0.006, 0.025), 1.0, Liquid(epsilon), 1e5).line() for epsilon in (then, now))
    scaled = Scaled(cold, cold.x(0.0), (now - 1) / (then - 1))
    for h in (0.0, 0.3, 0.8):
        assert scaled.level(warm.x(h)) == pytest.approx(h, abs=1e-12)
        assert scaled.x(h) == pytest.approx(warm.x(h), rel=1e-12)
    assert cold.level(warm.x(0.8)) == pytest.approx(0.8 * 68.90925 / 79.10304, rel=1e-9)


def test_probes_that_cannot_be_are_refused() -> None:
    """In words, when they are made."""
    with pytest.raises(ValueError, match="does not fit into the bore"):
        coaxial(0.02, 0.025, Coating(0.003, 2.1))
    with pytest.raises(ValueError, match="fills the whole gap"):
        plates(0.02, 0.002, Coating(0.002, 3.0))
    for width, gap in ((0.0, 0.01), (-1.0, 0.01), (0.01, math.nan), (math.inf, 0.01)):
        with pytest.raises(ValueError, match="of a probe must be more than nothing"):
            plates(width, gap)
    with pytest.raises(ValueError, match="a coating has a permittivity"):
        Coating(0.001, 0.5)
    for epsilon, sigma in ((1.0, 0.0), (80.0, -1.0), (math.nan, 0.0), (80.0, math.inf)):
        with pytest.raises(ValueError, match="a liquid has a permittivity above 1"):
            Liquid(epsilon, sigma)
    with pytest.raises(ValueError, match="frequency at which a probe is measured"):
        Probe(SLEEVED, 1.0, Liquid(80.0), 0.0)
    for factor in (0.0, -1.0, math.inf):
        with pytest.raises(ValueError, match="above 1"):
            Scaled(BARE.line(), 0.0, factor)
