"""Ways to sense: one small file a method. `SENSES` is the whole list, with those that arrive later.

To add a method: write its file, with formula, units and source in the docstring; name it here; build it in
`gateway.settings.assemble`.
"""

from dataclasses import dataclass

from rules.quantity import Dimension


@dataclass(frozen=True, slots=True)
class Sense:
    """What a method's raw value can be, and which settings it uses. A method without dimensions sends words."""

    raw: tuple[Dimension, ...]
    unit: str  # of the raw value, where the settings do not say
    uses: frozenset[str] = frozenset()  # of the keys that only some methods use
    supported: bool = True


def _uses(*keys: str) -> frozenset[str]:
    return frozenset({"unit", "range", *keys})


SENSES: dict[str, Sense] = {
    "level": Sense((Dimension.LENGTH, Dimension.SHARE, Dimension.VOLUME), "m", _uses("calibration")),
    "distance": Sense((Dimension.LENGTH,), "m", _uses("mounted_at")),
    "echo time": Sense((Dimension.TIME,), "s", supported=False),
    "pressure": Sense((Dimension.PRESSURE,), "Pa", supported=False),
    "current": Sense((Dimension.CURRENT,), "mA", _uses("span", "mounted_at")),
    "voltage": Sense((Dimension.VOLTAGE,), "V", supported=False),
    "capacitance": Sense((Dimension.CAPACITANCE,), "F", _uses("calibration")),
    "frequency": Sense((Dimension.FREQUENCY,), "Hz", _uses("calibration")),
    "charge time": Sense((Dimension.TIME,), "s", supported=False),
    "charge voltage": Sense((Dimension.VOLTAGE,), "V", supported=False),
    "admittance": Sense((Dimension.CONDUCTANCE, Dimension.RESISTANCE), "S", supported=False),
    "contact": Sense((), "", frozenset({"payloads", "mounted_at"})),
    "temperature": Sense((Dimension.TEMPERATURE,), "degC", supported=False),
}

ONLY_SOME_USE = frozenset().union(*(sense.uses for sense in SENSES.values()))
"""The keys of a sensor that only some methods use; with any other method they are refused."""
