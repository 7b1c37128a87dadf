"""The measuring half of the plant: every sensor and every tank of the site, and what they signal. Pure.

A message goes to the sensors that listen; what changes by it goes on to the tanks and, as signals, to the engine.
"""

import heapq
from collections.abc import Iterable, Mapping
from typing import Any, NamedTuple

from gateway.effects import Effect, PumpFlow, SensorChange, Value, Volumes
from gateway.measure.combine import Float, Member
from gateway.measure.payloads.payload import shown_payload
from gateway.measure.sensor import Sensor
from gateway.measure.tank import PumpRun, Tank
from gateway.measure.trend.totals import Total
from gateway.plan import PlantPlan
from rules.model import Fault, Signal

Changes = list[tuple[int, Signal]]

QUANTITIES = ("level", "volume", "ullage", "rise", "flow", "time_to_brim", "time_to_suction")
"""What conditions can ask of a tank."""


class _Place(NamedTuple):
    """A tank with where its sensors stand in the list, and its quantities on the engine's board."""

    tank: Tank
    members: tuple[int, ...]
    floats: tuple[tuple[int, float], ...]  # (sensor, height in m)
    slots: tuple[tuple[str, int], ...]  # (quantity, slot), of those that are asked for
    only: Sensor | None  # the sensor, where there is but one and no float beside it


