"""The plant: measurement and control behind one `step`. Pure; the rest of the gateway drives it.

The live service, `replay`, `why` and the tests all drive this same object. Every input is an event, every output an
effect; given the same site and the same events, the effects are the same. At one time, values expire before anything
else happens; then come the engine's own deadlines; then, at a later time, the event.
"""

import heapq
from collections.abc import Iterable
from typing import Any, assert_never

from gateway.effects import Command, Effect, Note, Reason, RuleChange, SensorChange, Value
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Stop, Wake
from gateway.measure.payloads.payload import shown_payload
from gateway.measure.sensor import Sensor
from gateway.measure.status import Status
from gateway.plan import PlantPlan, TankPlan
from rules import effects as core
from rules.effects import netted
from rules.engine import Engine
from rules.events import Event as CoreEvent
from rules.events import LinkLost, LinkProven, Passed, Signals, Started
from rules.model import Fault, Signal


class _Tank:
    """One tank whose level is measured: where its level and volume stand on the engine's board."""

    __slots__ = ("level", "plan", "volume")

    def __init__(self, plan: TankPlan, slots: dict[str, int]) -> None:
        self.plan = plan
        self.level = slots[f"{plan.name}.level"]
        self.volume = slots.get(f"{plan.name}.volume")


class Plant:
    """Everything of a site that decides."""

    def __init__(self, plan: PlantPlan) -> None:
        self.plan = plan
        self.engine = Engine(plan.site)
        self.t = 0
        self.offset = 0
        self.sensors = [Sensor(sensor) for sensor in plan.sensors]
        self._names = {sensor.name: index for index, sensor in enumerate(plan.sensors)}
        self._slots = [self.engine.board.slot[sensor.name] for sensor in plan.sensors]
        self._source = plan.source
        self._tanks = self._tanks_by_sensor()
        self._heard = self._sensors_by_topic()
        self._status = [sensor.status for sensor in self.sensors]
        self._due: list[tuple[int, int]] = []  # one entry a sensor at most; an entry may be too early, never too late
        self._queued: list[int | None] = [None] * len(self.sensors)
        self._lose_due: int | None = None

    def _tanks_by_sensor(self) -> list[tuple[_Tank, ...]]:
        found: list[list[_Tank]] = [[] for _ in self.sensors]
        for plan in self.plan.tanks:
            found[self._names[plan.level_sensor]].append(_Tank(plan, self.engine.board.slot))
        return [tuple(tanks) for tanks in found]

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

    # ---- the door -------------------------------------------------------------------------------------------------

    def step(self, event: Event) -> list[Effect]:
        """Let `event` happen and return what is to be done about it."""
        effects: list[Effect] = []
        if isinstance(event, Start):
            self._start(event, effects)
            return effects
        t = max(event.t, self.t)
        self._advance(t, effects)
        self.t = t
        if isinstance(event, Message):
            self._take(event, t, effects)
        else:
            self._happen(event, t, effects)
        return netted(effects, Command)

    @property
    def wake_at(self) -> int | None:
        """When something may change without a new event; step with any later time."""
        due = (self._sensor_due(), self._lose_due, self.engine.wake_at)
        return min((time for time in due if time is not None), default=None)

    # ---- events ---------------------------------------------------------------------------------------------------

    def _happen(self, event: LinkUp | LinkDown | ClockSet | Wake | Stop, t: int, effects: list[Effect]) -> None:
        match event:
            case LinkUp():
                self._lose_due = None
                self._control(LinkProven(t), effects)
            case LinkDown():
                if self._lose_due is None:
                    self._lose_due = t + self.plan.site.link_tolerance
                self._control(LinkLost(t), effects)
            case ClockSet():
                self.offset = event.offset
            case Wake() | Stop():
                pass
            case _:
                assert_never(event)

    def _start(self, event: Start, effects: list[Effect]) -> None:
        self.t, self.offset, self._lose_due = event.t, event.offset, None
        self._due, self._queued = [], [None] * len(self.sensors)
        for sensor in self.sensors:
            sensor.begin(event.t)
        self._status = [sensor.status for sensor in self.sensors]
        self._control(Started(event.t), effects)
        for index in range(len(self.sensors)):
            self._queue(index)

    def _take(self, event: Message, t: int, effects: list[Effect]) -> None:
        """Hand a message to the sensors that listen.

        A late one moves nothing; where only changes are sent, the last state counts whenever it comes, since nothing
        newer will.
        """
        changed: list[int] = []
        for index in self._heard.get(event.topic, ()):
            if self.sensors[index].take(t, event.topic, event.payload, retained=event.retained or event.late):
                changed.append(index)
            self._queue(index)
        if changed:
            self._signals(t, changed, effects)

    # ---- time -----------------------------------------------------------------------------------------------------

    def _queue(self, index: int) -> None:
        """Have the sensor looked at no later than its deadline."""
        deadline = self.sensors[index].deadline
        queued = self._queued[index]
        if deadline is not None and (queued is None or deadline < queued):
            self._queued[index] = deadline
            heapq.heappush(self._due, (deadline, index))

    def _sensor_due(self) -> int | None:
        """Return when the next value expires; entries that came too early are put where they belong."""
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

    def _advance(self, t: int, effects: list[Effect]) -> None:
        """Fire every deadline before `t` at its own time."""
        while (due := self._value_due()) is not None and due < t:
            self._pass(due, effects)
            self.t = due
            if due == self._lose_due:
                self._lose(due, effects)
            else:
                self._expire(due, effects)
        self._pass(t, effects)

    def _value_due(self) -> int | None:
        sensor, lost = self._sensor_due(), self._lose_due
        if sensor is None or (lost is not None and lost < sensor):
            return lost
        return sensor

    def _pass(self, t: int, effects: list[Effect]) -> None:
        """Let the engine fire its deadlines before `t`, while the readings are still those of that time."""
        due = self.engine.wake_at
        if due is not None and due < t:
            self._control(Passed(t), effects)

    def _expire(self, t: int, effects: list[Effect]) -> None:
        changed = []
        while self._due and self._due[0][0] == t:
            _, index = heapq.heappop(self._due)
            self._queued[index] = None
            if self.sensors[index].expire(t):
                changed.append(index)
            self._queue(index)
        self._signals(t, sorted(changed), effects)

    def _lose(self, t: int, effects: list[Effect]) -> None:
        """Know nothing any more: the link has been lost for longer than is tolerated."""
        self._lose_due = None
        for index, sensor in enumerate(self.sensors):
            sensor.lose(t, "the link to the broker was lost")
            self._queue(index)
        self._signals(t, range(len(self.sensors)), effects)

    # ---- from sensors to the engine -------------------------------------------------------------------------------

    def _signals(self, t: int, indices: Iterable[int], effects: list[Effect]) -> None:
        changes: list[tuple[int, Signal]] = []
        for index in indices:
            sensor = self.sensors[index]
            changes.append((self._slots[index], sensor.signal))
            status, reason = sensor.status, sensor.reason
            effects += [self._fill(t, tank, sensor.signal, status, reason, changes) for tank in self._tanks[index]]
            if status is not self._status[index]:
                self._status[index] = status
                effects.append(SensorChange(t, t + self.offset, self.plan.sensors[index].name, status.value, reason))
        if changes:
            self._control(Signals(t, tuple(changes)), effects)

    def _fill(
        self,
        t: int,
        tank: _Tank,
        signal: Signal,
        status: Status,
        reason: str | None,
        changes: list[tuple[int, Signal]],
    ) -> Value:
        """Bring a tank's level and volume up to what its sensor says; return them as an effect."""
        plan = tank.plan
        changes.append((tank.level, signal))
        level = signal.value if isinstance(signal.value, float) else None
        volume = None if level is None or plan.shape is None else plan.shape.volume(level)
        if tank.volume is not None:
            changes.append((tank.volume, Signal(volume, signal.fault if volume is None else Fault.NONE)))
        share = level / plan.brim if level is not None and plan.brim else None
        return Value(t, t + self.offset, plan.name, level, share, volume, status.value, reason)

    # ---- from the engine to the world -----------------------------------------------------------------------------

    def _control(self, event: CoreEvent, effects: list[Effect]) -> None:
        effects.extend([self._translated(effect) for effect in self.engine.step(event)])

    def _translated(self, effect: core.Effect) -> Effect:
        at = effect.t + self.offset
        match effect:
            case core.Commanded():
                return self._command(effect, at)
            case core.RuleChanged():
                because = self._with_readings(effect.because)
                return RuleChange(effect.t, at, *effect[1:6], because)
            case core.ReasonChanged():
                rank = effect.rank.word if effect.rank is not None else None
                state = effect.state or ""
                return Reason(effect.t, at, effect.actuator, state, rank, effect.rule, effect.reason, effect.overruled)
            case core.Noted():
                return Note(effect.t, at, effect.about, effect.text)
            case _:
                assert_never(effect)

    def _command(self, effect: core.Commanded, at: int) -> Command:
        plan = self.plan.commands[effect.actuator]
        return Command(
            t=effect.t,
            at=at,
            actuator=effect.actuator,
            state=effect.state,
            topic=plan.topic,
            payload=plan.payloads[effect.state],
            qos=plan.qos,
            retain=plan.retain,
            expiry_s=plan.expiry_s,
            rank=effect.rank.word if effect.rank is not None else None,
            rule=effect.rule,
            reason=effect.reason,
            overruled=effect.overruled,
            again=effect.again,
        )

    # ---- for people, and for the journal --------------------------------------------------------------------------

    def explain(self, actuator: str) -> dict[str, Any]:
        """Return why `actuator` is as it is, as plain JSON values. Raises KeyError for a name that is no actuator."""
        told = self.engine.explain(actuator)
        for rule in told["rules"]:
            rule["because"] = self._with_readings(rule["because"])
        return told

    def _with_readings(self, because: dict[str, Any]) -> dict[str, Any]:
        """Add to every name of an explanation the reading that its value rests on."""
        for tree in because.values():
            self._add_readings(tree)
        return because

    def _add_readings(self, tree: dict[str, Any]) -> None:
        for part in tree.get("parts", ()):
            self._add_readings(part)
        for term in tree.get("terms", ()):
            index = self._names.get(self._source.get(term["name"], term["name"]))
            if index is not None:
                term["reading"] = self._reading(self.sensors[index])

    def _reading(self, sensor: Sensor) -> dict[str, Any] | None:
        used = sensor.used or sensor.last
        if used is None:
            return None
        return {
            "sensor": sensor.plan.name,
            "at": used.t + self.offset,
            "topic": used.topic,
            "payload": shown_payload(used.payload),
            "raw": used.raw,
            "unit": sensor.plan.unit,
            "status": used.status.value,
            "reason": used.reason,
        }

    def adopt(self, before: "Plant") -> list[str]:
        """Take over, from a plant of other settings, the rules that have not changed; return what is lost by it."""
        self.t, self.offset = before.t, before.offset
        return self.engine.adopt(before.engine)

    def save(self) -> dict[str, Any]:
        """Return the whole state as plain JSON values."""
        return {
            "t": self.t,
            "offset": self.offset,
            "lose_due": self._lose_due,
            "engine": self.engine.save(),
            "sensors": [sensor.save() for sensor in self.sensors],
            "status": [status.value for status in self._status],
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned for the same site."""
        self.t, self.offset, self._lose_due = saved["t"], saved["offset"], saved["lose_due"]
        self.engine.restore(saved["engine"])
        for sensor, state in zip(self.sensors, saved["sensors"], strict=True):
            sensor.restore(state)
        self._status = [type(status)(value) for status, value in zip(self._status, saved["status"], strict=True)]
        self._due, self._queued = [], [None] * len(self.sensors)
        for index in range(len(self.sensors)):
            self._queue(index)
