"""One tank: from its sensors to its level, volume, rise, flows and totals. Pure; all in SI units, times in ns.

The level is combined from the sensors that the settings name, bounded by floats where none gives it, and watched for
contradiction with them. What follows from its movement is known only while the level itself is known exactly.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from gateway.measure.combine import Combined, Float, Member, Take, bounded, combine, contradiction
from gateway.measure.shapes import Shape
from gateway.measure.status import Status, worse
from gateway.measure.trend.pump import PumpFlow
from gateway.measure.trend.slope import Slope
from gateway.measure.trend.totals import Calendar, Total, Totals
from rules.model import Bounds, Fault, Signal, Value, restored, saved

SECOND = 1_000_000_000
CONTRADICTS_AFTER = 60 * SECOND  # a float hangs a little, and tells seldom
CONTRADICTS_BY = 0.03  # m, where the settings do not say what agrees
BEYOND = 0.01  # m; so far a level may lie outside the tank by noise alone
NEVER = 1e9  # s; thirty years: what time_to_brim is while the level does not rise


@dataclass(frozen=True, slots=True, kw_only=True)
class TankPlan:
    """A tank whose level is measured, as the settings describe it. Sensors and actuators by full name, lengths in m.

    `floats` are contacts with the height at which they hang. `pumps` are the actuators that take from the tank, with
    the flow that they are rated for (m3/s), if it is known. `rise_over` in ns.
    """

    name: str
    sensors: tuple[str, ...]
    take: Take
    floats: Mapping[str, float] = field(default_factory=dict)
    shape: Shape | None = None
    brim: float | None = None
    suction: float | None = None
    pumps: Mapping[str, float | None] = field(default_factory=dict)
    rise_over: int = 300 * SECOND
    calendar: Calendar | None = None


class PumpRun(NamedTuple):
    """A run of a pump that is over, and what the pump took in it, in m3/s."""

    pump: str
    flow: float


class Measured(NamedTuple):
    """What is known of a tank at one instant; `level` exactly, within bounds, or with a fault. None: not known."""

    level: Value
    fault: Fault
    volume: float | None
    rise: float | None
    flow: float | None  # net, into the tank
    inflow: float | None
    status: Status
    reason: str | None


def _beyond(level: float, height: float) -> str:
    where = "below the bottom" if level < 0 else f"above the tank's height of {height:g} m"
    return f"{level:.3f} m is {where}"


UNKNOWN = Measured(None, Fault.AWAITED, None, None, None, None, Status.FAILURE, None)


class Tank:
    """One tank with its memory."""

    __slots__ = ("_contradicts_since", "_net_before", "_running", "_slope", "_totals", "measured", "plan", "pumps")

    def __init__(self, plan: TankPlan) -> None:
        self.plan = plan
        self._slope = Slope(plan.rise_over)
        self._totals = Totals(plan.calendar) if plan.calendar is not None and plan.shape is not None else None
        self.pumps = {name: PumpFlow() for name in plan.pumps}
        self._running: set[str] = set()
        self._contradicts_since: int | None = None
        self.measured = UNKNOWN

    def begin(self) -> None:
        """Start: nothing is known, neither of the level nor of what runs; totals go on."""
        self._slope.forget()
        self._disturb()
        self._running.clear()
        self._contradicts_since = None
        self.measured = UNKNOWN
        if self._totals is not None:
            self._totals.pause()

    # ---- readings -------------------------------------------------------------------------------------------------

    def update(self, t: int, wall: int, members: Sequence[Member], floats: Sequence[Float]) -> list[Total | PumpRun]:
        """Take the sensors as they are at `t`; return what has ended by it. `measured` is new then."""
        return self.know(t, wall, *self._level(t, members, floats))

    def know(
        self, t: int, wall: int, level: Value, fault: Fault, status: Status, reason: str | None
    ) -> list[Total | PumpRun]:
        """Let the level be what it is; return what has ended by it. Of a tank with one sensor, that is its level."""
        if isinstance(level, float):
            return self._moved(t, wall, level, status, reason)
        known = level if isinstance(level, Bounds) else None
        self.measured = Measured(known, fault, None, None, None, None, status, reason)
        if self._totals is not None:
            self._totals.pause()
        return []

    def _level(self, t: int, members: Sequence[Member], floats: Sequence[Float]) -> Combined:
        if len(members) == 1:
            only = members[0]
            value = only.value if isinstance(only.value, float | Bounds) else None
            level = Combined(value, only.fault, only.status, only.reason)
        else:
            level = combine(self.plan.take, members)
        return self._checked(t, bounded(level, floats), floats) if floats else level

    def _checked(self, t: int, level: Combined, floats: Sequence[Float]) -> Combined:
        """Return the level with a contradiction told that has lasted for too long."""
        margin = self.plan.take.agree_within or CONTRADICTS_BY
        against = contradiction(level.value, floats, margin) if isinstance(level.value, float) else None
        if against is None:
            self._contradicts_since = None
            return level
        if self._contradicts_since is None:
            self._contradicts_since = t
        if t - self._contradicts_since < CONTRADICTS_AFTER:
            return level
        status, reason = worse((level.status, level.reason), (Status.OUT_OF_SPECIFICATION, against))
        return level._replace(status=status, reason=reason)

    # ---- movement -------------------------------------------------------------------------------------------------

    def _moved(self, t: int, wall: int, value: float, status: Status, reason: str | None) -> list[Total | PumpRun]:
        slope, shape = self._slope, self.plan.shape
        slope.take(t, value)
        rise = slope.slope()
        if shape is None:
            self.measured = Measured(value, Fault.NONE, None, rise, None, None, status, reason)
            return []
        if not -BEYOND <= value <= shape.height + BEYOND:
            status, reason = worse((status, reason), (Status.OUT_OF_SPECIFICATION, _beyond(value, shape.height)))
        flow = inflow = None
        if rise is not None:
            flow = rise * shape.area(slope.mean)
            inflow = self._inflow(flow) if self._running else flow
        self.measured = Measured(value, Fault.NONE, shape.volume(value), rise, flow, inflow, status, reason)
        if self._totals is None:
            return []
        if inflow is None:
            self._totals.pause()
            return []
        ended: list[Total | PumpRun] = [*self._count(self._totals, wall, value, inflow)]
        if self.pumps and not self._running:
            ended += self._settle_pumps(inflow)
        return ended

    def _inflow(self, flow: float) -> float | None:
        """Return what flows in: the net flow and what the running pumps take; None when that of one is not known."""
        taken = 0.0
        for name in self._running:
            one = self.flow_of(name)
            if one is None:
                return None
            taken += one
        return flow + taken

    def _count(self, totals: Totals, wall: int, value: float, inflow: float) -> list[Total]:
        taken = sum(self.flow_of(name) or 0.0 for name in self._running) if self._running else 0.0
        into, unseen = (inflow, 0.0) if inflow > 0 else (0.0, -inflow)
        brim = self.plan.brim
        return totals.add(wall, into, taken + unseen, into if brim is not None and value >= brim else 0.0)

    @property
    def running(self) -> dict[str, Total]:
        """The totals of the periods that are not over yet."""
        return self._totals.running() if self._totals is not None else {}

    # ---- pumps ----------------------------------------------------------------------------------------------------

    def flow_of(self, pump: str) -> float | None:
        """Return what a pump takes: as measured, else as rated, else None."""
        measured = self.pumps[pump].flow
        return self.plan.pumps[pump] if measured is None else measured

    def switch(self, pump: str, *, runs: bool) -> None:
        """Let a pump of the tank start or stop: what moves the level is another from now on."""
        before = bool(self._running)
        net = self.measured.flow
        if runs:
            self._running.add(pump)
            if before:
                self._disturb()
            else:
                self.pumps[pump].started(net)
        else:
            self._running.discard(pump)
            if self._running:
                self._disturb()
            else:
                self.pumps[pump].stopped(net)
        self._slope.forget()

    def _disturb(self) -> None:
        for one in self.pumps.values():
            one.disturbed()

    def _settle_pumps(self, inflow: float) -> list[PumpRun]:
        flows = {name: pump.settled(inflow) for name, pump in self.pumps.items()}
        return [PumpRun(name, flow) for name, flow in flows.items() if flow is not None]

    # ---- what conditions ask --------------------------------------------------------------------------------------

    def quantity(self, name: str) -> Signal:
        """Return a quantity of the tank as a signal, by its name in conditions."""
        found = self.measured
        if name == "level":
            return Signal(found.level, found.fault)
        value = found.volume if name == "volume" and found.volume is not None else self._value(name)
        if value is not None:
            return Signal(value, Fault.NONE)
        return Signal(None, found.fault if found.fault is not Fault.NONE else Fault.AWAITED)

    def _value(self, name: str) -> Value:
        match name:
            case "volume":
                return self._volume()
            case "ullage":
                return self._ullage()
            case "rise":
                return self.measured.rise
            case "flow":
                return self.measured.flow
            case "time_to_brim":
                return self._until(self.plan.brim, 1.0)
            case "time_to_suction":
                return self._until(self.plan.suction, -1.0)
            case _:
                raise KeyError(name)

    def _volume(self) -> Value:
        """Return the volume, within bounds where the level is."""
        shape, level = self.plan.shape, self.measured.level
        if shape is not None and isinstance(level, Bounds):
            most = shape.volume(shape.height)
            high = shape.volume(level.high) if math.isfinite(level.high) else most
            return Bounds(shape.volume(level.low) if math.isfinite(level.low) else 0.0, high)
        return self.measured.volume

    def _ullage(self) -> Value:
        shape, brim, volume = self.plan.shape, self.plan.brim, self._volume()
        if shape is None or brim is None or volume is None:
            return None
        full = shape.volume(brim)
        if isinstance(volume, Bounds):
            return Bounds(full - volume.high, full - volume.low)
        return full - volume if isinstance(volume, float) else None

    def _until(self, end: float | None, sign: float) -> float | None:
        """Return the seconds until the level is at `end`, moving as it does; `sign` 1 for rising, -1 for falling."""
        found, shape = self.measured, self.plan.shape
        if end is None or found.rise is None or not isinstance(found.level, float):
            return None
        if found.rise * sign <= 0:
            return NEVER
        if shape is None or found.volume is None or not found.flow:
            left, speed = end - found.level, found.rise
        else:
            left, speed = shape.volume(end) - found.volume, found.flow
        return min(max(0.0, left / speed), NEVER)

    # ---- saving ---------------------------------------------------------------------------------------------------

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        found = self.measured
        return {
            "measured": [saved(found.level), found.fault, *found[2:6], found.status.value, found.reason],
            "slope": self._slope.save(),
            "totals": self._totals and self._totals.save(),
            "pumps": {name: pump.save() for name, pump in self.pumps.items()},
            "running": sorted(self._running),
            "contradicts_since": self._contradicts_since,
        }

    def restore(self, plain: Mapping[str, Any]) -> None:
        """Take up the state that `save` returned."""
        level, fault, volume, rise, flow, inflow, status, reason = plain["measured"]
        self.measured = Measured(restored(level), Fault(fault), volume, rise, flow, inflow, Status(status), reason)
        self._slope.restore(plain["slope"])
        if self._totals is not None and plain["totals"] is not None:
            self._totals.restore(plain["totals"])
        for name, pump in self.pumps.items():
            pump.restore(plain["pumps"][name])
        self._running = set(plain["running"])
        self._contradicts_since = plain["contradicts_since"]
