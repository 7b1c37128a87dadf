"""The state of one `for`.

`X for d` at `t` is the least that X was at any instant of the closed window [t - d, t]. Its state is three values: what
X is now, `f` the end of X's latest false stretch, `u` the end of its latest unknown stretch. On signals that are never
unknown this is the on-delay (TON) of IEC 61131-3 evaluated at its exact expiry.
"""

from collections.abc import Callable

from rules.truth import FALSE, TRUE, UNKNOWN

Evaluate = Callable[[int], int]


class Timer:
    """The state of one `for`."""

    __slots__ = ("duration", "false_end", "now", "part", "unknown_end")

    def __init__(self, part: Evaluate, duration: int) -> None:
        self.part = part
        self.duration = duration
        self.now: int = UNKNOWN
        self.false_end: int | None = None  # None: it never was false
        self.unknown_end: int | None = None

    def evaluate(self, t: int) -> int:
        """Return the least of the window that ends at `t`."""
        now = self.part(t)
        if now != self.now:
            if self.now == FALSE:
                self.false_end = t
            elif self.now == UNKNOWN:
                self.unknown_end = t
            self.now = now
        since = t - self.duration
        if now == FALSE or (self.false_end is not None and since < self.false_end):
            return FALSE
        if now == UNKNOWN or (self.unknown_end is not None and since < self.unknown_end):
            return UNKNOWN
        return TRUE

    def next_change(self, t: int) -> int | None:
        """Return when the answer may change by itself, after `t`."""
        if self.now == FALSE:
            return None
        if self.false_end is not None and (due := self.false_end + self.duration) > t:
            return due
        if self.now == TRUE and self.unknown_end is not None and (due := self.unknown_end + self.duration) > t:
            return due
        return None

    def begin(self, t: int) -> None:
        """Forget all: before `t` nothing is known."""
        self.now = UNKNOWN
        self.false_end, self.unknown_end = None, t

    def holding_since(self) -> int | None:
        """Return since when the part is true, or None."""
        if self.now != TRUE:
            return None
        return max((end for end in (self.false_end, self.unknown_end) if end is not None), default=None)
