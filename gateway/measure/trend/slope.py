"""The slope of a quantity over the latest stretch of time, by least squares, in constant time for each reading.

b = Σ(τ - τ̄)(y - ȳ) / Σ(τ - τ̄)², from running sums; the sums are made anew once in a while, so that what rounding adds
up stays far below what a sensor resolves. A reading far off the line is set aside; when the next one is off to the same
side, it was no spike, and both count. Source of the formula: ordinary least squares, any text on statistics.
"""

import math
from array import array
from typing import Any

SECOND = 1_000_000_000
MOST = 240  # samples kept: more of them in the same stretch of time would say no more
FEWEST = 3  # samples that make a line
ENOUGH = 4  # a line is told once the samples span this part (1/4) of the window
SPIKE = 5.0  # standard errors off the line
_NOTHING = (0, 0.0, 0.0, 0.0, 0.0, 0.0)  # n, and the sums of x, y, x², xy, y²
FLOOR = 3e-3  # m; what ripples and resolution may always be off


class Slope:
    """Times in ns, values in m, slopes in m/s. Samples lie close together in memory, since a site has many tanks."""

    __slots__ = (
        "_anew_in",
        "_aside",
        "_error",
        "_first",
        "_mean_x",
        "_origin",
        "_over",
        "_slope",
        "_spacing",
        "_sums",
        "_times",
        "_values",
        "mean",
    )

    def __init__(self, over: int) -> None:
        self._over = over
        self._spacing = over // MOST
        self._times, self._values = array("q"), array("d")
        self._first = 0  # the oldest sample that counts
        self._aside: tuple[int, float] | None = None
        self._origin = 0  # the time from which the sums count
        self._sums = _NOTHING
        self._anew_in = 0  # samples until the sums are made anew
        self._mean_x = 0.0
        self.mean = math.nan  # of the samples, where the slope is that of the middle
        self._slope: float | None = None  # None: no two samples of different times
        self._error = 0.0  # the standard error of a sample about the line, in m

    def take(self, t: int, y: float) -> None:
        """Take one sample; times do not run backwards."""
        times, first = self._times, self._first
        if first < len(times):
            if t - times[-1] < self._spacing:
                return
            if times[first] < t - self._over:
                self._let_go(t - self._over)
            if self._slope is not None and self._sums[0] >= 2 * FEWEST and self._off(t, y):
                aside, self._aside = self._aside, (t, y)
                if aside is None or (aside[1] > self._at(aside[0])) != (y > self._at(t)):
                    self._fit()
                    return
                self._add(*aside)  # twice to the same side is no spike
        self._aside = None
        self._add(t, y)
        self._fit()

    def _let_go(self, oldest: int) -> None:
        """Let go of what is older than the window. The line stays as it was until the next sample."""
        times, values, first = self._times, self._values, self._first
        while first < len(times) and times[first] < oldest:
            self._count(times[first], values[first], -1)
            first += 1
        if first > MOST:
            del times[:first], values[:first]
            first = 0
        self._first = first

    def _off(self, t: int, y: float) -> bool:
        """Return whether a sample is so far off the line that it may be a spike."""
        return abs(y - self._at(t)) > max(FLOOR, SPIKE * self._error)

    def _at(self, t: int) -> float:
        """Return the line's value at `t`."""
        return self.mean + (self._slope or 0.0) * ((t - self._origin) / SECOND - self._mean_x)

    def _add(self, t: int, y: float) -> None:
        self._times.append(t)
        self._values.append(y)
        self._anew_in -= 1
        if self._anew_in >= 0 and self._sums[0]:
            self._count(t, y, 1)
            return
        times, values, first = self._times, self._values, self._first
        self._origin, self._sums = times[first], _NOTHING
        self._anew_in = 4 * (len(times) - first) + 8
        for index in range(first, len(times)):
            self._count(times[index], values[index], 1)

    def _count(self, t: int, y: float, sign: int) -> None:
        x = (t - self._origin) / SECOND
        n, sx, sy, sxx, sxy, syy = self._sums
        self._sums = (
            n + sign, sx + sign * x, sy + sign * y, sxx + sign * x * x, sxy + sign * x * y, syy + sign * y * y,
        )  # fmt: skip

    def _fit(self) -> None:
        """Work out the line from the sums."""
        n, sx, sy, sxx, sxy, syy = self._sums
        if not n:
            self._slope, self._error, self._mean_x, self.mean = None, 0.0, 0.0, math.nan
            return
        self._mean_x, self.mean = sx / n, sy / n
        spread, together = sxx - sx * sx / n, sxy - sx * sy / n
        if spread <= 0:
            self._slope = None
            return
        self._slope = slope = together / spread
        unexplained = syy - sy * sy / n - slope * together
        self._error = math.sqrt(unexplained / (n - 2)) if n > 2 and unexplained > 0 else 0.0

    def slope(self) -> float | None:
        """Return the slope, or None while the samples say too little."""
        times, first = self._times, self._first
        if len(times) - first < FEWEST or (times[-1] - times[first]) * ENOUGH < self._over:
            return None
        return self._slope

    def forget(self) -> None:
        """Begin anew."""
        del self._times[:], self._values[:]
        self._first, self._aside, self._anew_in, self._sums = 0, None, 0, _NOTHING
        self._fit()

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        first = self._first
        return {
            "times": list(self._times[first:]),
            "values": list(self._values[first:]),
            "aside": None if self._aside is None else list(self._aside),
            "sums": [self._origin, *self._sums],
            "anew_in": self._anew_in,
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self._times, self._values, self._first = array("q", saved["times"]), array("d", saved["values"]), 0
        self._aside = None if saved["aside"] is None else (saved["aside"][0], saved["aside"][1])
        self._origin, n, sx, sy, sxx, sxy, syy = saved["sums"]
        self._sums = (n, sx, sy, sxx, sxy, syy)
        self._anew_in = saved["anew_in"]
        self._fit()
