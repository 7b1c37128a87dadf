"""A value from many readings of which some may be wrong: median, spread, and whether it stood still meanwhile. Pure.

Source: median absolute deviation with the scale of the normal distribution, 1.4826; any text on robust statistics.
"""

import math
from collections.abc import Sequence
from statistics import median
from typing import NamedTuple

from gateway.measure.validity.filters import SCALE

STEADY = 1e-4  # of the value: a drift below this is none, whatever the spread


class Steady(NamedTuple):
    """What readings come to. `spread` is a standard deviation; `drift` from the first half to the second."""

    value: float
    spread: float
    drift: float
    readings: int

    @property
    def is_steady(self) -> bool:
        """Whether the drift is no more than the spread explains: three standard errors of the difference."""
        half = max(1, self.readings // 2)
        return abs(self.drift) <= max(3 * self.spread * math.sqrt(2 / half), STEADY * abs(self.value))


def steady(values: Sequence[float]) -> Steady:
    """Return what the readings come to, oldest first. Raises ValueError for fewer than four."""
    if len(values) < 4:
        raise ValueError("four readings or more are needed")
    middle = median(values)
    half = len(values) // 2
    drift = median(values[half:]) - median(values[:half])
    # About each half's own median, so that a drift does not count as spread.
    off = [abs(value - median(part)) for part in (values[:half], values[half:]) for value in part]
    return Steady(middle, SCALE * median(off), drift, len(values))
