"""Whether a level can be true after the one before: not faster than the tank can fill, and not the same for ever.

Pure; times in ns, levels in m.
"""

from typing import Any

SECOND = 1_000_000_000


class Plausible:
    """The latest level and raw value of one sensor. `fastest` in m/s, `frozen_after` in ns; None: not looked at."""

    __slots__ = ("_at", "_level", "_raw", "_same_since", "fastest", "frozen_after")

    def __init__(self, fastest: float | None, frozen_after: int | None) -> None:
        self.fastest = fastest
        self.frozen_after = frozen_after
        self._at: int | None = None
        self._level = 0.0
        self._raw: float | None = None
        self._same_since = 0

    def too_fast(self, t: int, level: float) -> str | None:
        """Return why a level cannot be true, or None.

        The longer ago the one before, the further it may be off; what the fastest change makes in a second is always
        allowed, for ripples.
        """
        if self.fastest is None or self._at is None:
            return None
        moved, seconds = abs(level - self._level), max(1.0, (t - self._at) / SECOND)
        if moved <= self.fastest * seconds:
            return None
        return f"{moved:.3g} m in {seconds:.3g} s is faster than {self.fastest * 1000:g} mm/s"

    def frozen(self, t: int, raw: float) -> str | None:
        """Return why a raw value is no measurement any more, or None: not one digit has changed for too long."""
        if raw != self._raw:
            self._raw, self._same_since = raw, t
            return None
        if self.frozen_after is None or t - self._same_since < self.frozen_after:
            return None
        return f"frozen: not one digit of change for {(t - self._same_since) / SECOND:.0f} s"

    def believe(self, t: int, level: float) -> None:
        """Let `level` be what the next one is compared with."""
        self._at, self._level = t, level

    def forget(self) -> None:
        """Compare the next level with nothing."""
        self._at = None

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [self._at, self._level, self._raw, self._same_since]

    def restore(self, saved: list[Any]) -> None:
        """Take up the state that `save` returned."""
        self._at, self._level, self._raw, self._same_since = saved
