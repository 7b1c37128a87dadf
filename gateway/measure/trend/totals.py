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


class Total(NamedTuple):
    """A period that has ended, by its name (`2026-05-01T13`, `2026-05-01`, `2026-05`, `2026 spring`)."""

    period: str
    name: str
    into: float
    out: float
    spilled: float


_NOTHING = (0.0, 0.0, 0.0)


class Totals:
    """The running totals of one tank. Only the hour is counted; longer periods take it over when it ends."""

    __slots__ = ("_at", "_hour", "_hour_ends", "_longer", "_names", "calendar")

    def __init__(self, calendar: Calendar) -> None:
        self.calendar = calendar
        self._at: int | None = None  # up to when all is added up
        self._hour_ends = 0
        self._names: tuple[str, ...] = ()
        self._hour = _NOTHING
        self._longer = [_NOTHING for _ in PERIODS[1:]]

    def pause(self) -> None:
        """Know nothing of what flows until the next `add`."""
        self._at = None

    def add(self, at: int, into: float, out: float, spilled: float) -> list[Total]:
        """Let these flows (m3/s) have been since the time before, up to `at`; return the periods that have ended."""
        begin, self._at = self._at, at
        known = begin is not None and 0 <= at - begin <= LONGEST_STEP
        if known and at < self._hour_ends:  # nearly always
            self._count((at - (begin or 0)) / SECOND, into, out, spilled)
            return []
        ended: list[Total] = []
        if not known or begin is None:
            if at >= self._hour_ends or (begin is not None and at < begin):
                self._enter(at, ended)  # a clock that was put back begins another period, if at all
            return ended
        while at >= self._hour_ends:
            self._count((self._hour_ends - begin) / SECOND, into, out, spilled)
            begin = self._hour_ends
            self._enter(begin, ended)
        self._count((at - begin) / SECOND, into, out, spilled)
        return ended

    def _count(self, seconds: float, into: float, out: float, spilled: float) -> None:
        hour = self._hour
        self._hour = (hour[0] + into * seconds, hour[1] + out * seconds, hour[2] + spilled * seconds)

    def _enter(self, at: int, ended: list[Total]) -> None:
        """Begin the periods of `at`, ending those that it does not belong to."""
        names, self._hour_ends = self.calendar(at)
        if self._names:
            ended += self._closed(names)
        self._names = names

    def _closed(self, names: tuple[str, ...]) -> Iterator[Total]:
        if names[0] == self._names[0]:
            return
        yield Total(PERIODS[0], self._names[0], *self._hour)
        self._longer = [_sum(sums, self._hour) for sums in self._longer]
        self._hour = _NOTHING
        for index, period in enumerate(PERIODS[1:]):
            before, now = self._names[index + 1], names[index + 1]
            if before != now:
                yield Total(period, before, *self._longer[index])
                self._longer[index] = _NOTHING

    def running(self) -> dict[str, Total]:
        """Return the totals of the periods that are not over yet, by the kind of period."""
        sums = [self._hour, *(_sum(longer, self._hour) for longer in self._longer)]
        return {kind: Total(kind, name, *one) for kind, name, one in zip(PERIODS, self._names, sums, strict=False)}

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [self._at, self._hour_ends, list(self._names), list(self._hour), [list(one) for one in self._longer]]

    def restore(self, saved: list[Any]) -> None:
        """Take up the state that `save` returned."""
        self._at, self._hour_ends, names, hour, longer = saved
        self._names, self._hour = tuple(names), (hour[0], hour[1], hour[2])
        self._longer = [(one[0], one[1], one[2]) for one in longer]


def _sum(one: tuple[float, float, float], other: tuple[float, float, float]) -> tuple[float, float, float]:
    return (one[0] + other[0], one[1] + other[1], one[2] + other[2])
