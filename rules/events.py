"""Everything that can happen to the engine.

Each event carries its time `t` in nanoseconds on a clock that never jumps. Events are immutable tuples, since one is
made for every reading.
"""

from typing import NamedTuple

from rules.model import Signal


class Started(NamedTuple):
    """The process has (re)started: `t` begins a new stretch of time; saved durations go on from where they stood."""

    t: int


class Signals(NamedTuple):
    """Signals have changed: (slot of the signal, its new state) pairs."""

    t: int
    changes: tuple[tuple[int, Signal], ...]


class LinkProven(NamedTuple):
    """Commands can be sent again, as the link has just proved itself."""

    t: int


class LinkLost(NamedTuple):
    """Commands cannot be sent until the link proves itself again."""

    t: int


class Passed(NamedTuple):
    """Time has passed: deadlines before `t` fire."""

    t: int


Event = Started | Signals | LinkProven | LinkLost | Passed
