"""How long to wait before dialing again: random, growing, capped.

Random, so that gateways that lost one broker together do not come back together; each wait is drawn evenly from the
upper half of a span that doubles with every failure.
"""

from collections.abc import Callable


class Backoff:
    """Counts failures in a row. `share` gives a random number in [0, 1)."""

    def __init__(self, first: int, most: int, share: Callable[[], float]) -> None:
        self._first = first
        self._most = most
        self._share = share
        self._failures = 0

    def wait(self) -> int:
        """Nanoseconds to wait after one more failure."""
        span = min(self._first << min(self._failures, 32), self._most)
        self._failures += 1
        return int(span * (0.5 + 0.5 * self._share()))

    def reset(self) -> None:
        """Forget the failures: a connection has proved itself."""
        self._failures = 0