class Meters:
    """Everything of a site that measures. `slots` says where each signal stands on the engine's board, by full name."""

    def __init__(self, plan: PlantPlan, slots: Mapping[str, int]) -> None:
        self.plan = plan
        self.sensors = [Sensor(sensor) for sensor in plan.sensors]
        self.tanks = [Tank(tank) for tank in plan.tanks]
        self._index = {sensor.name: index for index, sensor in enumerate(plan.sensors)}
        self._slots = [slots[sensor.name] for sensor in plan.sensors]
        self._places = [self._place(tank, slots) for tank in self.tanks]
        self._tanks_of = self._tanks_by_sensor()
        self._felt_by = self._feelers()
        self._heard = self._sensors_by_topic()
        self._status = [sensor.status for sensor in self.sensors]
        self._due: list[tuple[int, int]] = []  # one entry a sensor at most; an entry may be too early, never too late
        self._queued: list[int | None] = [None] * len(self.sensors)
        self._pumps = {pump: tank for tank in self.tanks for pump in tank.plan.pumps}
        self._by_name = {tank.plan.name: tank for tank in self.tanks}

    # ---- who hears what -------------------------------------------------------------------------------------------

    def _place(self, tank: Tank, slots: Mapping[str, int]) -> _Place:
        plan = tank.plan
        members = tuple(self._index[name] for name in plan.sensors)
        return _Place(
            tank,
            members,
            tuple((self._index[name], height) for name, height in plan.floats.items()),
            tuple((name, slots[full]) for name in QUANTITIES if (full := f"{plan.name}.{name}") in slots),
            self.sensors[members[0]] if len(members) == 1 and not plan.floats else None,
        )

    def _tanks_by_sensor(self) -> list[tuple[int, ...]]:
        found: list[list[int]] = [[] for _ in self.sensors]
        for index, place in enumerate(self._places):
            for sensor in dict.fromkeys([*place.members, *(one for one, _ in place.floats)]):
                found[sensor].append(index)
        return [tuple(tanks) for tanks in found]

    def _feelers(self) -> list[tuple[tuple[int, str], ...]]:
        """Return, for each sensor, which others depend on it, and for what."""
        found: list[list[tuple[int, str]]] = [[] for _ in self.sensors]
        for index, sensor in enumerate(self.plan.sensors):
            for what, name in sensor.feels.items():
                found[self._index[name]].append((index, what))
        return [tuple(feelers) for feelers in found]

    def _sensors_by_topic(self) -> dict[str, tuple[int, ...]]:
        heard: dict[str, list[int]] = {}
        for index, sensor in enumerate(self.sensors):
            for topic in sensor.topics:
                heard.setdefault(topic, []).append(index)
        return {topic: tuple(indices) for topic, indices in heard.items()}

    @property
    def topics(self) -> tuple[str, ...]:
        """Every topic that a sensor listens to."""
        return tuple(self._heard)

    # ---- what can happen ------------------------------------------------------------------------------------------

    def begin(self, t: int) -> None:
        """Start at `t`: nothing is known."""
        self._due, self._queued = [], [None] * len(self.sensors)
        for sensor in self.sensors:
            sensor.begin(t)
        for tank in self.tanks:
            tank.begin()
        self._status = [sensor.status for sensor in self.sensors]

    def look_out(self) -> None:
        """Queue the deadline of every sensor."""
        for index in range(len(self.sensors)):
            self._queue(index)

    def take(self, t: int, topic: str, payload: bytes, *, old: bool, offset: int) -> list[int]:
        """Hand a message to the sensors that listen; return those whose signal may have changed.

        An `old` one (late, or retained) moves nothing but where only changes are sent: there the last state counts
        whenever it comes, since nothing newer will.
        """
        changed: list[int] = []
        for index in self._heard.get(topic, ()):
            if self.sensors[index].take(t, topic, payload, retained=old, offset=offset):
                changed.append(index)
            self._queue(index)
        return changed

    def expire(self, t: int) -> list[int]:
        """Let the deadlines at `t` pass; return the sensors whose signal may have changed."""
        changed = []
        while self._due and self._due[0][0] == t:
            _, index = heapq.heappop(self._due)
            self._queued[index] = None
            if self.sensors[index].expire(t):
                changed.append(index)
            self._queue(index)
        return sorted(changed)

    def lose(self, t: int, reason: str) -> Iterable[int]:
        """Know nothing any more, for the reason given."""
        for index, sensor in enumerate(self.sensors):
            sensor.lose(t, reason)
            self._queue(index)
        return range(len(self.sensors))

    def switch(self, actuator: str, *, runs: bool) -> None:
        """Let an actuator have been commanded: a pump moves its tank's level."""
        tank = self._pumps.get(actuator)
        if tank is not None:
            tank.switch(actuator, runs=runs)

    # ---- time -----------------------------------------------------------------------------------------------------

    @property
    def due(self) -> int | None:
        """When the next value expires; entries that came too early are put where they belong."""
        due = self._due
        while due:
            time, index = due[0]
            if self.sensors[index].deadline == time:
                return time
            heapq.heappop(due)
            if self._queued[index] == time:
                self._queued[index] = None
                self._queue(index)
        return None

    def _queue(self, index: int) -> None:
        """Have the sensor looked at no later than its deadline."""
        deadline = self.sensors[index].deadline
        queued = self._queued[index]
        if deadline is not None and (queued is None or deadline < queued):
            self._queued[index] = deadline
            heapq.heappush(self._due, (deadline, index))

    # ---- signals --------------------------------------------------------------------------------------------------

    def signals(self, t: int, wall: int, indices: Iterable[int], effects: list[Effect]) -> Changes:
        """Return the signals of sensors that may have changed, and of their tanks; add what people should see."""
        changes: Changes = []
        tanks: list[int] = []
        for index in indices:
            sensor = self.sensors[index]
            changes.append((self._slots[index], sensor.signal))
            if self._felt_by[index]:
                self._felt(index)
            status = sensor.status
            if status is not self._status[index]:
                self._status[index] = status
                effects.append(SensorChange(t, wall, sensor.plan.name, status.value, sensor.reason))
            tanks += self._tanks_of[index]
        for number in tanks if len(tanks) < 2 else dict.fromkeys(tanks):
            self._measure(t, wall, self._places[number], changes, effects)
        return changes

    def _felt(self, index: int) -> None:
        """Tell the sensors that depend on another one what it says."""
        value = self.sensors[index].signal.value
        for other, what in self._felt_by[index]:
            self.sensors[other].feel(what, value if isinstance(value, float) else None)

    def _measure(self, t: int, wall: int, place: _Place, changes: Changes, effects: list[Effect]) -> None:
        """Bring a tank up to what its sensors say."""
        tank = place.tank
        only = place.only
        if only is not None:
            value, fault = only.signal
            used = only.used
            if fault is Fault.NONE and used is not None:  # nearly always
                ended = tank.know(t, wall, value, fault, used.status, used.reason)
            else:
                ended = tank.know(t, wall, value, fault, only.status, only.reason)
        else:
            members = [self._member(index) for index in place.members]
            ended = tank.update(t, wall, members, self._floats(place))
        if ended:
            effects += [_told(t, wall, tank.plan.name, one) for one in ended]
        for name, slot in place.slots:
            changes.append((slot, tank.quantity(name)))
        found, brim = tank.measured, tank.plan.brim
        level = None if isinstance(found.level, str) else found.level
        share = level / brim if isinstance(level, float) and brim else None
        status = found.status.value
        effects.append(Value(t, wall, tank.plan.name, level, share, found.volume, found.flow, status, found.reason))

    def _member(self, index: int) -> Member:
        sensor = self.sensors[index]
        value, fault = sensor.signal
        return Member(sensor.plan.name, value, fault, sensor.status, sensor.reason)

    def _floats(self, place: _Place) -> list[Float]:
        found = []
        for index, height in place.floats:
            sensor = self.sensors[index]
            value, fault = sensor.signal
            found.append(Float(sensor.plan.name, height, value == "wet" if fault is Fault.NONE else None))
        return found

    # ---- for people -----------------------------------------------------------------------------------------------

    def readings(self, name: str, offset: int) -> list[dict[str, Any]]:
        """Return the readings that a signal rests on, by its full name; none for what is no sensor's."""
        indices = [self._index[one] for one in self._sources(name) if one in self._index]
        return [told for index in indices if (told := _reading(self.sensors[index], offset)) is not None]

    def _sources(self, name: str) -> tuple[str, ...]:
        """Return the sensors behind a signal: itself, or those of its tank, with the floats where they count."""
        if name in self._index:
            return (name,)
        where, _, what = name.partition(".")
        tank = self._by_name.get(where)
        if tank is None or what not in QUANTITIES:
            return ()
        exact = isinstance(tank.measured.level, float)
        return tank.plan.sensors if exact else (*tank.plan.sensors, *tank.plan.floats)

    # ---- saving ---------------------------------------------------------------------------------------------------

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "sensors": [sensor.save() for sensor in self.sensors],
            "tanks": [tank.save() for tank in self.tanks],
            "status": [status.value for status in self._status],
        }

    def restore(self, saved: Mapping[str, Any]) -> None:
        """Take up the state that `save` returned for the same site."""
        for sensor, state in zip(self.sensors, saved["sensors"], strict=True):
            sensor.restore(state)
        for tank, state in zip(self.tanks, saved["tanks"], strict=True):
            tank.restore(state)
        self._status = [type(status)(value) for status, value in zip(self._status, saved["status"], strict=True)]
        self._due, self._queued = [], [None] * len(self.sensors)
        self.look_out()


def _told(t: int, wall: int, tank: str, ended: Total | PumpRun) -> Effect:
    if isinstance(ended, PumpRun):
        return PumpFlow(t, wall, *ended)
    return Volumes(t, wall, tank, *ended)


def _reading(sensor: Sensor, offset: int) -> dict[str, Any] | None:
    used = sensor.used or sensor.last
    if used is None:
        return None
    return {
        "sensor": sensor.plan.name,
        "at": used.t + offset,
        "topic": used.topic,
        "payload": shown_payload(used.payload),
        "raw": used.raw,
        "unit": sensor.plan.unit,
        "status": used.status.value,
        "reason": used.reason,
    }
