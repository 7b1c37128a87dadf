"""Whether a sensor's value can be used: a small state machine over what has come and what has not.

The behaviour is the table below. An accepted reading stands until the next accepted one, or until `silent_after` has
passed since it. A rejected reading leaves the last good one in use for `tolerate`, counted from the first rejected one
after it, so that more rejected ones win no time. With no last good one to fall back on, or when the device itself
signals its failure, it counts at once. After a failure `good_again` good readings in a row are needed, with no silence
between them; after a start or plain silence one. Time comes as a number.
"""

from enum import StrEnum
from typing import assert_never

from rules.model import Fault


class State(StrEnum):
    """What a sensor's value is worth."""

    AWAITED = "awaited"  # nothing since the start, or since the link was lost
    GOOD = "good"
    DOUBTFUL = "doubtful"  # rejected readings came lately; the last good one still stands
    FAILED = "failed"
    RECOVERING = "recovering"  # good readings again, but not enough of them yet
    SILENT = "silent"


class Happens(StrEnum):
    """What can happen to a sensor."""

    ACCEPTED = "accepted"
    REJECTED = "rejected"
    SIGNALLED = "signalled"  # the device itself says that it has failed
    TOO_LONG = "too long"  # the deadline of the state has passed: see `Judge.deadline`


_S, _H = State, Happens

TABLE: dict[tuple[State, Happens], State] = {
    (_S.AWAITED, _H.ACCEPTED): _S.GOOD,
    (_S.AWAITED, _H.REJECTED): _S.FAILED,  # no last good one stands
    (_S.AWAITED, _H.SIGNALLED): _S.FAILED,
    (_S.AWAITED, _H.TOO_LONG): _S.SILENT,
    (_S.GOOD, _H.ACCEPTED): _S.GOOD,
    (_S.GOOD, _H.REJECTED): _S.DOUBTFUL,  # failed at once where nothing is tolerated: see `Judge.happens`
    (_S.GOOD, _H.SIGNALLED): _S.FAILED,
    (_S.GOOD, _H.TOO_LONG): _S.SILENT,
    (_S.DOUBTFUL, _H.ACCEPTED): _S.GOOD,
    (_S.DOUBTFUL, _H.REJECTED): _S.DOUBTFUL,
    (_S.DOUBTFUL, _H.SIGNALLED): _S.FAILED,
    (_S.DOUBTFUL, _H.TOO_LONG): _S.FAILED,
    (_S.FAILED, _H.ACCEPTED): _S.RECOVERING,
    (_S.FAILED, _H.REJECTED): _S.FAILED,
    (_S.FAILED, _H.SIGNALLED): _S.FAILED,
    (_S.FAILED, _H.TOO_LONG): _S.FAILED,  # what failed and then fell silent has still failed
    (_S.RECOVERING, _H.ACCEPTED): _S.RECOVERING,  # until there are enough: see `Judge.happens`
    (_S.RECOVERING, _H.REJECTED): _S.FAILED,
    (_S.RECOVERING, _H.SIGNALLED): _S.FAILED,
    (_S.RECOVERING, _H.TOO_LONG): _S.FAILED,  # good readings with silence between them are not in a row
    (_S.SILENT, _H.ACCEPTED): _S.GOOD,
    (_S.SILENT, _H.REJECTED): _S.FAILED,
    (_S.SILENT, _H.SIGNALLED): _S.FAILED,
    (_S.SILENT, _H.TOO_LONG): _S.SILENT,
}

FAULTS = {
    State.AWAITED: Fault.AWAITED,
    State.GOOD: Fault.NONE,
    State.DOUBTFUL: Fault.NONE,
    State.FAILED: Fault.FAILED,
    State.RECOVERING: Fault.FAILED,
    State.SILENT: Fault.SILENT,
}


class Judge:
    """The state of one sensor's value. Times in ns; `silent_after` None: silence says nothing."""

    __slots__ = (
        "accepted_at",
        "deadline",
        "good_again",
        "in_a_row",
        "rejected_at",
        "silent_after",
        "state",
        "tolerate",
    )

    def __init__(self, silent_after: int | None, tolerate: int, good_again: int) -> None:
        self.silent_after = silent_after
        self.tolerate = tolerate
        self.good_again = good_again
        self.state = State.AWAITED
        self.accepted_at = 0  # or when the wait began
        self.rejected_at = 0  # the first of the rejected readings since the last good one
        self.in_a_row = 0
        self.deadline: int | None = None  # when the state next changes by itself

    def begin(self, t: int) -> None:
        """Wait for a first reading from `t` on."""
        self.state, self.accepted_at, self.in_a_row = State.AWAITED, t, 0
        self._plan()

    def happens(self, what: Happens, t: int) -> State:
        """Let something happen at `t`; return the new state."""
        before = self.state
        if before is State.GOOD and what is Happens.ACCEPTED:
            # The table says the same, faster: nearly all readings are this.
            self.accepted_at = t
            self.deadline = None if self.silent_after is None else t + self.silent_after
            return before
        self.state = TABLE[before, what]
        if what is Happens.ACCEPTED:
            self.accepted_at = t
            self.in_a_row += 1
            if self.state is State.RECOVERING and self.in_a_row >= self.good_again:
                self.state = State.GOOD
        else:
            self.in_a_row = 0
            if self.state is State.DOUBTFUL and before is State.GOOD:
                self.rejected_at = t
                if not self.tolerate:
                    self.state = State.FAILED
        self._plan()
        return self.state

    def _plan(self) -> None:
        """Find out when the state next changes by itself."""
        silent = None if self.silent_after is None else self.accepted_at + self.silent_after
        match self.state:
            case State.GOOD | State.AWAITED | State.RECOVERING:
                self.deadline = silent
            case State.DOUBTFUL:
                doubtful = self.rejected_at + self.tolerate
                self.deadline = doubtful if silent is None else min(silent, doubtful)
            case State.FAILED | State.SILENT:
                self.deadline = None
            case _:
                assert_never(self.state)

    def save(self) -> list[int | str | None]:
        """Return the state as plain JSON values."""
        return [self.state.value, self.accepted_at, self.rejected_at, self.in_a_row]

    def restore(self, saved: list[int | str | None]) -> None:
        """Take up the state that `save` returned."""
        state, accepted_at, rejected_at, in_a_row = saved
        self.state = State(str(state))
        self.accepted_at, self.rejected_at, self.in_a_row = (int(n or 0) for n in (accepted_at, rejected_at, in_a_row))
        self._plan()
