"""Tanks by mass balance: what flows in less what flows out. Pure; time comes in steps, in seconds."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from gateway.measure.shapes import Shape

States = Mapping[str, str]  # actuator → the state it is in


@dataclass(frozen=True, slots=True, kw_only=True)
class Flow:
    """Water that moves at `rate` (m3/s) while `while_` is true of the actuators' states and the time (s).

    `source` or `sink` None is the world outside. A flow draws nothing from a tank below `draws_above` (m).
    """

    rate: float
    source: str | None = None
    sink: str | None = None
    while_: Callable[[States, float], bool] = lambda _states, _t: True
    draws_above: float = 0.0


class Basin:
    """One tank of the simulation. Volumes in m3, levels in m."""

    def __init__(self, shape: Shape, brim: float, level: float) -> None:
        self.shape = shape
        self.full = shape.volume(brim)
        self.volume = shape.volume(level)
        self.spilled = 0.0
        self.lowest = self.highest = level

    @property
    def level(self) -> float:
        """The level now."""
        return self.shape.level(self.volume)

    def add(self, volume: float) -> None:
        """Add a volume (less than nothing: take it); what does not fit is spilled."""
        self.volume = max(0.0, self.volume + volume)
        if self.volume > self.full:
            self.spilled += self.volume - self.full
            self.volume = self.full
        self.lowest, self.highest = min(self.lowest, self.level), max(self.highest, self.level)


class Water:
    """All tanks, and the flows between them."""

    def __init__(self, basins: Mapping[str, Basin], flows: tuple[Flow, ...]) -> None:
        self.basins = basins
        self.flows = flows

    def step(self, t: float, dt: float, states: States) -> None:
        """Let `dt` seconds pass, from `t` on."""
        for flow in self.flows:
            if flow.while_(states, t):
                self._move(flow, flow.rate * dt)

    def _move(self, flow: Flow, volume: float) -> None:
        if flow.source is not None:
            basin = self.basins[flow.source]
            if basin.level <= flow.draws_above:
                return
            volume = min(volume, basin.volume)
            basin.add(-volume)
        if flow.sink is not None:
            self.basins[flow.sink].add(volume)
