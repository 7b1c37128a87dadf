"""Echoes: the speed of sound against a standard and against real air, and the levels that follow."""

import pytest
from CoolProp.CoolProp import PropsSI

from gateway.measure.media.air import speed_of_sound
from gateway.measure.sensing.compensated import Compensated
from gateway.measure.sensing.echo_time import EchoTime
from gateway.measure.status import Status

FACE = 2.5  # m above the floor

# t in degC: m/s by ISO 9613-1:1993 formula A.5 (library pyfar 0.8.1, `speed_of_sound_simple`), of real dry air
# (CoolProp 8.0.0) and of air at 50 % relative humidity (Cramer, JASA 93(5), 1993, by pyfar; only from 0 to 30 degC).
SPEEDS = {
    -20: (318.9270059464253, 319.064, None),
    -10: (325.16516778625504, 325.315, None),
    0: (331.2858849407496, 331.441, 331.601),
    10: (337.2955510831529, 337.449, 337.779),
    20: (343.2, 343.344, 343.984),
    25: (346.11445449411104, 346.251, 347.124),
    30: (349.004571917779, 349.132, 350.307),
    40: (354.7141700567154, 354.817, None),
    50: (360.3333091160691, 360.405, None),
}

# Echo in s, air in degC, level in m, worked out beforehand by the standard's formula and gap = c·t/2.
ECHOES = [
    (5.000e-3, 20, 1.642),
    (5.000e-3, 0, 1.671785287648126),
    (5.000e-3, 40, 1.6132145748582114),
    (2.000e-3, 20, 2.1568),
    (14.000e-3, 20, 0.0976),
    (1.000e-3, 20, 2.3284),
]


@pytest.mark.parametrize("celsius", SPEEDS)
def test_the_speed_of_sound_is_the_one_of_the_standard(celsius: int) -> None:
    """To the digits of the other implementation."""
    assert speed_of_sound(celsius + 273.15) == pytest.approx(SPEEDS[celsius][0], rel=1e-9)


@pytest.mark.parametrize("celsius", SPEEDS)
def test_real_air_is_not_far_from_the_standard(celsius: int) -> None:
    """Dry air within 0.1 %, damp air within 0.4 %."""
    _, dry, damp = SPEEDS[celsius]
    assert speed_of_sound(celsius + 273.15) == pytest.approx(dry, rel=1e-3)
    assert damp is None or speed_of_sound(celsius + 273.15) == pytest.approx(damp, rel=4e-3)


@pytest.mark.parametrize("celsius", range(-40, 71, 10))
def test_the_speed_of_sound_holds_wherever_it_is_given(celsius: int) -> None:
    """Against CoolProp's dry air, asked live: within 0.1 % beyond the standard's own range too."""
    kelvin = celsius + 273.15
    assert speed_of_sound(kelvin) == pytest.approx(PropsSI("A", "T", kelvin, "P", 101_325.0, "Air"), rel=1e-3)


def test_sound_is_faster_by_a_sixth_of_a_percent_a_kelvin() -> None:
    """dc/c = dT / 2T = 0.1706 %/K at 20 degC, which follows from the square root."""
    change = (speed_of_sound(293.65) - speed_of_sound(292.65)) / speed_of_sound(293.15)
    assert change == pytest.approx(0.001706, abs=5e-7)


@pytest.mark.parametrize("kelvin", [220.0, 350.0, float("nan"), float("inf")])
def test_air_hotter_or_colder_than_any_tank_is_refused(kelvin: float) -> None:
    """In words."""
    with pytest.raises(ValueError, match="is outside -40 to 70 degC, for which the speed of sound is known"):
        speed_of_sound(kelvin)


@pytest.mark.parametrize(("echo", "celsius", "level"), ECHOES)
def test_an_echo_reads_as_its_level_and_back(echo: float, celsius: int, level: float) -> None:
    """To all digits."""
    sensor = EchoTime(FACE, speed_of_sound(celsius + 273.15))
    assert sensor.convert(echo).level == pytest.approx(level, abs=1e-9)
    assert sensor.raw(level) == pytest.approx(echo, rel=1e-9)


def test_the_wrong_temperature_is_an_inch_in_a_metre() -> None:
    """An echo of 5 ms at 0 degC, taken for one at 20 degC, reads 29.79 mm too low (worked out beforehand)."""
    levels = [EchoTime(FACE, speed_of_sound(kelvin)).convert(5e-3).level for kelvin in (273.15, 293.15)]
    assert levels[0] is not None
    assert levels[1] is not None
    assert levels[0] - levels[1] == pytest.approx(0.02979, abs=5e-6)


def test_the_air_can_be_measured_while_it_changes() -> None:
    """With the temperature at hand, the echoes of the table read as their levels."""
    sensor = Compensated(lambda kelvin: EchoTime(FACE, speed_of_sound(kelvin)), {"air temperature": None})
    for echo, celsius, level in ECHOES:
        assert sensor({"air temperature": celsius + 273.15}).convert(echo).level == pytest.approx(level, abs=1e-9)


def test_inside_the_blanking_distance_nothing_is_measured() -> None:
    """An echo of 1 ms at 20 degC is a gap of 0.17 m: with a blanking distance of 0.25 m, a failure and no level."""
    sensor = EchoTime(FACE, speed_of_sound(293.15), blanking=0.25)
    assert sensor.convert(1e-3) == (None, Status.FAILURE, "inside the blanking distance", False, False)
    assert sensor.convert(2e-3).level == pytest.approx(2.1568)
    assert sensor.convert(sensor.raw(2.25)).level == pytest.approx(2.25)
    with pytest.raises(ValueError, match=r"no echo comes from a level of 2.3284 m"):
        sensor.raw(2.3284)
