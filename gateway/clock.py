"""The clocks: a steady one that never jumps, for everything that lasts, and the wall clock, for printing.

The steady clock counts from the machine's start and goes on while the machine sleeps, where the system has such a one.
The demo lets both run faster than life.
"""

import time

_BOOT = getattr(time, "CLOCK_BOOTTIME", time.CLOCK_MONOTONIC)


def steady() -> int:
    """Return nanoseconds since the machine's start."""
    return time.clock_gettime_ns(_BOOT)


class Clock:
    """The plant's clocks, `speed` times as fast as life from the moment of making on."""

    def __init__(self, speed: float = 1.0) -> None:
        self.speed = speed
        self._began = steady()
        self._wall_began = time.time_ns()

    def now(self) -> int:
        """Return the plant's steady time in ns."""
        now = steady()
        return now if self.speed == 1 else self._began + round((now - self._began) * self.speed)

    def wall(self) -> int:
        """Return the plant's wall time in ns since 1970, UTC."""
        now = time.time_ns()
        return now if self.speed == 1 else self._wall_began + round((now - self._wall_began) * self.speed)

    def seconds_until(self, t: int) -> float:
        """Return how many real seconds the plant's time `t` is away; 0 when it is past."""
        return max(0.0, (t - self.now()) / self.speed / 1e9)
