"""From what the settings say of a sensor to the method that turns its raw values into levels.

Each function raises ValueError, with a sentence, for what is missing or does not fit.
"""

import math
from collections.abc import Callable, Mapping
from typing import NamedTuple, TypeVar

from gateway.measure.calibration import Curve, least_squares, through
from gateway.measure.media.air import speed_of_sound
from gateway.measure.media.water import density, permittivity
from gateway.measure.probe import Coating, Liquid, Probe, Scaled, coaxial, plates
from gateway.measure.sensing import SENSES, charge_time, charge_voltage
from gateway.measure.sensing.admittance import Admittance, Impedance
from gateway.measure.sensing.capacitance import Capacitance
from gateway.measure.sensing.circuit import ByCapacitance, Circuit, Net
from gateway.measure.sensing.compensated import Compensated, NoMethod
from gateway.measure.sensing.current import Current
from gateway.measure.sensing.distance import Distance
from gateway.measure.sensing.echo_time import EchoTime
from gateway.measure.sensing.frequency import Frequency
from gateway.measure.sensing.level import Level
from gateway.measure.sensing.method import Method
from gateway.measure.sensing.oscillator import Oscillator, known_pair, schmitt_trigger, timer_555
from gateway.measure.sensing.pressure import Pressure
from gateway.measure.sensing.temperature import Temperature
from gateway.measure.sensing.voltage import Voltage
from gateway.measure.shapes import Shape
from gateway.settings import sensor_models as models
from gateway.settings.units import linear
from rules.quantity import Dimension, Quantity

T = TypeVar("T")

USUAL_TEMPERATURE = 293.15  # K
USUAL_PRESSURE = 101_325.0  # Pa, the standard atmosphere
USUAL_FREQUENCY = 10e3  # Hz; at what a probe is measured where the settings do not say


class Surroundings(NamedTuple):
    """What a sensor's method may ask of its tank, and of the site: the full name of another sensor of some sense."""

    brim: float | None
    shape: Shape | None
    in_a_tank: bool
    sensor: Callable[[str, str], str]  # (name as written, sense) → full name; raises ValueError


class Built(NamedTuple):
    """A method; where it depends on other sensors, on which, and how it is made for what they say."""

    method: Method
    feels: Mapping[str, str]
    method_at: Callable[[Mapping[str, float]], Method] | None


def method_of(sensor: models.Sensor, around: Surroundings) -> Built:
    """Return how raw values become levels, or what else a sensor measures."""
    return _BUILDERS[sensor.senses](sensor, around)


def dimension_of(sensor: models.Sensor, *, in_a_tank: bool) -> Dimension:
    """Return what a sensor's value is: a level, unless it measures a temperature, or the air's pressure."""
    if sensor.senses == "temperature":
        return Dimension.TEMPERATURE
    return Dimension.PRESSURE if sensor.senses == "pressure" and not in_a_tank else Dimension.LENGTH


def needed(value: T | None, key: str) -> T:
    """Return a value that must be there."""
    if value is None:
        raise ValueError(f"`{key}` is missing; this way to sense needs it")
    return value


def _temperature_of(sensor: models.Sensor) -> Quantity | str:
    if sensor.temperature is None:
        raise ValueError("`temperature` is missing: the name of a sensor, or a value such as `15 degC`")
    return sensor.temperature


def _fixed(method: Method) -> Built:
    return Built(method, {}, None)


_Felt = Mapping[str, tuple[Quantity | str | None, str, float]]
"""What is felt, by name: the sensor or the value that the settings say, the sense of such a sensor, the usual value."""


def _following(build: Callable[..., Method], felt: _Felt, around: Surroundings) -> Built:
    """Return a method that follows what is felt."""
    feels = {what: around.sensor(said, sense) for what, (said, sense, _) in felt.items() if isinstance(said, str)}
    usual = {what: said.value if isinstance(said, Quantity) else usual for what, (said, _, usual) in felt.items()}
    made = Compensated(build, usual)
    method = made({})
    if isinstance(method, NoMethod):
        raise ValueError(method.reason)
    return Built(method, feels, made if feels else None)


# ---- from above, and by weight ----------------------------------------------------------------------------------


def _distance(sensor: models.Sensor, _: Surroundings) -> Built:
    return _fixed(Distance(needed(sensor.mounted_at, "mounted_at")))


def _echo_time(sensor: models.Sensor, around: Surroundings) -> Built:
    mounted_at, blanking = needed(sensor.mounted_at, "mounted_at"), sensor.blanking or 0.0
    air = _temperature_of(sensor)

    def build(kelvin: float) -> Method:
        return EchoTime(mounted_at, speed_of_sound(kelvin), blanking)

    return _following(build, {"temperature": (air, "temperature", USUAL_TEMPERATURE)}, around)


