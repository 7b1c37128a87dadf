"""Pressure transmitters against the hydrostatics of water, with densities of IAPWS-95."""

import pytest
import scipy.constants

from gateway.measure.media.water import density
from gateway.measure.sensing.compensated import Compensated
from gateway.measure.sensing.pressure import STANDARD_GRAVITY, Pressure

# t in degC: density in kg/m3 (IAPWS-95 by the library iapws 1.5.5), and what follows from it with the standard
# acceleration, worked out beforehand: Pa for each metre, metres for each bar, millimetres for each 10 kPa.
COLUMNS = {
    0: (999.8443072530346, 9805.123, 10.19875, 1019.875),
    4: (999.9748691392585, 9806.404, 10.19742, 1019.742),
    5: (999.9666335452146, 9806.323, 10.19750, 1019.750),
    10: (999.7024701877399, 9803.732, 10.20020, 1020.020),
    15: (999.1026214670944, 9797.850, 10.20632, 1020.632),
    20: (998.2071504679393, 9789.068, 10.21548, 1021.548),
    25: (997.0476367603434, 9777.697, 10.22736, 1022.736),
    30: (995.6494539376666, 9763.986, 10.24172, 1024.172),
    40: (992.2163528731411, 9730.318, 10.27716, 1027.716),
    60: (983.1958242274022, 9641.857, 10.37145, 1037.145),
    80: (971.7903980965833, 9530.008, 10.49317, 1049.317),
}
AT_20 = COLUMNS[20][0]
BAR, MILLIBAR, HECTOPASCAL = 1e5, 100.0, 100.0


def test_the_acceleration_is_the_standard_one() -> None:
    """9.80665 m/s2 exactly (3rd General Conference on Weights and Measures, 1901, as carried by scipy.constants)."""
    assert scipy.constants.g == STANDARD_GRAVITY


@pytest.mark.parametrize("celsius", COLUMNS)
def test_a_column_weighs_what_its_density_says(celsius: int) -> None:
    """With the density given: to the digits printed."""
    rho, per_metre, per_bar, per_10_kpa = COLUMNS[celsius]
    sensor = Pressure(rho)
    assert sensor.raw(1.0) == pytest.approx(per_metre, abs=5e-4)
    assert sensor.convert(BAR).level == pytest.approx(per_bar, abs=5e-6)
    assert sensor.convert(10e3).level == pytest.approx(per_10_kpa / 1000, abs=5e-7)


@pytest.mark.parametrize("celsius", COLUMNS)
def test_a_column_of_water_weighs_what_its_temperature_says(celsius: int) -> None:
    """With the density by our own formula: within 0.005 %."""
    sensor = Pressure(density(celsius + 273.15))
    assert sensor.raw(1.0) == pytest.approx(COLUMNS[celsius][1], rel=5e-5)


# Worked beforehand from the same densities.
def test_three_metres_of_water() -> None:
    """At 20 degC 29367.204 Pa."""
    assert Pressure(AT_20).raw(3.0) == pytest.approx(29367.20445640925, rel=1e-9)
    assert Pressure(AT_20).convert(29367.20445640925).level == pytest.approx(3.0, rel=1e-9)


def test_250_millibar_are_not_the_same_depth_cold_and_warm() -> None:
    """2.55387 m at 20 degC, 2.59286 m at 60 degC; a density of 1000 kg/m3 reads 4.579 mm too low at 20 degC."""
    raw = 250 * MILLIBAR
    assert Pressure(AT_20).convert(raw).level == pytest.approx(2.553869235709006, rel=1e-9)
    assert Pressure(COLUMNS[60][0]).convert(raw).level == pytest.approx(2.5928614316970475, rel=1e-9)
    assert Pressure(1000.0).convert(raw).level == pytest.approx(2.553869 - 0.004579, abs=1e-6)


def test_half_a_transmitter_for_six_metres_of_water() -> None:
    """12 mA of 0-6 mH2O are 3 mH2O = 29419.95 Pa (conventional water, 1000 kg/m3: NIST SP 811 B.8)."""
    assert Pressure(1000.0).convert(29419.95).level == pytest.approx(3.0, rel=1e-9)


def test_the_barometer_is_taken_off_an_unvented_transmitter() -> None:
    """1 hPa unnoticed is 10.2155 mm; with the barometer known at all times, nothing is left of it."""
    blind = Pressure(AT_20, barometer=101_325.0)
    raw = blind.raw(1.5)
    moved = blind.convert(raw + HECTOPASCAL).level
    assert moved is not None
    assert moved - 1.5 == pytest.approx(0.0102154769, abs=1e-9)
    sensor = Compensated(
        lambda kelvin, pascal: Pressure(density(kelvin), barometer=pascal),
        {"water temperature": 288.15, "air pressure": None},
    )
    assert sensor({"air pressure": 101_425.0, "water temperature": 293.15}).convert(
        raw + HECTOPASCAL
    ).level == pytest.approx(1.5, rel=5e-5)


def test_the_mounting_height_is_added() -> None:
    """A transmitter 0.20 m above the lowest point sees 0.20 m less."""
    sensor = Pressure(AT_20, mounted_at=0.2)
    assert sensor.convert(0.0).level == 0.2
    assert sensor.convert(9789.0681521364).level == pytest.approx(1.2, rel=1e-9)
