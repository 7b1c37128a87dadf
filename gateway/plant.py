"""The plant: measurement and control behind one `step`. Pure; the rest of the gateway drives it.

The live service, `replay`, `why` and the tests all drive this same object. Every input is an event, every output an
effect; given the same site and the same events, the effects are the same. At one time, values expire before anything
else happens; then come the engine's own deadlines; then, at a later time, the event.
"""

from collections.abc import Iterable
from typing import Any, assert_never

from gateway.effects import Command, Effect, Note, Reason, RuleChange
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Stop, Wake
from gateway.meters import Meters
from gateway.plan import PlantPlan
from rules import effects as core
from rules.effects import netted
from rules.engine import Engine
from rules.events import Event as CoreEvent
from rules.events import LinkLost, LinkProven, Passed, Signals, Started


class Plant:
    """Everything of a site that decides."""

    def __init__(self, plan: PlantPlan) -> None:
        self.plan = plan
        self.engine = Engine(plan.site)
        self.meters = Meters(plan, self.engine.board.slot)
        self.t = 0
        self.offset = 0
        self._stopped = {decl.name: decl.states[0] for decl in plan.site.actuators}  # any other state: it runs
        self._lose_due: int | None = None

    @property
    def topics(self) -> tuple[str, ...]:
        """Every topic that a sensor listens to."""
        return self.meters.topics

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
        due = (self.meters.due, self._lose_due, self.engine.wake_at)
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
        self._control(Passed(self.t), effects)  # so long the life before has lasted, whatever woke it
        self.t, self.offset, self._lose_due = event.t, event.offset, None
        self.meters.begin(event.t)
        self._control(Started(event.t), effects)
        self.meters.look_out()

    def _take(self, event: Message, t: int, effects: list[Effect]) -> None:
        old = event.retained or event.late
        changed = self.meters.take(t, event.topic, event.payload, old=old, offset=self.offset)
        if changed:
            self._signals(t, changed, effects)

    # ---- time -----------------------------------------------------------------------------------------------------

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
        sensor, lost = self.meters.due, self._lose_due
        if sensor is None or (lost is not None and lost < sensor):
            return lost
        return sensor

    def _pass(self, t: int, effects: list[Effect]) -> None:
        """Let the engine fire its deadlines before `t`, while the readings are still those of that time."""
        due = self.engine.wake_at
        if due is not None and due < t:
            self._control(Passed(t), effects)

    def _expire(self, t: int, effects: list[Effect]) -> None:
        self._signals(t, self.meters.expire(t), effects)

    def _lose(self, t: int, effects: list[Effect]) -> None:
        """Know nothing any more: the link has been lost for longer than is tolerated."""
        self._lose_due = None
        self._signals(t, self.meters.lose(t, "the link to the broker was lost"), effects)

    def _signals(self, t: int, indices: Iterable[int], effects: list[Effect]) -> None:
        """Bring what sensors say to the engine."""
        changes = self.meters.signals(t, t + self.offset, indices, effects)
        if changes:
            self._control(Signals(t, tuple(changes)), effects)

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
        if not effect.again:
            self.meters.switch(effect.actuator, runs=effect.state != self._stopped[effect.actuator])
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
            readings = self.meters.readings(term["name"], self.offset)
            if readings:
                term["readings"] = readings

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
            "meters": self.meters.save(),
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned for the same site."""
        self.t, self.offset, self._lose_due = saved["t"], saved["offset"], saved["lose_due"]
        self.engine.restore(saved["engine"])
        self.meters.restore(saved["meters"])
