"""Volumes in, out and spilled, added up by the hour, the day, the month and the season, in the site's own calendar.

Pure: which period an instant belongs to is asked of a calendar. All times are wall times in ns, volumes in m3.
"""

from collections.abc import Callable, Iterator
from typing import Any, NamedTuple

SECOND = 1_000_000_000
LONGEST_STEP = 600 * SECOND  # a longer pause is a gap: what flowed in it is not known

PERIODS = ("hour", "day", "month", "season")

Calendar = Callable[[int], tuple[tuple[str, ...], int]]
"""From an instant to the names of its periods, in the order of `PERIODS`, and the instant at which its hour ends."""


class Flows(NamedTuple):
    """What goes into a tank, out of it and over its brim, in m3/s; none is negative."""

    into: float
    out: float
    spilled: float


class Total(NamedTuple):
    """A period that has ended, by its name (`2026-05-01T13`, `2026-05-01`, `2026-05`, `2026 spring`)."""

    period: str
    name: str
    into: float
    out: float
    spilled: float


class Totals:
    """The running totals of one tank."""

    __slots__ = ("_at", "_hour_ends", "_names", "_sums", "calendar")

    def __init__(self, calendar: Calendar) -> None:
        self.calendar = calendar
        self._at: int | None = None  # up to when all is added up
        self._hour_ends = 0
        self._names: tuple[str, ...] = ()
        self._sums = [[0.0, 0.0, 0.0] for _ in PERIODS]

    def pause(self) -> None:
        """Know nothing of what flows until the next `add`."""
        self._at = None

    def add(self, at: int, flows: Flows) -> list[Total]:
        """Let `flows` have been since the time before, up to `at`; return the periods that have ended."""
        ended: list[Total] = []
        begin, self._at = self._at, at
        if not self._names or (begin is not None and at < begin):
            self._enter(at, ended)  # a clock that was put back begins another period, if at all
            return ended
        if begin is None or at - begin > LONGEST_STEP:
            if at >= self._hour_ends:
                self._enter(at, ended)
            return ended
        while at >= self._hour_ends:
            self._count(flows, self._hour_ends - begin)
            begin = self._hour_ends
            self._enter(begin, ended)
        self._count(flows, at - begin)
        return ended

    def _count(self, flows: Flows, nanoseconds: int) -> None:
        seconds = nanoseconds / SECOND
        for sums in self._sums:
            for index, flow in enumerate(flows):
                sums[index] += flow * seconds

    def _enter(self, at: int, ended: list[Total]) -> None:
        """Begin the periods of `at`, ending those that it does not belong to."""
        names, self._hour_ends = self.calendar(at)
        if self._names:
            ended += self._closed(names)
        self._names = names

    def _closed(self, names: tuple[str, ...]) -> Iterator[Total]:
        for index, (period, before, now) in enumerate(zip(PERIODS, self._names, names, strict=True)):
            if before != now:
                yield Total(period, before, *self._sums[index])
                self._sums[index] = [0.0, 0.0, 0.0]

    def running(self) -> dict[str, Total]:
        """Return the totals of the periods that are not over yet, by the kind of period."""
        return (
            {
                period: Total(period, name, *sums)
                for period, name, sums in zip(PERIODS, self._names, self._sums, strict=True)
            }
            if self._names
            else {}
        )

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [self._at, self._hour_ends, list(self._names), self._sums]

    def restore(self, saved: list[Any]) -> None:
        """Take up the state that `save` returned."""
        self._at, self._hour_ends, names, sums = saved
        self._names, self._sums = tuple(names), [list(one) for one in sums]
