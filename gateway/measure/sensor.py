"""One sensor: from the messages on its topic to a judged value.

payload → raw value and its age → range → method → plausible? → covered? → calmed → judge. Pure: time comes as a number,
`deadline` says when the value next changes by itself.
"""

from collections.abc import Mapping
from typing import Any

from gateway.measure.payloads.payload import PayloadError, read_number, read_word, shown
from gateway.measure.reading import Reading, Said, convert, reader_of, restored_reading
from gateway.measure.sensor_plan import AlivePlan, SensorPlan
from gateway.measure.status import Status, worse
from gateway.measure.validity.age import Ages
from gateway.measure.validity.filters import Despike, Lag
from gateway.measure.validity.judge import FAULTS, Happens, Judge, State
from gateway.measure.validity.plausible import Plausible
from rules.model import Fault, Signal, Value, restored, saved

_WAITING = "nothing has come yet"


class Sensor:
    """One sensor with what it last said."""

    __slots__ = (
        "_alive",
        "_felt",
        "_judge",
        "_lost",
        "_method",
        "_read",
        "_unfelt",
        "_value",
        "accepted",
        "ages",
        "calm",
        "last",
        "no_news",
        "on_change",
        "plan",
        "plausible",
        "rejected",
        "signal",
        "used",
    )

    def __init__(self, plan: SensorPlan) -> None:
        self.plan = plan
        self.on_change = plan.alive is not None
        self._judge = Judge(None if self.on_change else plan.silent_after, plan.tolerate, plan.good_again)
        self._read = reader_of(plan)
        self._method = plan.method
        self._felt: dict[str, float] = {}  # what the sensors that the method depends on have said
        self._unfelt = dict.fromkeys(plan.feels, "a usual value is assumed")  # and which of them say nothing
        self._alive: bool | None = None
        self._lost: str | None = None
        self._value: Value = None
        self.ages = Ages(buffers=plan.buffers, old=plan.silent_after or 0) if _has_time(plan) else None
        self.plausible = _plausible(plan)
        self.calm = Calm(plan) if plan.despike or plan.lag else None
        self.signal = Signal(None, Fault.AWAITED)
        self.last: Reading | None = None
        self.used: Reading | None = None  # the reading that the signal rests on
        self.no_news: Reading | None = None  # the last that was old, or has come before
        self.accepted = self.rejected = 0

    # ---- what the plant asks --------------------------------------------------------------------------------------

    @property
    def topics(self) -> tuple[str, ...]:
        """The topics to listen to."""
        plan = self.plan
        if plan.alive is None or plan.alive.topic == plan.topic:
            return (plan.topic,)
        return (plan.topic, plan.alive.topic)

    @property
    def deadline(self) -> int | None:
        """When the signal next changes by itself."""
        return self._judge.deadline

    @property
    def state(self) -> State:
        """What the value is worth."""
        return self._judge.state

    @property
    def status(self) -> Status:
        """The status of the value after NAMUR NE 107."""
        if self.signal.fault is not Fault.NONE or self.used is None:
            return Status.FAILURE
        return self.used.status

    @property
    def reason(self) -> str | None:
        """Why the status is not good, in words."""
        match self.signal.fault:
            case Fault.NONE:
                return self.used.reason if self.used else None
            case Fault.AWAITED:
                return self._why_awaited()
            case Fault.SILENT:
                return self._why_silent()
            case _:
                return self._why_failed()

    def _why_failed(self) -> str:
        said = self.last.reason if self.last and self._judge.state is State.FAILED else None
        return said or "too few good readings since the failure"

    def _why_awaited(self) -> str:
        if self.on_change and self._judge.state is not State.AWAITED:
            return "it has not said yet whether it is alive"
        return self._lost or _WAITING

    def _why_silent(self) -> str:
        if self.on_change:
            return "it says that it is not alive"
        return f"silent for more than {(self.plan.silent_after or 0) / 1e9:g} s"

    # ---- what can happen ------------------------------------------------------------------------------------------

    def take(self, t: int, topic: str, payload: bytes, *, retained: bool, offset: int = 0) -> bool:
        """Take a message on one of the topics; return whether the signal or its status may have changed.

        `offset` is wall time minus `t`, for readings that carry their own time.
        """
        alive = self.plan.alive
        changed = False
        if alive is not None and topic == alive.topic:
            changed = self._hear_alive(alive, payload)
        if topic == self.plan.topic and (self.on_change or not retained):
            reading, happens, age = self._judged(t, topic, payload, offset)
            if happens is None:
                self.no_news = reading
            elif happens is Happens.ACCEPTED:
                self.last = self.used = reading
                self.accepted += 1
                self._calmed(t, reading.value)
                if self._judge.happens(happens, t - age) is State.GOOD and not self.on_change:
                    self.signal = Signal(self._value, Fault.NONE)  # as `_settle` would; nearly all readings are this
                    return True
                changed = True
            else:
                self.last = reading
                self.rejected += 1
                before = self._judge.state
                changed = self._judge.happens(happens, t) is not before or changed
        if changed:
            self._settle()
        return changed

    def feel(self, what: str, value: float | None) -> None:
        """Let another sensor, on which the method depends, say `value`; None: it is not usable.

        Then what it said last stands, or else what the settings assume, and readings are out of specification.
        """
        if value is None:
            self._unfelt[what] = "what it said last is used" if what in self._felt else "a usual value is assumed"
            return
        self._unfelt.pop(what, None)
        if self._felt.get(what) != value:
            self._felt[what] = value
            self._feel_anew()

    def _feel_anew(self) -> None:
        if self.plan.method_at is not None:
            self._method = self.plan.method_at(self._felt)

    def expire(self, t: int) -> bool:
        """Let the deadline pass, if it is `t` or before; return whether the signal may have changed."""
        deadline = self._judge.deadline
        if deadline is None or deadline > t:
            return False
        self._judge.happens(Happens.TOO_LONG, t)
        self._settle()
        return True

    def begin(self, t: int) -> None:
        """Start at `t`: nothing is known."""
        self._forget(t, None)

    def lose(self, t: int, reason: str) -> None:
        """Know nothing any more, for the reason given, until a new reading comes."""
        self._forget(t, reason)

    def _forget(self, t: int, reason: str | None) -> None:
        self._judge.begin(t)
        self._alive, self._lost, self.used, self._value = None, reason, None, None
        if self.plausible is not None:
            self.plausible.forget()
        self._settle()

    # ---- inside ---------------------------------------------------------------------------------------------------

    def _judged(self, t: int, topic: str, payload: bytes, offset: int) -> tuple[Reading, Happens | None, int]:
        """Return what a message comes to, what that is for the judge (None: no news), and its age in ns."""
        plan, age = self.plan, 0
        raw: float | str
        try:
            if self._read is not None:
                said = self._read(payload)
                raw = said.raw
                known_age, reason = self._age(said, t + offset)
                if known_age is None:
                    return Reading(t, topic, payload, raw, None, Status.FAILURE, reason), None, 0
                age = known_age
            elif plan.method is None:
                raw = read_word(payload, plan.pointer)
            else:
                raw = read_number(payload, plan.pointer)
        except PayloadError as problem:
            return Reading(t, topic, payload, None, None, Status.FAILURE, str(problem)), Happens.REJECTED, 0
        value, status, reason, happens = self._worth(t, raw)
        return Reading(t, topic, payload, raw, value, status, reason), happens, age

    def _age(self, said: Said, arrived: int) -> tuple[int | None, str | None]:
        if self.ages is None or said.own is None:
            return said.ago or 0, None
        return self.ages.take(arrived, said.own)

    def _worth(self, t: int, raw: float | str) -> tuple[Value, Status, str | None, Happens]:
        """Return what a raw value means: the value, its status with the reason, and what it is for the judge."""
        method, plan = self._method, self.plan
        if method is None or isinstance(raw, str):
            return self._word(str(raw))
        level, status, reason, signalled, held = convert(plan, method, raw)
        if level is None or (held and FAULTS[self._judge.state] is not Fault.NONE):
            return None, Status.FAILURE, reason, Happens.SIGNALLED if signalled else Happens.REJECTED
        if self.plausible is not None and (odd := self._odd(t, raw, level)):
            return None, Status.FAILURE, *odd
        if self._unfelt:
            status, reason = worse((status, reason), (Status.OUT_OF_SPECIFICATION, self._unfelt_told()))
        return level if plan.covers is None else plan.covers.of(level), status, reason, Happens.ACCEPTED

    def _word(self, said: str) -> tuple[Value, Status, str | None, Happens]:
        word = self.plan.words.get(said)
        if word is None:
            known = ", ".join(f"'{payload}'" for payload in self.plan.words)
            return None, Status.FAILURE, f"it says '{shown(said)}'; known are {known}", Happens.REJECTED
        return word, Status.GOOD, None, Happens.ACCEPTED

    def _odd(self, t: int, raw: float, level: float) -> tuple[str, Happens] | None:
        """Return why a level cannot be true, if so, and what that is for the judge."""
        plausible = self.plausible
        if plausible is None:
            return None
        if (frozen := plausible.frozen(t, raw)) is not None:
            return frozen, Happens.SIGNALLED
        too_fast = plausible.too_fast(t, level)
        if too_fast is None or self._judge.state is State.FAILED:
            plausible.believe(t, level)  # after a failure, readings are compared with each other
        return None if too_fast is None else (too_fast, Happens.REJECTED)

    def _unfelt_told(self) -> str:
        return "; ".join(f"{self.plan.feels[what]} is not usable: {told}" for what, told in self._unfelt.items())

    def _calmed(self, t: int, value: Value) -> None:
        """Take the value of an accepted reading, without its spikes and ripples."""
        if self.calm is None or not isinstance(value, float):
            self._value = value
            return
        if self.signal.fault is not Fault.NONE:
            self.calm.forget()
        self._value = self.calm.take(t, value)

    def _hear_alive(self, alive: AlivePlan, payload: bytes) -> bool:
        before = self._alive
        try:
            self._alive = alive.words.get(read_word(payload, alive.pointer), False)
        except PayloadError:
            self._alive = False  # what cannot be understood is no sign of life
        return self._alive is not before

    def _settle(self) -> None:
        """Work out the signal from what is known."""
        fault = FAULTS[self._judge.state]
        if fault is Fault.NONE and self.on_change and not self._alive:
            fault = Fault.AWAITED if self._alive is None else Fault.SILENT
        usable = fault is Fault.NONE and self.used is not None
        self.signal = Signal(self._value if usable else None, fault)

    # ---- saving ---------------------------------------------------------------------------------------------------

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "judge": self._judge.save(),
            "alive": self._alive,
            "lost": self._lost,
            "last": self.last and self.last.save(),
            "used": self.used and self.used.save(),
            "value": saved(self._value),
            "no_news": self.no_news and self.no_news.save(),
            "felt": dict(self._felt),
            "unfelt": dict(self._unfelt),
            "counts": [self.accepted, self.rejected],
            "parts": [part and part.save() for part in (self.ages, self.plausible, self.calm)],
        }

    def restore(self, plain: Mapping[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self._judge.restore(plain["judge"])
        self._alive, self._lost = plain["alive"], plain["lost"]
        self.last, self.used = restored_reading(plain["last"]), restored_reading(plain["used"])
        self.no_news = restored_reading(plain["no_news"])
        self._value = restored(plain["value"])
        self._felt, self._unfelt = dict(plain["felt"]), dict(plain["unfelt"])
        self._feel_anew()
        self.accepted, self.rejected = plain["counts"]
        for part, state in zip((self.ages, self.plausible, self.calm), plain["parts"], strict=True):
            if part is not None:
                part.restore(state)
        self._settle()


class Calm:
    """Spikes first, then ripples."""

    __slots__ = ("_despike", "_lag")

    def __init__(self, plan: SensorPlan) -> None:
        self._despike = Despike(plan.despike) if plan.despike else None
        self._lag = Lag(plan.lag) if plan.lag else None

    def take(self, t: int, value: float) -> float:
        """Return the calmed value."""
        if self._despike is not None:
            value = self._despike.take(value)
        return value if self._lag is None else self._lag.take(t, value)

    def forget(self) -> None:
        """Begin anew."""
        for part in (self._despike, self._lag):
            if part is not None:
                part.forget()

    def save(self) -> list[Any]:
        """Return the state as plain JSON values."""
        return [part and part.save() for part in (self._despike, self._lag)]

    def restore(self, plain: list[Any]) -> None:
        """Take up the state that `save` returned."""
        for part, state in zip((self._despike, self._lag), plain, strict=True):
            if part is not None:
                part.restore(state)


def _has_time(plan: SensorPlan) -> bool:
    return plan.own_time is not None or plan.senml is not None


def _plausible(plan: SensorPlan) -> Plausible | None:
    looked_at = plan.fastest is not None or plan.frozen_after is not None
    return Plausible(plan.fastest, plan.frozen_after) if looked_at else None
