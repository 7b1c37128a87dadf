"""The slope of a quantity over the latest stretch of time, by least squares, in constant time for each reading.

b = Σ(τ - τ̄)(y - ȳ) / Σ(τ - τ̄)², from running sums; the sums are made anew once in a while, so that what rounding adds
up stays far below what a sensor resolves. A reading far off the line is set aside; when the next one is off to the same
side, it was no spike, and both count. Source of the formula: ordinary least squares, any text on statistics.
"""

import math
from collections import deque
from typing import Any

SECOND = 1_000_000_000
MOST = 240  # samples kept: more of them in the same stretch of time would say no more
FEWEST = 3  # samples that make a line
ENOUGH = 4  # a line is told once the samples span this part (1/4) of the window
SPIKE = 5.0  # standard errors off the line
FLOOR = 3e-3  # m; what ripples and resolution may always be off


class Slope:
    """Times in ns, values in m, slopes in m/s."""

    __slots__ = ("_aside", "_over", "_since_anew", "_spacing", "_sums", "_window")

    def __init__(self, over: int) -> None:
        self._over = over
        self._spacing = over // MOST
        self._window: deque[tuple[int, float]] = deque()
        self._aside: tuple[int, float] | None = None
        self._sums = _Sums(0)
        self._since_anew = 0

    def take(self, t: int, y: float) -> None:
        """Take one sample; times do not run backwards."""
        window = self._window
        if window and t - window[-1][0] < self._spacing:
            return
        while window and window[0][0] < t - self._over:
            self._sums.less(*window.popleft())
        if self._off(t, y):
            aside, self._aside = self._aside, (t, y)
            if aside is None or (aside[1] > self._line(aside[0])) != (y > self._line(t)):
                return
            self._add(*aside)  # twice to the same side is no spike
        self._aside = None
        self._add(t, y)

    def _add(self, t: int, y: float) -> None:
        window = self._window
        window.append((t, y))
        self._since_anew += 1
        if self._since_anew > len(window) + 8:
            self._sums, self._since_anew = _Sums(window[0][0]), 0
            for sample in window:
                self._sums.more(*sample)
        else:
            self._sums.more(t, y)

    def _off(self, t: int, y: float) -> bool:
        """Return whether a sample is so far off the line that it may be a spike."""
        if len(self._window) < 2 * FEWEST or self.slope() is None:
            return False
        return abs(y - self._line(t)) > max(FLOOR, SPIKE * self._sums.error())

    def _line(self, t: int) -> float:
        return self._sums.at(t)

    def slope(self) -> float | None:
        """Return the slope, or None while the samples say too little."""
        window = self._window
        if len(window) < FEWEST or (window[-1][0] - window[0][0]) * ENOUGH < self._over:
            return None
        return self._sums.slope()

    @property
    def mean(self) -> float:
        """The mean of the samples, where the slope is that of the middle; NaN when there are none."""
        return self._sums.mean_y() if self._window else math.nan

    def forget(self) -> None:
        """Begin anew."""
        self._window.clear()
        self._aside, self._sums, self._since_anew = None, _Sums(0), 0

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "window": [list(sample) for sample in self._window],
            "aside": None if self._aside is None else list(self._aside),
            "sums": self._sums.save(),
            "since_anew": self._since_anew,
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self._window = deque((t, y) for t, y in saved["window"])
        self._aside = None if saved["aside"] is None else (saved["aside"][0], saved["aside"][1])
        self._sums = _Sums(*saved["sums"])
        self._since_anew = saved["since_anew"]


class _Sums:
    """Running sums over the samples, with time in seconds from `origin`."""

    __slots__ = ("n", "origin", "ty", "x", "xx", "y", "yy")

    def __init__(
        self, origin: int, n: int = 0, x: float = 0.0, y: float = 0.0, xx: float = 0.0, ty: float = 0.0, yy: float = 0.0
    ) -> None:
        self.origin, self.n, self.x, self.y, self.xx, self.ty, self.yy = origin, n, x, y, xx, ty, yy

    def more(self, t: int, y: float) -> None:
        if self.n == 0:
            self.origin = t
            self.x = self.y = self.xx = self.ty = self.yy = 0.0
        self._change(t, y, 1)

    def less(self, t: int, y: float) -> None:
        self._change(t, y, -1)

    def _change(self, t: int, y: float, sign: int) -> None:
        x = (t - self.origin) / SECOND
        self.n += sign
        self.x += sign * x
        self.y += sign * y
        self.xx += sign * x * x
        self.ty += sign * x * y
        self.yy += sign * y * y

    def mean_y(self) -> float:
        return self.y / self.n

    def slope(self) -> float | None:
        spread = self.xx - self.x * self.x / self.n
        return None if spread <= 0 else (self.ty - self.x * self.y / self.n) / spread

    def at(self, t: int) -> float:
        """Return the line's value at `t`."""
        return self.mean_y() + (self.slope() or 0.0) * ((t - self.origin) / SECOND - self.x / self.n)

    def error(self) -> float:
        """Return the standard error of a sample about the line."""
        slope = self.slope() or 0.0
        unexplained = (self.yy - self.y * self.y / self.n) - slope * (self.ty - self.x * self.y / self.n)
        return math.sqrt(max(0.0, unexplained) / max(1, self.n - 2))

    def save(self) -> list[Any]:
        return [self.origin, self.n, self.x, self.y, self.xx, self.ty, self.yy]