def _pressure(sensor: models.Sensor, around: Surroundings) -> Built:
    if not around.in_a_tank:
        return _fixed(Level())  # the air's pressure, for others to use
    outside = 0.0 if sensor.barometer is None else USUAL_PRESSURE
    felt: _Felt = {"barometer": (sensor.barometer, "pressure", outside)}
    weigh, temperature = _weight(sensor)

    def build(barometer: float, kelvin: float = USUAL_TEMPERATURE) -> Method:
        return Pressure(weigh(kelvin), sensor.mounted_at or 0.0, barometer)

    return _following(build, {**felt, **temperature}, around)


def _weight(sensor: models.Sensor) -> tuple[Callable[[float], float], _Felt]:
    """Return the liquid's density by temperature, and the temperature that is to be felt for it, if any."""
    if (sensor.density is None) == (sensor.medium is None):
        raise ValueError("the liquid's `density` is missing, or its `medium` (water) with its `temperature`")
    if sensor.density is not None:
        fixed = sensor.density
        return lambda _: fixed, {}
    temperature = _temperature_of(sensor)
    return density, {"temperature": (temperature, "temperature", USUAL_TEMPERATURE)}


# ---- standard signals -------------------------------------------------------------------------------------------


def _current(sensor: models.Sensor, around: Surroundings) -> Built:
    low, high = needed(sensor.span, "span")
    if low.dimension is Dimension.LENGTH:
        return _fixed(Current(low.value, high.value, sensor.mounted_at))
    weigh, temperature = _weight(sensor)

    def build(kelvin: float = USUAL_TEMPERATURE) -> Method:
        by_weight = Pressure(weigh(kelvin), sensor.mounted_at or 0.0)
        ends = [by_weight.convert(end.value).level for end in (low, high)]
        return Current(*[0.0 if end is None else end for end in ends])

    return _following(build, temperature, around)


def _voltage(sensor: models.Sensor, _: Surroundings) -> Built:
    low, high = needed(sensor.span, "span")
    first, last = needed(sensor.signal, "signal")
    return _fixed(Voltage((first, last), low.value, high.value, sensor.mounted_at))


def _level(sensor: models.Sensor, around: Surroundings) -> Built:
    """Return the method of a device that sends the level itself: as a length, a share of the brim, or a volume."""
    curve = None if sensor.calibration is None else _calibrated(sensor, lambda raw: raw.value, SENSES["level"].raw)
    dimension = linear(sensor.unit or "m")[2]
    if dimension is Dimension.SHARE:
        brim = needed(around.brim, "the tank's brim")
        return _fixed(Level(lambda share: share * brim, lambda level: level / brim, curve))
    if dimension is Dimension.VOLUME:
        shape = needed(around.shape, "the tank's shape")
        return _fixed(Level(shape.level, shape.volume, curve))
    return _fixed(Level(line=curve))


# ---- capacitance, in every way ------------------------------------------------------------------------------------


def _capacitance(sensor: models.Sensor, around: Surroundings) -> Built:
    return _capacitive(sensor, around, Capacitance, lambda raw: raw.value, (Dimension.CAPACITANCE,))


def _frequency(sensor: models.Sensor, around: Surroundings) -> Built:
    oscillator = sensor.oscillator
    if oscillator is None:
        if sensor.probe is not None:
            raise ValueError("`oscillator` is missing: without it a frequency tells no capacitance for the `probe`")
        return _capacitive(sensor, around, Frequency, lambda raw: 1 / raw.value, (Dimension.FREQUENCY,))
    return _through(sensor, around, Net(_oscillator(oscillator), oscillator.fixed + oscillator.stray))


def _oscillator(said: models.Oscillator) -> Oscillator:
    match said:
        case models.Oscillator(at=float(at), total=float(total)):
            return known_pair(at, total)
        case models.Oscillator(resistor=float(ohm), supply=float(supply), upper=float(upper), lower=float(lower)):
            return schmitt_trigger(ohm, supply, upper, lower)
        case _:
            return timer_555(needed(said.charging, "charging"), needed(said.discharging, "discharging"))


def _charge_time(sensor: models.Sensor, around: Surroundings) -> Built:
    said = needed(sensor.charging, "charging")
    to = needed(said.to, "to")
    circuit: Circuit
    if said.current is not None:
        circuit = charge_time.ByCurrent(said.current, to - said.from_)
    else:
        resistor, supply = needed(said.resistor, "resistor"), needed(said.supply, "supply")
        circuit = charge_time.ThroughResistor(resistor, supply, said.from_, to)
    return _through(sensor, around, Net(circuit, said.fixed + said.stray))


