"""What a pump really takes, estimated at every run from how the level moved before, during and after it.

flow = (inflow before + inflow after) / 2 - net flow during. The inflow is the net flow while no pump of the tank runs.
A run during which another pump starts or stops says nothing. Pure; flows in m3/s.
"""

from collections import deque
from typing import Any

KEPT = 5  # runs, of which the median counts


class PumpFlow:
    """The estimate for one pump."""

    __slots__ = ("_before", "_during", "_runs")

    def __init__(self) -> None:
        self._before: float | None = None
        self._during: float | None = None
        self._runs: deque[float] = deque(maxlen=KEPT)

    def started(self, inflow: float | None) -> None:
        """Let the pump start, alone, when so much flowed in; None: not known, or others run too."""
        self._before, self._during = inflow, None

    def stopped(self, net: float | None) -> None:
        """Let the pump stop; `net` is the net flow of the run so far, None when that says nothing."""
        self._during = net if self._before is not None else None

    def settled(self, inflow: float) -> float | None:
        """Let the inflow after the run be known; return the flow of that run, once for each run."""
        if self._before is None or self._during is None:
            return None
        flow = (self._before + inflow) / 2 - self._during
        self._before = self._during = None
        if flow > 0:
            self._runs.append(flow)
            return flow
        return None

    def disturbed(self) -> None:
        """Let something happen that makes this run say nothing."""
        self._before = self._during = None

    @property
    def flow(self) -> float | None:
        """The median of the latest runs, or None before the first."""
        ordered = sorted(self._runs)
        return ordered[len(ordered) // 2] if ordered else None

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [self._before, self._during, list(self._runs)]

    def restore(self, saved: list[Any]) -> None:
        """Take up the state that `save` returned."""
        self._before, self._during, runs = saved
        self._runs = deque(runs, maxlen=KEPT)
