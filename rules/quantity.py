"""Quantities: a number with its dimension, always in the dimension's SI unit. Nothing here converts or reads text."""

from enum import Enum
from typing import NamedTuple


class Dimension(Enum):
    """What kind of quantity a value is. The value of a member is its words for people and the SI unit it is held in."""

    LENGTH = ("a length", "m")
    VOLUME = ("a volume", "m3")
    SPEED = ("a rate of change of level", "m/s")
    FLOW = ("a flow", "m3/s")
    TIME = ("a time", "s")
    FREQUENCY = ("a frequency", "Hz")
    CAPACITANCE = ("a capacitance", "F")
    CURRENT = ("a current", "A")
    VOLTAGE = ("a voltage", "V")
    RESISTANCE = ("a resistance", "ohm")
    CONDUCTANCE = ("a conductance", "S")
    CONDUCTIVITY = ("a conductivity", "S/m")
    PRESSURE = ("a pressure", "Pa")
    DENSITY = ("a density", "kg/m3")
    TEMPERATURE = ("a temperature", "K")
    POWER = ("a power", "W")
    SHARE = ("a percentage", "%")  # held as a fraction: 85 % is 0.85
    NUMBER = ("a plain number", "")

    @property
    def words(self) -> str:
        """The dimension as people read it, with its article."""
        return str(self.value[0])

    @property
    def unit(self) -> str:
        """The unit that values of this dimension are held in."""
        return str(self.value[1])


class Quantity(NamedTuple):
    """A value with its dimension, in the dimension's SI unit."""

    value: float
    dimension: Dimension
