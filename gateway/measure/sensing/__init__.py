"""Ways to sense: one small file a method. `SENSES` is the whole list, with those that arrive later.

To add a method: write its file, with formula, units and source in the docstring; name it here; build it in
`gateway.settings.assemble`.
"""

from dataclasses import dataclass

from rules.quantity import Dimension


@dataclass(frozen=True, slots=True)
class Sense:
    """What a method's raw value can be. A method without dimensions sends words."""

    raw: tuple[Dimension, ...]
    unit: str  # of the raw value, where the settings do not say
    supported: bool = True


SENSES: dict[str, Sense] = {
    "level": Sense((Dimension.LENGTH, Dimension.SHARE, Dimension.VOLUME), "m"),
    "distance": Sense((Dimension.LENGTH,), "m"),
    "echo time": Sense((Dimension.TIME,), "s", supported=False),
    "pressure": Sense((Dimension.PRESSURE,), "Pa", supported=False),
    "current": Sense((Dimension.CURRENT,), "mA"),
    "voltage": Sense((Dimension.VOLTAGE,), "V", supported=False),
    "capacitance": Sense((Dimension.CAPACITANCE,), "F"),
    "frequency": Sense((Dimension.FREQUENCY,), "Hz"),
    "charge time": Sense((Dimension.TIME,), "s", supported=False),
    "charge voltage": Sense((Dimension.VOLTAGE,), "V", supported=False),
    "admittance": Sense((Dimension.CONDUCTANCE, Dimension.RESISTANCE), "S", supported=False),
    "contact": Sense((), ""),
    "temperature": Sense((Dimension.TEMPERATURE,), "degC", supported=False),
}
