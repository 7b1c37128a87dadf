"""Methods of physics: each converts any float without raising, goes one way, and its inverse is its inverse."""

import math
from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.calibration import Line
from gateway.measure.media import water
from gateway.measure.media.air import speed_of_sound
from gateway.measure.probe import Coating, Liquid, Probe, coaxial, plates
from gateway.measure.reading import convert
from gateway.measure.sensing import charge_time, charge_voltage
from gateway.measure.sensing.admittance import Admittance, Impedance
from gateway.measure.sensing.circuit import ByCapacitance, Circuit, Net
from gateway.measure.sensing.compensated import Compensated
from gateway.measure.sensing.echo_time import EchoTime
from gateway.measure.sensing.method import Method
from gateway.measure.sensing.oscillator import known_pair, schmitt_trigger, timer_555
from gateway.measure.sensing.pressure import Pressure
from gateway.measure.sensing.temperature import Temperature
from gateway.measure.sensing.voltage import Voltage
from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.status import Status

PROBE = Probe(coaxial(0.004, 0.5, Coating(0.001, 2.1)), 2.0, Liquid(80.2, 0.05), 1e4)
CIRCUITS: dict[str, Circuit] = {
    "oscillator": known_pair(80.6e3, 84.4e-12),
    "trigger": schmitt_trigger(100e3, 5.0, 3.0, 2.2),
    "timer": timer_555(10e3, 68e3),
    "charge time by current": charge_time.ByCurrent(5.5e-6, 1.2),
    "charge time through a resistor": charge_time.ThroughResistor(1e6, 3.3, 0.2, 2.0),
    "charge voltage by current": charge_voltage.ByCurrent(5.5e-6, 20e-6),
    "charge voltage through a resistor": charge_voltage.ThroughResistor(100e3, 3.3, 47e-6),
    "admittance": Admittance(10e3, math.radians(85)),
    "impedance": Impedance(Admittance(10e3)),
}
METHODS: dict[str, Method] = {
    "echo time": EchoTime(2.5, 343.2, blanking=0.25),
    "pressure": Pressure(998.2),
    "pressure, absolute": Pressure(998.2, mounted_at=-0.1, barometer=101_325.0),
    "voltage": Voltage((0.0, 10.0), 0.0, 2.1),
    "voltage, as a distance": Voltage((1.0, 5.0), 2.5, 0.25, mounted_at=2.5),
    "temperature": Temperature(),
    **{name: ByCapacitance(Net(circuit, 52e-12), PROBE.line()) for name, circuit in CIRCUITS.items()},
}
# What falls as the level rises.
FALLING = {
    "echo time", "oscillator", "trigger", "timer", "charge voltage by current", "charge voltage through a resistor",
    "impedance",
}  # fmt: skip
LEVELS = st.floats(0.01, 2.0)
ODD = [0.0, -0.0, 5e-324, -5e-324, 1.7e308, -1.7e308, math.nan, math.inf, -math.inf]


@pytest.mark.parametrize("name", METHODS)
@given(level=LEVELS)
def test_the_inverse_of_the_inverse(name: str, level: float) -> None:
    """The raw value of a level reads as that level."""
    method = METHODS[name]
    assert method.convert(method.raw(level)).level == pytest.approx(level, abs=1e-9)


@pytest.mark.parametrize("name", METHODS)
@given(one=LEVELS, other=LEVELS)
def test_the_raw_value_goes_one_way_with_the_level(name: str, one: float, other: float) -> None:
    """Monotone: a higher level never reads as a lower one, in either direction."""
    method = METHODS[name]
    low, high = sorted((one, other))
    raws = method.raw(low), method.raw(high)
    assert raws[0] >= raws[1] if name in FALLING else raws[0] <= raws[1]


@pytest.mark.parametrize("name", METHODS)
@given(one=st.floats(allow_nan=False), other=st.floats(allow_nan=False))
def test_the_level_goes_one_way_with_the_raw_value(name: str, one: float, other: float) -> None:
    """Monotone over all raw values that mean a level at all."""
    found = [METHODS[name].convert(raw).level for raw in sorted((one, other), reverse=name in FALLING)]
    if found[0] is not None and found[1] is not None and math.isfinite(found[0]) and math.isfinite(found[1]):
        assert found[0] <= found[1]


def _without_raising(method: Method, raw: float) -> None:
    bare = method.convert(raw)
    assert (bare.level is None) == (bare.status is Status.FAILURE)
    found = convert(SensorPlan(name="x", topic="t", unit="u", method=method), method, raw)
    assert found.level is None or math.isfinite(found.level)
    assert (found.reason is None) == (found.status is Status.GOOD)
    assert (found.level is None) == (found.status is Status.FAILURE)


@pytest.mark.parametrize("name", METHODS)
@given(raw=st.floats())
def test_any_float_converts_to_a_level_or_to_a_reason(name: str, raw: float) -> None:
    """Total, by itself and behind the sensor, which lets no endless level through."""
    _without_raising(METHODS[name], raw)


@pytest.mark.parametrize("name", METHODS)
@pytest.mark.parametrize("raw", ODD)
def test_the_oddest_floats_convert_to_a_level_or_to_a_reason(name: str, raw: float) -> None:
    """Both zeros, the smallest, the largest, and what is no number."""
    _without_raising(METHODS[name], raw)


# What nothing, or less, means to each circuit, and at which level nothing more can be told.
NOTHING = {
    "oscillator": "the oscillator stands still",
    "charge time by current": "nothing charges in 0 s",
    "charge time through a resistor": "nothing charges in 0 s",
    "charge voltage by current": "no charge arrives at the probe",
    "charge voltage through a resistor": "no charge arrives at the probe",
    "admittance": "no current flows through the probe",
    "impedance": "the probe is shorted",
    "echo time": "there is no echo",
}


