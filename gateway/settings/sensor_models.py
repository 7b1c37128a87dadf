"""What a user can write of a sensor, key by key. Values are in SI units and nanoseconds once read."""

import re
from typing import TYPE_CHECKING, Annotated, Any, Literal

from pydantic import BeforeValidator, Field, model_validator

from gateway.measure.combine import WAYS
from gateway.measure.payloads.own_time import FORMS
from gateway.measure.sensing import SENSES
from gateway.settings.fields import (
    AnyQuantity,
    Dotted,
    Duration,
    Length,
    Name,
    Part,
    Payloads,
    PointerText,
    Size,
    Text,
    Topic,
    Unit,
    either,
    known,
    of,
)
from gateway.settings.units import read_as
from rules.quantity import Dimension, Quantity

Farad = Annotated[float, of(Dimension.CAPACITANCE)]
Ohm = Annotated[float, of(Dimension.RESISTANCE)]
Volt = Annotated[float, of(Dimension.VOLTAGE)]
Ampere = Annotated[float, of(Dimension.CURRENT)]
Hertz = Annotated[float, of(Dimension.FREQUENCY)]
Seconds = Annotated[float, of(Dimension.TIME)]
Kelvin = Annotated[float, of(Dimension.TEMPERATURE)]
Speed = Annotated[float, of(Dimension.SPEED)]
Density = Annotated[float, of(Dimension.DENSITY)]
Conductivity = Annotated[float, of(Dimension.CONDUCTIVITY)]
Medium = Literal["water"]


def _pairs(written: object) -> object:
    """Take each pair as a tuple, since strict reading tells lists and tuples apart."""
    if not isinstance(written, list):
        return written
    if len(written) < 2:
        raise ValueError("two points or more are needed; expected `[[raw, level], [raw, level]]`")
    return [tuple(pair) if isinstance(pair, list) else pair for pair in written]


Points = Annotated[list[tuple[AnyQuantity, Length]], BeforeValidator(_pairs)]


class Calibration(Part):
    """Pairs of what the sensor said and the level in m; `covers` is what the probe reaches."""

    points: Points
    fit: Literal["through", "smooth", "least squares"] = "through"
    covers: list[Length] | None = Field(default=None, min_length=2, max_length=2)

    @model_validator(mode="after")
    def _rising(self) -> "Calibration":
        if self.covers is not None and not self.covers[0] < self.covers[1]:
            raise ValueError("the first value of `covers` is the lower one")
        return self


class Alive(Part):
    """Where a sensor that sends only changes says whether it is alive."""

    topic: Topic
    field: PointerText | None = None
    payloads: Payloads = Field(default_factory=lambda: {"yes": "1", "no": "0"})


class OnChange(Part):
    """A sensor that sends only changes."""

    alive: Alive


class OwnTime(Part):
    """Where a payload says the time of its reading, and in which form."""

    field: PointerText
    as_: Annotated[str, known("form of time", dict.fromkeys(FORMS, True))] = Field(alias="as")


class Oscillator(Part):
    """How a frequency tells a capacitance; what stands beside the probe is taken off."""

    at: Hertz | None = None
    total: Farad | None = None
    resistor: Ohm | None = None
    supply: Volt | None = None
    upper: Volt | None = None
    lower: Volt | None = None
    charging: Ohm | None = None
    discharging: Ohm | None = None
    fixed: Farad = 0.0
    stray: Farad = 0.0

    @model_validator(mode="after")
    def _one_way(self) -> "Oscillator":
        given = {key for key in self.model_fields_set if key not in {"fixed", "stray"}}
        ways = ({"at", "total"}, {"resistor", "supply", "upper", "lower"}, {"charging", "discharging"})
        if given not in ways:
            told = ", or ".join(" and ".join(sorted(way)) for way in ways)
            raise ValueError(f"an oscillator is known by {told}")
        return self


class Charging(Part):
    """How a capacitance is charged: by a current, or through a resistor."""

    current: Ampere | None = None
    resistor: Ohm | None = None
    from_: Volt = Field(default=0.0, alias="from")
    to: Volt | None = None
    supply: Volt | None = None
    after: Seconds | None = None
    fixed: Farad = 0.0
    stray: Farad = 0.0

    @model_validator(mode="after")
    def _one_way(self) -> "Charging":
        if (self.current is None) == (self.resistor is None):
            raise ValueError("a capacitance is charged by a `current` or through a `resistor`")
        if self.resistor is not None and self.supply is None:
            raise ValueError("`supply` is missing: what charges through the resistor")
        return self


