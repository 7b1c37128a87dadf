"""Units against the factors of NIST and against the definitions that the SI rests on."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.settings.units import linear, read, read_as
from rules.quantity import Dimension

# Source: NIST Special Publication 811, Guide for the Use of the SI, appendix B.8, as carried by the public R package
# NISTunits 1.0.1: to pascal, with the digits printed there.
TO_PASCAL = {
    "psi": 6894.757,
    "bar": 1e5,
    "mbar": 100.0,
    "inH2O": 249.0889,
    "ftH2O": 2989.067,
    "mmH2O": 9.80665,
    "mH2O": 9806.65,
}

# Source: NIST SP 811, appendix B.8; exact by definition (international foot of 0.3048 m, US gallon of 231 cubic inches,
# litre of a cubic decimetre), from memory.
EXACT = {
    "in": (0.0254, Dimension.LENGTH),
    "ft": (0.3048, Dimension.LENGTH),
    "yd": (0.9144, Dimension.LENGTH),
    "gal": (231 * 0.0254**3, Dimension.VOLUME),
    "ft3": (0.3048**3, Dimension.VOLUME),
    "l": (1e-3, Dimension.VOLUME),
    "L": (1e-3, Dimension.VOLUME),
    "hl": (0.1, Dimension.VOLUME),
    "m3": (1.0, Dimension.VOLUME),
    "cm^3": (1e-6, Dimension.VOLUME),
    "l/s": (1e-3, Dimension.FLOW),
    "l/min": (1e-3 / 60, Dimension.FLOW),
    "m3/h": (1 / 3600, Dimension.FLOW),
    "mm/s": (1e-3, Dimension.SPEED),
    "mm": (1e-3, Dimension.LENGTH),
    "cm": (1e-2, Dimension.LENGTH),
    "min": (60.0, Dimension.TIME),
    "h": (3600.0, Dimension.TIME),
    "d": (86_400.0, Dimension.TIME),
    "ms": (1e-3, Dimension.TIME),
    "kHz": (1e3, Dimension.FREQUENCY),
    "MHz": (1e6, Dimension.FREQUENCY),
    "pF": (1e-12, Dimension.CAPACITANCE),
    "nF": (1e-9, Dimension.CAPACITANCE),
    "µF": (1e-6, Dimension.CAPACITANCE),
    "mA": (1e-3, Dimension.CURRENT),
    "mV": (1e-3, Dimension.VOLTAGE),
    "kohm": (1e3, Dimension.RESISTANCE),
    "mS": (1e-3, Dimension.CONDUCTANCE),
    "kg/m3": (1.0, Dimension.DENSITY),
    "g/cm3": (1e3, Dimension.DENSITY),
    "kW": (1e3, Dimension.POWER),
    "%": (0.01, Dimension.SHARE),
}


@pytest.mark.parametrize("unit", TO_PASCAL)
def test_pressures_as_nist_has_them(unit: str) -> None:
    """To the digits printed: seven."""
    found = read(f"1 {unit}")
    assert found.dimension is Dimension.PRESSURE
    assert found.value == pytest.approx(TO_PASCAL[unit], rel=2e-7)


@pytest.mark.parametrize("unit", EXACT)
def test_units_that_are_exact_by_definition(unit: str) -> None:
    """With and without a blank, and as a scale."""
    factor, dimension = EXACT[unit]
    for value, found in (read(f"1 {unit}"), read(f"1{unit}"), read(f" +1.0  {unit} ")):
        assert value == pytest.approx(factor, rel=1e-12)
        assert found is dimension
    scale, zero, kind = linear(unit)
    assert scale == pytest.approx(factor, rel=1e-12)
    assert (zero, kind) == (0.0, dimension)


# Source: the definition of the Celsius scale (0 degC = 273.15 K) and, for Fahrenheit, NIST SP 811 section B.8.
TEMPERATURES = {"0 degC": 273.15, "20 degC": 293.15, "32 degF": 273.15, "212 degF": 373.15, "-40 degF": 233.15}


@pytest.mark.parametrize("text", TEMPERATURES)
def test_temperatures_have_their_own_zero(text: str) -> None:
    """A temperature is more than a factor."""
    value, dimension = read(text)
    assert value == pytest.approx(TEMPERATURES[text], rel=1e-12)
    assert dimension is Dimension.TEMPERATURE


@pytest.mark.parametrize(("text", "value"), [("5 cm", 0.05), ("1.95 m", 1.95), ("110 mm", 0.11), ("85 %", 0.85)])
def test_a_decimal_is_the_number_that_people_expect(text: str, value: float) -> None:
    """The nearest float to what was written, without noise of the conversion."""
    assert read(text).value == value


@pytest.mark.parametrize(
    "text",
    [
        "", "m", "1,5 m", "1 m m", "1.5.5 m", "\u0661 m", "0x1 m", "1_0 m", "nan m", "inf m", "1 degRe", "1 dBm",
        "1 m^3*ym^20/m^20", "1e999 m", "1e308 km", "1 __import__", "1 m**2", "1 (m)", "1 m;m", "1 " + "m" * 40,
        "1 Wh/kg", "1 km^999",
    ],
)  # fmt: skip
def test_what_is_no_value_is_refused_in_words(text: str) -> None:
    """A ValueError with a sentence, whatever the library beneath would have raised or made of it."""
    with pytest.raises(ValueError, match=r"is not|is a unit of nothing|is too large"):
        read(text)


@given(st.text(max_size=30), st.sampled_from(["", "1 ", "1"]))
def test_any_text_ends_in_a_finite_value_or_a_sentence(text: str, before: str) -> None:
    """Nothing else is raised."""
    try:
        found = read(before + text)
    except ValueError:
        return
    assert math.isfinite(found.value)


@given(st.text(alphabet="mskgAVWFlhd%23*/^µ°C ", max_size=12))
def test_any_mixture_of_units_ends_in_a_finite_value_or_a_sentence(text: str) -> None:
    """The same for what is nearly a unit."""
    try:
        found = read(f"2.5 {text}")
    except ValueError:
        return
    assert math.isfinite(found.value)


@pytest.mark.parametrize(
    ("value", "sentence"), [(2, "`2` needs a unit"), ("2", "`2` needs a unit"), (True, "expected")]
)
def test_a_bare_number_is_not_guessed_at(value: object, sentence: str) -> None:
    """The sentence says which kind of unit is expected, with an example."""
    with pytest.raises(ValueError, match=rf"{sentence}.*a length such as `1.40 m`"):
        read_as(value, Dimension.LENGTH)