def _charge_voltage(sensor: models.Sensor, around: Surroundings) -> Built:
    said = needed(sensor.charging, "charging")
    after = needed(said.after, "after")
    circuit: Circuit
    if said.current is not None:
        circuit = charge_voltage.ByCurrent(said.current, after)
    else:
        resistor, supply = needed(said.resistor, "resistor"), needed(said.supply, "supply")
        circuit = charge_voltage.ThroughResistor(resistor, supply, after)
    return _through(sensor, around, Net(circuit, said.fixed + said.stray))


def _admittance(sensor: models.Sensor, around: Surroundings) -> Built:
    phase = math.radians(90 - (sensor.loss_angle or 0.0))
    admittance = Admittance(needed(sensor.excitation, "excitation"), phase)
    is_impedance = linear(sensor.unit or "S")[2] is Dimension.RESISTANCE
    return _through(sensor, around, Impedance(admittance) if is_impedance else admittance)


def _through(sensor: models.Sensor, around: Surroundings, circuit: Circuit) -> Built:
    """Return the method of a circuit; a point of its calibration is in its raw unit, or in farad."""

    def farad(raw: Quantity) -> float:
        return raw.value if raw.dimension is Dimension.CAPACITANCE else circuit.farad(raw.value)

    wanted = (*SENSES[sensor.senses].raw, Dimension.CAPACITANCE)
    return _capacitive(sensor, around, lambda curve: ByCapacitance(circuit, curve), farad, wanted)


def _capacitive(
    sensor: models.Sensor,
    around: Surroundings,
    make: Callable[[Curve], Method],
    x_of: Callable[[Quantity], float],
    wanted: tuple[Dimension, ...],
) -> Built:
    """Return the method with the curve of a calibration or of a probe's dimensions, compensated if asked for."""
    if (sensor.calibration is None) == (sensor.probe is None):
        raise ValueError("`calibration` is missing, or the dimensions of its `probe`; one of the two")
    if sensor.probe is not None:
        probe = probe_of(sensor)
        curve: Curve = probe.line()
        dry = probe.dry
    else:
        curve = _calibrated(sensor, x_of, wanted)
        dry = curve.x(sensor.mounted_at or 0.0)
    made_up = sensor.compensate
    if made_up is None:
        return _fixed(make(curve))
    then = permittivity(made_up.at)

    def build(kelvin: float) -> Method:
        return make(Scaled(curve, dry, (permittivity(kelvin) - 1) / (then - 1)))

    return _following(build, {"temperature": (made_up.with_, "temperature", made_up.at)}, around)


def _calibrated(sensor: models.Sensor, x_of: Callable[[Quantity], float], wanted: tuple[Dimension, ...]) -> Curve:
    """Return the curve through, or nearest to, the points of a calibration."""
    said = needed(sensor.calibration, "calibration")
    points = []
    for raw, level in said.points:
        if raw.dimension not in wanted:
            raise ValueError(f"a point of the calibration has {raw.dimension.words} where {wanted[0].words} belongs")
        if not raw.value > 0 and wanted[0] is not Dimension.LENGTH:
            raise ValueError("a raw value of the calibration is more than nothing")
        points.append((x_of(raw), level))
    return least_squares(points) if said.fit == "least squares" else through(points)


def probe_of(sensor: models.Sensor) -> Probe:
    """Return the model of a probe from its dimensions."""
    said = needed(sensor.probe, "probe")
    cover = said.coating
    coating = None if cover is None else Coating(cover.thickness, cover.permittivity)
    if said.form == "plates":
        electrodes = plates(needed(said.width, "width"), needed(said.gap, "gap"), coating)
    else:
        electrodes = coaxial(needed(said.rod, "rod"), needed(said.bore, "bore"), coating)
    epsilon = said.permittivity if said.permittivity is not None else permittivity(said.at)
    frequency = sensor.excitation or USUAL_FREQUENCY
    return Probe(electrodes, said.length, Liquid(epsilon, said.conductivity), frequency, sensor.mounted_at or 0.0)


def _temperature(sensor: models.Sensor, around: Surroundings) -> Built:
    del sensor, around
    return _fixed(Temperature())


_BUILDERS: dict[str, Callable[[models.Sensor, Surroundings], Built]] = {
    "level": _level,
    "distance": _distance,
    "echo time": _echo_time,
    "pressure": _pressure,
    "current": _current,
    "voltage": _voltage,
    "capacitance": _capacitance,
    "frequency": _frequency,
    "charge time": _charge_time,
    "charge voltage": _charge_voltage,
    "admittance": _admittance,
    "temperature": _temperature,
}
