"""Capacitive probes against the formulas and constants of physics, and against readings from practice."""

import math

import pytest

from gateway.measure.calibration import Line
from gateway.measure.sensing.capacitance import Capacitance
from gateway.measure.sensing.frequency import Frequency

PICO = 1e-12
EPSILON_0 = 8.8541878188e-12  # F/m. Source: CODATA 2022
WATER_20 = 80.22263813  # relative permittivity at 20 °C and 1 atm. Source: IAPWS R8-97, by the iapws library 1.5.5
OFFSET = 52 * PICO  # 22 pF fixed, 30 pF stray


def bare_probe(h: float) -> float:
    """Return C(h) in F of a bare coaxial probe, 1 m long, rod 6 mm in a bore of 25 mm, in clean water at 20 °C.

    Source: the coaxial capacitor, C = 2·pi·eps0·eps·L / ln(b/a), wet and dry part in parallel (any text on
    electromagnetism).
    """
    per_metre = 2 * math.pi * EPSILON_0 / math.log(12.5 / 3.0)
    return OFFSET + per_metre * (1 - h) + per_metre * WATER_20 * h


# The same formula, worked out beforehand by an independent script: h in m, C in pF.
BARE = {0.0: 90.982, 0.25: 863.056, 0.5: 1635.129, 0.75: 2407.202, 1.0: 3179.276}


@pytest.mark.parametrize("h", BARE)
def test_the_formula_is_the_one_of_the_table(h: float) -> None:
    """The table and the formula agree to the digits printed."""
    assert bare_probe(h) / PICO == pytest.approx(BARE[h], abs=5e-4)


@pytest.mark.parametrize("h", BARE)
def test_a_capacitance_between_dry_and_full_reads_as_its_depth(h: float) -> None:
    """Two points, dry and full, are enough, since capacitance is linear in depth."""
    sensor = Capacitance(Line(bare_probe(0.0), 0.0, bare_probe(1.0), 1.0))
    assert sensor.convert(BARE[h] * PICO).level == pytest.approx(h, abs=1e-6)
    assert sensor.raw(h) == pytest.approx(BARE[h] * PICO, rel=1e-5)


# k of f = 1/(k·R·C), R = 100 kOhm, at 5 V. Sources: ideal thresholds k = 2·ln 2; HEF40106B data sheet, 1995;
# CD40106BM data sheet, 1988: the same part of two makers, k three times apart.
SCHMITT = {"ideal": 1.386294, "HEF40106B": 0.646627, "CD40106BM": 1.888923}


@pytest.mark.parametrize("part", SCHMITT)
@pytest.mark.parametrize("h", [0.1, 0.5, 0.9])
def test_an_oscillator_reads_as_its_depth_whatever_its_constant(part: str, h: float) -> None:
    """Frequency goes with 1/C; with two points on the spot, neither k nor R matters."""

    def frequency(depth: float) -> float:
        return 1 / (SCHMITT[part] * 100e3 * bare_probe(depth))

    sensor = Frequency(Line(1 / frequency(0.0), 0.0, 1 / frequency(1.0), 1.0))
    assert sensor.convert(frequency(h)).level == pytest.approx(h, abs=1e-9)
    assert sensor.raw(h) == pytest.approx(frequency(h), rel=1e-9)


def test_two_oscillator_readings_from_practice() -> None:
    """80.6 kHz dry, with 84.4 pF, and 2.9 kHz immersed (common practice, no source).

    K = f·C from the first pair gives 2345.7 pF for the second: pure arithmetic. Net of 22 + 30 pF it is 'about 2 nF'.
    """
    sensor = Frequency(Line(1 / 80.6e3, 0.0, 1 / 2.9e3, 1.0))
    total = 80.6e3 * 84.4e-12 / 2.9e3
    assert total == pytest.approx(2345.74e-12, rel=1e-5)
    assert 1.5e-9 < total - OFFSET < 2.5e-9
    middle = 80.6e3 * 84.4e-12 / ((84.4e-12 + total) / 2)
    assert sensor.convert(middle).level == pytest.approx(0.5, abs=1e-12)
    assert middle == pytest.approx(5598.6, abs=0.1)


def test_interpolating_in_hertz_would_be_wrong_by_most_of_the_span() -> None:
    """Half covered, the probe gives 5.6 kHz; a straight line in hertz would call that 97 % full."""
    sensor = Frequency(Line(1 / 80.6e3, 0.0, 1 / 2.9e3, 1.0))
    half = sensor.raw(0.5)
    in_hertz = (80.6e3 - half) / (80.6e3 - 2.9e3)
    assert in_hertz == pytest.approx(0.9653, abs=1e-4)
    assert sensor.convert(half).level == pytest.approx(0.5, abs=1e-12)


# ST NE555 data sheet, Doc ID 2182 Rev 6, p. 10: f = 1.44 / ((R1 + 2·R2)·C); R1 10 kOhm, R2 68 kOhm, C 10 nF gives
# 986.3014 Hz.
def test_a_timer_circuit_of_a_data_sheet() -> None:
    """A probe of 10 nF, half way between 5 and 15 nF, reads as half way."""

    def frequency(farad: float) -> float:
        return 1.44 / ((10e3 + 2 * 68e3) * farad)

    assert frequency(10e-9) == pytest.approx(986.3014, abs=1e-4)
    sensor = Frequency(Line(1 / frequency(5e-9), 0.0, 1 / frequency(15e-9), 2.0))
    assert sensor.convert(986.3014).level == pytest.approx(1.0, abs=1e-6)
