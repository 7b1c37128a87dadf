"""How old a reading is that carries its own time, and whether it is news at all.

A device's clock may be wrong. Where the device does not store readings, only the order of its times counts, and how
much longer a reading took than the quickest of late: the smallest difference between arrival and own time is the
clock's offset plus the shortest way, so what exceeds it is delay. Where it does store them (`buffers`), its clock must
be right, and the age is the plain difference. A reading that is no news moves nothing. Pure; all times in ns.
"""

from typing import Any, NamedTuple

SECOND = 1_000_000_000
AHEAD = 60 * SECOND  # how far a clock that must be right may be ahead of ours
QUICKEST_OF = 1800 * SECOND  # the offset is the smallest difference of the last one to two such stretches
IN_A_ROW = 3  # readings in the order of time that make a clock that went back believed


class Verdict(NamedTuple):
    """`age` in ns of a reading that is news; else None, and why not."""

    age: int | None
    reason: str | None = None


class Ages:
    """The own times of one sensor. `buffers`: it stores and forwards, so its clock must be right."""

    __slots__ = ("_back", "_begun", "_newest", "_quickest", "_quickest_before", "buffers", "old", "refused")

    def __init__(self, *, buffers: bool, old: int) -> None:
        self.buffers = buffers
        self.old = old  # ns; a reading that is older is history
        self.refused = {"duplicate": 0, "older": 0, "late": 0, "future": 0}
        self._newest: int | None = None
        self._back: list[int] = []  # times of late in order, since the clock seems to have gone back
        self._begun = 0
        self._quickest: int | None = None
        self._quickest_before: int | None = None

    @property
    def offset(self) -> int | None:
        """How far our clock is ahead of the device's, the shortest way included; None before the first reading."""
        found = [one for one in (self._quickest, self._quickest_before) if one is not None]
        return min(found, default=None)

    def take(self, arrived: int, own: int) -> Verdict:
        """Judge a reading of the device's time `own` that arrived at `arrived` by our wall clock."""
        newest = self._newest
        if newest is not None and own <= newest and not self._is_new_order(own):
            kind = "duplicate" if own == newest else "older"
            words = "it has come before" if own == newest else "a newer one has come before it"
            return self._refuse(kind, words)
        difference = arrived - own
        if self.buffers:
            return self._by_its_clock(difference, own)
        self._measure(arrived, difference)
        self._newest, self._back = own, []
        age = difference - (self.offset or 0)
        if age > self.old:
            return self._refuse("late", f"it has been under way for {age / SECOND:.0f} s")
        return Verdict(age)

    def _by_its_clock(self, difference: int, own: int) -> Verdict:
        if difference < -AHEAD:
            return self._refuse("future", f"its own time is {-difference / SECOND:.0f} s ahead of ours")
        self._newest = own
        self._quickest = difference
        if difference > self.old:
            return self._refuse("late", f"its own time is {difference / SECOND:.0f} s ago")
        return Verdict(max(0, difference))

    def _is_new_order(self, own: int) -> bool:
        """Return whether the device's clock has gone back, as after a restart of it, and goes on from there."""
        if self.buffers or own == self._newest:
            return False
        self._back = [*self._back, own] if not self._back or own > self._back[-1] else [own]
        if len(self._back) < IN_A_ROW:
            return False
        self._quickest = self._quickest_before = None
        return True

    def _measure(self, arrived: int, difference: int) -> None:
        if self._quickest is None or arrived - self._begun > QUICKEST_OF:
            self._quickest_before, self._quickest, self._begun = self._quickest, difference, arrived
        self._quickest = min(self._quickest, difference)

    def _refuse(self, kind: str, reason: str) -> Verdict:
        self.refused[kind] += 1
        return Verdict(None, reason)

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "newest": self._newest,
            "back": self._back,
            "quickest": [self._begun, self._quickest, self._quickest_before],
            "refused": dict(self.refused),
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self._newest, self._back = saved["newest"], saved["back"]
        self._begun, self._quickest, self._quickest_before = saved["quickest"]
        self.refused = dict(saved["refused"])