class Coating(Part):
    """What insulates a probe."""

    thickness: Size
    permittivity: Annotated[float, of(Dimension.NUMBER)]


class Probe(Part):
    """A capacitive probe by its dimensions; its lower end is at the sensor's `mounted_at`."""

    form: Literal["plates", "coaxial"]
    length: Size
    width: Size | None = None
    gap: Size | None = None
    rod: Size | None = None
    bore: Size | None = None
    coating: Coating | None = None
    medium: Medium | None = None
    permittivity: Annotated[float, of(Dimension.NUMBER)] | None = None
    conductivity: Conductivity = 0.0
    at: Kelvin = 293.15

    @model_validator(mode="after")
    def _measures(self) -> "Probe":
        needed = {"plates": {"width", "gap"}, "coaxial": {"rod", "bore"}}[self.form]
        given = {key for key in ("width", "gap", "rod", "bore") if getattr(self, key) is not None}
        if needed != given:
            raise ValueError(f"a probe of the form {self.form} has {' and '.join(sorted(needed))}")
        if (self.medium is None) == (self.permittivity is None):
            raise ValueError("the liquid is a `medium`, such as water, or has a `permittivity`")
        return self


class Compensate(Part):
    """What is made up for: the liquid's permittivity changes with its temperature."""

    with_: Dotted = Field(alias="with")
    medium: Medium
    at: Kelvin = 293.15


def _is_value(written: object) -> bool:
    return isinstance(written, Quantity | int | float) or re.match(r"\s*[-+]?\d", str(written)) is not None


def _felt(*wanted: Dimension) -> Any:
    """Return the type of what is felt: a value, or the name of a sensor that tells it."""
    value = Annotated[Quantity, BeforeValidator(lambda written: read_as(written, *wanted))]
    return either(value=(value, _is_value), sensor=(Dotted, lambda _: True))


if TYPE_CHECKING:
    Air = Quantity | str
    Barometer = Quantity | str
else:
    Air = _felt(Dimension.TEMPERATURE)
    Barometer = _felt(Dimension.PRESSURE)


def _angle(value: object) -> float:
    found = re.fullmatch(r"\s*(\d+(?:\.\d+)?)\s*(?:deg|°)\s*", str(value))
    if found is None or not float(found[1]) < 90:
        raise ValueError(f"`{value}` is no loss angle; expected less than `90 deg`")
    return float(found[1])


class Sensor(Part):
    """One source of raw readings on one topic."""

    topic: Topic
    field: PointerText | None = None
    senml: Text | None = None
    time: OwnTime | None = None
    buffers: bool = False
    senses: Annotated[str, known("way to sense", dict.fromkeys(SENSES, True))]
    unit: Unit | None = None
    calibration: Calibration | None = None
    probe: Probe | None = None
    oscillator: Oscillator | None = None
    charging: Charging | None = None
    excitation: Hertz | None = None
    loss_angle: Annotated[float, BeforeValidator(_angle)] | None = None
    compensate: Compensate | None = None
    mounted_at: Length | None = None
    blanking: Length | None = None
    span: list[AnyQuantity] | None = None
    signal: list[Volt] | None = Field(default=None, min_length=2, max_length=2)
    density: Density | None = None
    medium: Medium | None = None
    temperature: Air | None = None
    barometer: Barometer | None = None
    payloads: Payloads | None = None
    on_change: OnChange | None = None
    expect_every: Duration | None = None
    silent_after: Duration | None = None
    tolerate: Duration | None = None
    good_again: int | None = Field(default=None, ge=1, le=100)
    range: list[AnyQuantity] | None = None
    fastest: Speed | None = None
    frozen_after: Duration | None = None
    despike: int | None = Field(default=None, ge=3, le=99)
    lag: Duration | None = None


class Take(Part):
    """One level from several sensors."""

    take: Annotated[str, known("way to combine", dict.fromkeys(WAYS, True))]
    of: list[Name] = Field(min_length=2)
    need: int | None = Field(default=None, ge=1)
    agree_within: Size | None = None


if TYPE_CHECKING:
    Source = str | Take
else:
    Source = either(several=(Take, lambda written: isinstance(written, dict)), one=(Name, lambda _: True))
