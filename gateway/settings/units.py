"""Values with their units, as people write them: `1.40 m`, `80.6 kHz`, `2.4 l/s`, `3 m3`, `20 degC`, `85 %`.

Units are pint's; each is worked out once. What pint cannot read as people write it (`m3`, `%`, temperatures) is made to
work here.
"""

import math
import re
from functools import cache, lru_cache

import pint

from rules.quantity import Dimension, Quantity

SECOND = 1_000_000_000
LONGEST = 36_525 * 86_400  # s, 100 years: from now on, it stays within the 63 bits in which instants are kept

_VALUE = re.compile(r"\s*([-+]?[0-9]+(?:\.[0-9]+)?(?:[eE][-+]?[0-9]+)?)\s*(\S*)\s*", re.ASCII)
_UNIT = re.compile(r"[A-Za-zµμΩ°][A-Za-z0-9µμΩ°/*^]{0,20}")
_POWER = re.compile(r"(?<=[A-Za-zµμ])([23])(?![0-9A-Za-z])")  # m3 is a cubic metre, inH2O an inch of water
_FACTORS = 1e-200, 1e200  # a unit beyond is a slip, and its inverse would not be a number
_OFFSET = {"degC": (1.0, 273.15), "°C": (1.0, 273.15), "degF": (5 / 9, 459.67 * 5 / 9), "°F": (5 / 9, 459.67 * 5 / 9)}


@cache
def _registry() -> "pint.UnitRegistry[float]":
    return pint.UnitRegistry(cache_folder=None)


@cache
def _dimensions() -> dict[object, Dimension]:
    units = {d.unit.replace("m3", "m**3"): d for d in Dimension if d not in {Dimension.SHARE, Dimension.NUMBER}}
    return {_registry().Unit(unit).dimensionality: dimension for unit, dimension in units.items()}


@lru_cache(maxsize=1_000)
def _unit(text: str) -> tuple[float, Dimension]:
    """Return how many SI units one of `text` is, and of which dimension; raise ValueError for what is no unit."""
    if text == "%":
        return 0.01, Dimension.SHARE
    if not _UNIT.fullmatch(text):
        raise ValueError(f"`{text}` is not a unit")
    try:
        unit = _registry().Unit(_POWER.sub(r"**\1", text.replace("^", "**")))
        one, two = (1.0 * unit).to_base_units(), (2.0 * unit).to_base_units()
    except Exception as problem:  # pint raises many kinds, some of them of the parser beneath it
        raise ValueError(f"`{text}` is not a unit that is known here") from problem
    dimension = _dimensions().get(one.dimensionality)
    is_factor = math.isclose(two.magnitude, 2 * one.magnitude)  # neither a zero of its own nor a logarithm
    if dimension is None or not is_factor or not _FACTORS[0] < one.magnitude < _FACTORS[1]:
        raise ValueError(f"`{text}` is a unit of nothing that is measured here")
    return float(one.magnitude), dimension


def read(text: str) -> Quantity:
    """Return the value that `text` holds, in SI units; raise ValueError, with a sentence, when it holds none."""
    found = _VALUE.fullmatch(text)
    if found is None:
        raise ValueError(f"`{text}` is not a value with its unit, such as `1.40 m`")
    number, unit = float(found[1]), found[2]
    if not math.isfinite(number):
        raise ValueError(f"`{text}` is too large")
    if not unit:
        return Quantity(number, Dimension.NUMBER)
    if unit in _OFFSET:
        factor, zero = _OFFSET[unit]
        return Quantity(number * factor + zero, Dimension.TEMPERATURE)
    factor, dimension = _unit(unit)
    value = _times(number, factor)
    if not math.isfinite(value):
        raise ValueError(f"`{text}` is too large")
    if dimension is Dimension.TIME and abs(value) > LONGEST:
        raise ValueError(f"`{text}` is longer than 100 years")
    return Quantity(value, dimension)


def _times(number: float, factor: float) -> float:
    """Return the product as exactly as decimal people expect: 5 cm is 0.05 m, not 0.05 and some noise."""
    inverse = 1 / factor
    return (
        number / round(inverse) if inverse > 1 and abs(inverse - round(inverse)) < 1e-9 * inverse else number * factor
    )


_EXAMPLES = {
    Dimension.LENGTH: "1.40 m",
    Dimension.VOLUME: "3 m3",
    Dimension.TIME: "10 s",
    Dimension.FREQUENCY: "80.6 kHz",
    Dimension.CAPACITANCE: "84 pF",
    Dimension.CURRENT: "12 mA",
    Dimension.SHARE: "85 %",
}


def read_as(value: object, *wanted: Dimension) -> Quantity:
    """Return the value that `value` holds, of one of the `wanted` dimensions; raise ValueError when it is another."""
    kinds = " or ".join(dimension.words for dimension in wanted)
    example = _EXAMPLES.get(wanted[0], f"1 {wanted[0].unit}")
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise ValueError(f"expected {kinds} such as `{example}`")
    if not isinstance(value, str) and Dimension.NUMBER not in wanted:
        raise ValueError(f"`{value}` needs a unit; expected {kinds} such as `{example}`")
    quantity = read(str(value))
    if quantity.dimension is Dimension.NUMBER and Dimension.NUMBER not in wanted:
        raise ValueError(f"`{value}` needs a unit; expected {kinds} such as `{example}`")
    if quantity.dimension not in wanted:
        raise ValueError(f"`{value}` is {quantity.dimension.words}; expected {kinds} such as `{example}`")
    return quantity


def linear(unit: str) -> tuple[float, float, Dimension]:
    """Return the SI value of one `unit` over nothing of it, that of nothing, and the dimension.

    Only temperatures have a nothing that is not 0. Raises ValueError for what is no unit.
    """
    if unit in _OFFSET:
        return *_OFFSET[unit], Dimension.TEMPERATURE
    factor, dimension = _unit(unit)
    return factor, 0.0, dimension
