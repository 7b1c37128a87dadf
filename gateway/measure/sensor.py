"""One sensor: from the messages on its topic to a judged value.

payload → raw value → range → method → judge. Pure: time comes as a number, `deadline` says when the value next changes
by itself.
"""

import base64
import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from gateway.measure.judge import FAULTS, Happens, Judge, State
from gateway.measure.payload import PayloadError, Pointer, read_number, read_word, shown
from gateway.measure.sensing.method import Converted, Method
from gateway.measure.status import Status
from rules.model import Fault, Signal


@dataclass(frozen=True, slots=True, kw_only=True)
class AlivePlan:
    """Where a sensor that sends only changes says whether it is alive, and in which words."""

    topic: str
    pointer: Pointer | None = None
    words: Mapping[str, bool] = field(default_factory=dict)  # payload → alive


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorPlan:
    """One sensor as the settings describe it. `name` is full; `scale` turns a payload's number into SI units.

    Exactly one of `method` (a level) and `words` (a contact: payload → word) is given. `raw_range` is in SI units,
    durations in ns. `alive` makes it a sensor that sends only changes.
    """

    name: str
    topic: str
    pointer: Pointer | None = None
    method: Method | None = None
    scale: float = 1.0
    unit: str = ""
    words: Mapping[str, str] = field(default_factory=dict)
    raw_range: tuple[float, float] | None = None
    silent_after: int | None = None
    tolerate: int = 0
    good_again: int = 2
    alive: AlivePlan | None = None


class Reading(NamedTuple):
    """What one message came to. `raw` is in the sensor's own unit, or a word; `value` is a level in m, or a word."""

    t: int
    topic: str
    payload: bytes
    raw: float | str | None
    value: float | str | None
    status: Status
    reason: str | None


FARTHEST = 1e6  # m; no tank is so deep, and what is computed from a level stays far from overflowing

_WAITING = "nothing has come yet"
_HAPPENS = {True: Happens.SIGNALLED, False: Happens.REJECTED}


class Sensor:
    """One sensor with what it last said."""

    __slots__ = ("_alive", "_judge", "_lost", "accepted", "last", "on_change", "plan", "rejected", "signal", "used")

    def __init__(self, plan: SensorPlan) -> None:
        self.plan = plan
        self.on_change = plan.alive is not None
        self._judge = Judge(None if self.on_change else plan.silent_after, plan.tolerate, plan.good_again)
        self._alive: bool | None = None
        self._lost: str | None = None
        self.signal = Signal(None, Fault.AWAITED)
        self.last: Reading | None = None
        self.used: Reading | None = None  # the reading that the signal rests on
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

    def take(self, t: int, topic: str, payload: bytes, *, retained: bool) -> bool:
        """Take a message on one of the topics; return whether the signal or its status may have changed."""
        alive = self.plan.alive
        changed = False
        if alive is not None and topic == alive.topic:
            changed = self._hear_alive(alive, payload)
        if topic == self.plan.topic and (self.on_change or not retained):
            reading, happens = self._read(t, topic, payload)
            self.last = reading
            if happens is Happens.ACCEPTED:
                self.accepted += 1
                self.used = reading
                if self._judge.happens(happens, t) is State.GOOD and not self.on_change:
                    self.signal = Signal(reading.value, Fault.NONE)  # as `_settle` would; nearly all readings are this
                    return True
                changed = True
            else:
                self.rejected += 1
                before = self._judge.state
                changed = self._judge.happens(happens, t) is not before or changed
        if changed:
            self._settle()
        return changed

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
        self._alive, self._lost, self.used = None, reason, None
        self._settle()

    # ---- inside ---------------------------------------------------------------------------------------------------

    def _read(self, t: int, topic: str, payload: bytes) -> tuple[Reading, Happens]:
        plan = self.plan
        try:
            if plan.method is None:
                return self._read_word(t, topic, payload)
            raw = read_number(payload, plan.pointer)
        except PayloadError as problem:
            return Reading(t, topic, payload, None, None, Status.FAILURE, str(problem)), Happens.REJECTED
        level, status, reason, signalled, held = convert(plan, plan.method, raw)
        if level is None or (held and FAULTS[self._judge.state] is not Fault.NONE):
            return Reading(t, topic, payload, raw, None, Status.FAILURE, reason), _HAPPENS[signalled]
        return Reading(t, topic, payload, raw, level, status, reason), Happens.ACCEPTED

    def _read_word(self, t: int, topic: str, payload: bytes) -> tuple[Reading, Happens]:
        found = read_word(payload, self.plan.pointer)
        word = self.plan.words.get(found)
        if word is None:
            known = ", ".join(f"'{payload}'" for payload in self.plan.words)
            reason = f"it says '{shown(found)}'; known are {known}"
            return Reading(t, topic, payload, shown(found), None, Status.FAILURE, reason), Happens.REJECTED
        return Reading(t, topic, payload, found, word, Status.GOOD, None), Happens.ACCEPTED

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
        self.signal = Signal(self.used.value if usable and self.used else None, fault)

    # ---- saving ---------------------------------------------------------------------------------------------------

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "judge": self._judge.save(),
            "alive": self._alive,
            "lost": self._lost,
            "last": _packed(self.last),
            "used": _packed(self.used),
            "counts": [self.accepted, self.rejected],
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self._judge.restore(saved["judge"])
        self._alive, self._lost = saved["alive"], saved["lost"]
        self.last, self.used = _unpacked(saved["last"]), _unpacked(saved["used"])
        self.accepted, self.rejected = saved["counts"]
        self._settle()


def _packed(reading: Reading | None) -> list[Any] | None:
    if reading is None:
        return None
    return [
        *reading[:2],
        base64.b64encode(reading.payload).decode(),
        *reading[3:5],
        reading.status.value,
        reading.reason,
    ]


def _unpacked(saved: list[Any] | None) -> Reading | None:
    if saved is None:
        return None
    t, topic, payload, raw, value, status, reason = saved
    return Reading(t, topic, base64.b64decode(payload), raw, value, Status(status), reason)


def convert(plan: SensorPlan, method: Method, raw: float) -> Converted:
    """Return what a raw value, in the sensor's own unit, means, its range included. Total, for any float.

    A failure that the device signals is told before the range, since it counts at once and a rejected reading does not.
    """
    si = raw * plan.scale
    if not math.isfinite(si):
        return _beyond(plan, raw)
    found = method.convert(si)
    bounds = plan.raw_range
    if bounds is not None and not found.signalled and not bounds[0] <= si <= bounds[1]:
        low, high = (bound / plan.scale for bound in bounds)
        return Converted(None, Status.FAILURE, f"{raw:g} {plan.unit} is outside the range of {low:g} to {high:g}")
    if found.level is not None and not abs(found.level) <= FARTHEST:
        return _beyond(plan, raw)
    return found


def _beyond(plan: SensorPlan, raw: float) -> Converted:
    return Converted(None, Status.FAILURE, f"{raw:g} {plan.unit} is outside anything that can be converted")
