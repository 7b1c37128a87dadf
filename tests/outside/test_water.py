"""Water: its permittivity and density against published formulas, and against a library of fluid properties."""

import pytest
from CoolProp.CoolProp import PropsSI

from gateway.measure.media.water import density, permittivity

ATMOSPHERE = 101_325.0  # Pa

# t in degC: the permittivity by Malmberg and Maryott (J. Res. NBS 56(1), 1956, RP 2641) and by IAPWS R8-97 (Release on
# the Static Dielectric Constant of Ordinary Water Substance, 1997; by the libraries iapws 1.5.5 and chemicals 1.5.2,
# which agree within 1e-5), both worked out beforehand.
PERMITTIVITIES = {
    0: (87.74, 87.9036),
    4: (86.15462656, 86.3092),
    10: (83.83177, 83.9745),
    15: (81.94549625, 82.0775),
    20: (80.10304, 80.2226),
    25: (78.30334375, 78.4085),
    30: (76.54535, 76.6340),
    40: (73.15024, 73.2006),
    50: (69.90925, 69.9161),
    60: (66.81392, 66.7745),
    80: (61.0264, 60.8980),
}

# t in degC: kg/m3 by IAPWS-95 (library iapws 1.5.5, at 0 degC the industrial formulation IF97), at 101.325 kPa.
DENSITIES = {
    0: 999.8443072530346,
    4: 999.9748691392585,
    5: 999.9666335452146,
    10: 999.7024701877399,
    15: 999.1026214670944,
    20: 998.2071504679393,
    25: 997.0476367603434,
    30: 995.6494539376666,
    40: 992.2163528731411,
    60: 983.1958242274022,
    80: 971.7903980965833,
}


@pytest.mark.parametrize("celsius", PERMITTIVITIES)
def test_the_permittivity_is_the_one_published_in_1956(celsius: int) -> None:
    """The polynomial to all its digits."""
    assert permittivity(celsius + 273.15) == pytest.approx(PERMITTIVITIES[celsius][0], rel=1e-9)


@pytest.mark.parametrize("celsius", PERMITTIVITIES)
def test_the_permittivity_agrees_with_the_release_of_1997(celsius: int) -> None:
    """Two independent measurements of water: within 0.3 %."""
    assert permittivity(celsius + 273.15) == pytest.approx(PERMITTIVITIES[celsius][1], rel=3e-3)


def test_two_more_figures_for_the_permittivity() -> None:
    """78.30 at 25 degC is in the abstract of 1956; 80.1 at 20.05 degC in the CRC Handbook's table of liquids."""
    assert permittivity(298.15) == pytest.approx(78.30, abs=0.01)
    assert permittivity(293.2) == pytest.approx(80.1, abs=0.05)


def test_the_permittivity_falls_by_nearly_half_a_percent_a_kelvin() -> None:
    """At 25 degC, -0.458 %/K (IAPWS R8-97): what a probe in clean water drifts by if nothing corrects it."""
    coefficient = (permittivity(298.65) - permittivity(297.65)) / permittivity(298.15)
    assert coefficient == pytest.approx(-0.00458, rel=0.01)


@pytest.mark.parametrize("celsius", DENSITIES)
def test_the_density_agrees_with_the_table(celsius: int) -> None:
    """Within 0.001 %: a hundredth of a millimetre in a metre of water."""
    assert density(celsius + 273.15) == pytest.approx(DENSITIES[celsius], rel=1e-5)


@pytest.mark.parametrize("celsius", range(1, 100, 7))
def test_the_density_agrees_with_a_library_of_fluid_properties(celsius: int) -> None:
    """CoolProp's equation of state for water, IAPWS-95, asked live: within 0.001 %."""
    kelvin = celsius + 273.15
    assert density(kelvin) == pytest.approx(PropsSI("D", "T", kelvin, "P", ATMOSPHERE, "Water"), rel=1e-5)


@pytest.mark.parametrize("kelvin", [271.0, 375.5, float("nan"), float("inf"), -float("inf")])
def test_no_value_is_made_up_where_water_is_no_liquid(kelvin: float) -> None:
    """Ice and steam are refused in words."""
    for of in (density, permittivity):
        with pytest.raises(ValueError, match="is outside -2 to 102 degC, for which water is known"):
            of(kelvin)


def test_a_thermometer_that_is_off_a_little_in_ice_water_still_counts() -> None:
    """At -0.4 degC as at 0 degC, nearly."""
    assert density(272.75) == pytest.approx(density(273.15), rel=5e-5)
    assert permittivity(272.75) == pytest.approx(permittivity(273.15), rel=3e-3)
