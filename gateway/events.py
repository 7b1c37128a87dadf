"""Everything that can happen to the plant. Given the same settings and the same events, the effects are the same.

Each event carries its time `t` in nanoseconds on a clock that never jumps (the boot-time clock of the machine). What
the wall clock said is `t` plus an offset, which is itself an input: it comes with the start and changes only by a
`ClockSet`. So a wall clock that jumps moves no timer.
"""

from typing import NamedTuple


class Start(NamedTuple):
    """The gateway has (re)started. `offset` is wall time (UTC, ns since 1970) minus `t`."""

    t: int
    offset: int


class Message(NamedTuple):
    """A message on a sensor's topic. A `late` one (see the link's transit bound) is journaled and moves nothing."""

    t: int
    topic: str
    payload: bytes
    retained: bool = False
    late: bool = False


class LinkUp(NamedTuple):
    """The link has proved itself: commands can go out, readings are live."""

    t: int


class LinkDown(NamedTuple):
    """The link is not proven any more, for the reason given."""

    t: int
    reason: str


class ClockSet(NamedTuple):
    """The wall clock and the steady clock have parted; `offset` is the new difference."""

    t: int
    offset: int


class Wake(NamedTuple):
    """Time has passed: deadlines before `t` fire."""

    t: int


class Stop(NamedTuple):
    """The gateway is being stopped in an orderly way."""

    t: int


Event = Start | Message | LinkUp | LinkDown | ClockSet | Wake | Stop