@pytest.mark.parametrize("name", NOTHING)
def test_nothing_is_no_measurement(name: str) -> None:
    """A broken wire is a failure, with a reason, never an empty or a full tank."""
    assert METHODS[name].convert(0.0)[:3] == (None, Status.FAILURE, NOTHING[name])
    assert METHODS[name].convert(-1.0).status is Status.FAILURE


@pytest.mark.parametrize("name", CIRCUITS)
def test_no_raw_value_belongs_to_less_than_no_capacitance(name: str) -> None:
    """Far below the probe the inverse has nothing to say, and says so."""
    with pytest.raises(ValueError, match="no capacitor has"):
        METHODS[name].raw(-100.0)


def test_a_probe_that_is_charged_up_tells_nothing() -> None:
    """At the supply, and above it, the time was too long."""
    for raw in (3.3, 5.0):
        assert METHODS["charge voltage through a resistor"].convert(raw).reason == (
            "the probe is charged up before it is measured; choose a shorter time"
        )


PROBES = {
    "plates": Probe(plates(0.02, 0.004), 1.2, Liquid(2.2), 1e5, mounted_at=0.1),
    "coated plates": Probe(plates(0.02, 0.004, Coating(0.0005, 3.0)), 1.2, Liquid(80.0, 0.05), 1e4),
    "rod": PROBE,
}


@pytest.mark.parametrize("name", PROBES)
@given(level=st.floats(-1, 3))
def test_a_probe_and_its_line_are_inverse(name: str, level: float) -> None:
    """The capacitance of a level reads as that level, and the wet end is above the dry one."""
    probe = PROBES[name]
    assert probe.line().level(probe.line().x(level)) == pytest.approx(level, abs=1e-9)
    assert probe.wet > probe.dry > 0
    assert probe.slope * probe.length == pytest.approx(probe.wet - probe.dry)


@pytest.mark.parametrize("of", [water.density, water.permittivity, speed_of_sound])
@given(kelvin=st.floats())
def test_a_property_is_a_number_or_a_sentence(of: Callable[[float], float], kelvin: float) -> None:
    """For any temperature, NaN included; nothing else is raised."""
    try:
        assert math.isfinite(of(kelvin))
    except ValueError as problem:
        assert "is known" in str(problem)  # noqa: PT017 - either is right


def test_nothing_is_colder_than_absolute_zero() -> None:
    """A thermometer that says so is broken."""
    assert Temperature().convert(-1.0)[:3] == (None, Status.FAILURE, "below absolute zero")
    assert Temperature().convert(293.15).level == 293.15


# ---- surroundings ---------------------------------------------------------------------------------------------------

ECHO = Compensated(lambda kelvin: EchoTime(2.5, speed_of_sound(kelvin)), {"air temperature": None})
UNVENTED = Compensated(
    lambda kelvin, pascal: Pressure(water.density(kelvin), barometer=pascal),
    {"water temperature": 288.15, "air pressure": None},
)


def test_without_what_it_needs_there_is_no_level() -> None:
    """And no raw value to simulate either; both say why."""
    assert ECHO({}).convert(5e-3)[:3] == (None, Status.FAILURE, "there is no level without the air temperature")
    with pytest.raises(ValueError, match="no raw value belongs to a level of 1 m: there is no level without the air"):
        ECHO({}).raw(1.0)


def test_a_usual_value_is_taken_until_it_is_felt() -> None:
    """And only for what has one; what else is felt does not matter."""
    assert UNVENTED({"water temperature": 288.15}).convert(1.2e5).level is None
    usual = UNVENTED({"air pressure": 1e5, "wind": 3.0})
    assert usual == UNVENTED({"air pressure": 1e5, "water temperature": 288.15})
    assert usual.convert(1.2e5).level == pytest.approx(20_000 / 9797.85, rel=1e-5)
    assert usual != UNVENTED({"air pressure": 1e5, "water temperature": 298.15})


@pytest.mark.parametrize("kelvin", [0.0, 1000.0, 1e308, math.inf, -math.inf, math.nan])
def test_surroundings_that_cannot_be_are_a_failure_with_a_reason(kelvin: float) -> None:
    """The sentence of what refused them; nothing is raised."""
    found = ECHO({"air temperature": kelvin}).convert(5e-3)
    assert found.status is Status.FAILURE
    assert found.reason is not None
    assert found.reason.endswith("is outside -40 to 70 degC, for which the speed of sound is known")


# ---- constants that cannot be ---------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "constants", [(0.0, 0.0, 0.0), (1000.0, 0.0, -1.0), (math.nan, 0.0, 0.0), (1000.0, 0.0, math.inf)]
)
def test_a_density_or_a_barometer_that_cannot_be_is_refused(constants: tuple[float, float, float]) -> None:
    """In words."""
    with pytest.raises(ValueError, match="a density is more than nothing"):
        Pressure(*constants)


@pytest.mark.parametrize("constants", [(0.0, 0.0), (math.inf, 0.0), (343.2, -0.1), (343.2, math.nan)])
def test_a_speed_or_a_blanking_distance_that_cannot_be_is_refused(constants: tuple[float, float]) -> None:
    """In words."""
    with pytest.raises(ValueError, match="a speed of sound is more than nothing"):
        EchoTime(2.5, *constants)


def test_a_line_of_a_probe_serves_every_circuit_alike() -> None:
    """The same level by every circuit."""
    for circuit in CIRCUITS.values():
        sensor = ByCapacitance(circuit, Line(50e-12, 0.0, 500e-12, 2.0))
        assert sensor.convert(circuit.raw(275e-12)).level == pytest.approx(1.0)
