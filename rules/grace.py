"""Start-up grace: for a short time after a start, unknown is tolerated, whatever rules say of it.

Grace already used within the last ten minutes is taken off, so that a gateway that restarts again and again cannot
live in grace. Time comes as a number.
"""

from rules.conditions.tree import SECOND

WINDOW = 600 * SECOND  # the stretch of time within which no more than one whole grace is granted


class Grace:
    """How much grace is granted at each start."""

    __slots__ = ("_used", "until", "whole")

    def __init__(self, whole: int) -> None:
        self.whole = whole
        self.until = 0
        self._used: list[tuple[int, int]] = []  # stretches of grace, oldest first

    def begin(self, t: int, now: int) -> int:
        """Start at `t`, the last thing known before being at `now`; return the grace that is granted."""
        self._close(now)
        if t < now:  # the machine was started anew: how long it was off is not known, and counts as nothing
            self._used = [(begin - now + t, end - now + t) for begin, end in self._used]
        self._used = [(begin, end) for begin, end in self._used if end > t - WINDOW]
        used = sum(end - max(begin, t - WINDOW) for begin, end in self._used)
        granted = max(0, self.whole - used)
        self.until = t + granted
        self._used.append((t, self.until))
        return granted

    def _close(self, now: int) -> None:
        """Cut the last stretch where the process ended."""
        if self._used:
            begin, end = self._used[-1]
            self._used[-1] = (begin, max(begin, min(end, now)))

    def save(self) -> list[list[int]]:
        """Return the state as plain JSON values."""
        return [[self.until, 0], *[list(stretch) for stretch in self._used]]

    def restore(self, saved: list[list[int]]) -> None:
        """Take up the state that `save` returned."""
        self.until = saved[0][0]
        self._used = [(begin, end) for begin, end in saved[1:]]
