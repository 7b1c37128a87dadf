"""Ways to sense: one small file a method. `SENSES` is the whole list.

To add a method: write its file, with formula, units and source in the docstring; name it here, with the settings that
it uses; build it in `gateway.settings.sensing`.
"""

from dataclasses import dataclass

from rules.quantity import Dimension


@dataclass(frozen=True, slots=True)
class Sense:
    """What a method's raw value can be, and which settings it uses. A method without dimensions sends words."""

    raw: tuple[Dimension, ...]
    unit: str  # of the raw value, where the settings do not say
    uses: frozenset[str] = frozenset()  # of the keys that only some methods use


_NUMBERS = ("unit", "range", "fastest", "frozen_after", "despike", "lag")
_CAPACITIVE = ("calibration", "probe", "compensate", "mounted_at")


def _uses(*keys: str) -> frozenset[str]:
    return frozenset({*_NUMBERS, *keys})


SENSES: dict[str, Sense] = {
    "level": Sense((Dimension.LENGTH, Dimension.SHARE, Dimension.VOLUME), "m", _uses("calibration")),
    "distance": Sense((Dimension.LENGTH,), "m", _uses("mounted_at")),
    "echo time": Sense((Dimension.TIME,), "s", _uses("mounted_at", "temperature", "blanking")),
    "pressure": Sense(
        (Dimension.PRESSURE,), "Pa", _uses("density", "medium", "temperature", "mounted_at", "barometer")
    ),
    "current": Sense((Dimension.CURRENT,), "mA", _uses("span", "mounted_at", "density", "medium", "temperature")),
    "voltage": Sense((Dimension.VOLTAGE,), "V", _uses("span", "signal", "mounted_at")),
    "capacitance": Sense((Dimension.CAPACITANCE,), "F", _uses(*_CAPACITIVE)),
    "frequency": Sense((Dimension.FREQUENCY,), "Hz", _uses(*_CAPACITIVE, "oscillator")),
    "charge time": Sense((Dimension.TIME,), "s", _uses(*_CAPACITIVE, "charging")),
    "charge voltage": Sense((Dimension.VOLTAGE,), "V", _uses(*_CAPACITIVE, "charging")),
    "admittance": Sense(
        (Dimension.CONDUCTANCE, Dimension.RESISTANCE), "S", _uses(*_CAPACITIVE, "excitation", "loss_angle")
    ),
    "contact": Sense((), "", frozenset({"payloads", "mounted_at"})),
    "temperature": Sense((Dimension.TEMPERATURE,), "degC", _uses()),
}

ONLY_SOME_USE = frozenset().union(*(sense.uses for sense in SENSES.values()))
"""The keys of a sensor that only some methods use; with any other method they are refused."""
