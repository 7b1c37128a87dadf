"""What makes a value calm: spikes are replaced by a median, ripples are smoothed by a first-order lag. Pure.

Both keep their own small state and cost the same whatever they are set to.
"""

import math
from bisect import bisect_left, insort
from collections import deque
from typing import Any

SCALE = 1.4826  # median absolute deviation → standard deviation of a normal distribution: 1/Φ⁻¹(3/4)
SIGMAS = 3.0
FLOOR = 2e-3  # m; in a calm window the deviation is nothing, and the smallest change would count as a spike


def hampel(window: list[float], value: float, floor: float = FLOOR) -> float:
    """Return `value`, or the median of the sorted `window` where it is a spike.

    A spike is further from the median than three times 1.4826 · MAD, and than `floor`. Source: the Hampel identifier
    (F. R. Hampel, 1974), as public manuals state it.
    """
    median = _median(window)
    deviation = abs(value - median)
    if deviation <= floor:
        return value
    spread = SCALE * _median(sorted(abs(one - median) for one in window))
    return median if deviation > SIGMAS * spread else value


def _median(ordered: list[float]) -> float:
    half = len(ordered) // 2
    return ordered[half] if len(ordered) % 2 else (ordered[half - 1] + ordered[half]) / 2


class Despike:
    """The latest `size` values, of which the newest is replaced by their median when it is a spike."""

    __slots__ = ("_ordered", "_recent", "size")

    def __init__(self, size: int) -> None:
        self.size = size
        self._recent: deque[float] = deque()
        self._ordered: list[float] = []

    def take(self, value: float) -> float:
        """Return the value to use; until there are `size` of them, that is the value itself."""
        if len(self._recent) == self.size:
            del self._ordered[bisect_left(self._ordered, self._recent.popleft())]
        self._recent.append(value)
        insort(self._ordered, value)
        return hampel(self._ordered, value) if len(self._recent) == self.size else value

    def forget(self) -> None:
        """Begin anew."""
        self._recent.clear()
        self._ordered.clear()

    def save(self) -> list[float]:
        """Return the state as plain JSON values."""
        return list(self._recent)

    def restore(self, saved: list[float]) -> None:
        """Take up the state that `save` returned."""
        self._recent, self._ordered = deque(saved), sorted(saved)


class Lag:
    """A first-order lag in its exact form for any distance of samples: y += (1 - e^(-Δt/τ)) · (x - y). Times in ns.

    Source: the solution of y' = (x - y)/τ for an x that is constant from the sample before to this one; so irregular
    samples do no harm.
    """

    __slots__ = ("_at", "_y", "tau")

    def __init__(self, tau: int) -> None:
        self.tau = tau
        self._at: int | None = None
        self._y = 0.0

    def take(self, t: int, value: float) -> float:
        """Return the smoothed value at `t`; the first is taken as it is."""
        if self._at is None:
            self._y = value
        else:
            self._y -= math.expm1(-(t - self._at) / self.tau) * (value - self._y)
        self._at = t
        return self._y

    def forget(self) -> None:
        """Begin anew."""
        self._at = None

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [self._at, self._y]

    def restore(self, saved: list[Any]) -> None:
        """Take up the state that `save` returned."""
        self._at, self._y = saved
