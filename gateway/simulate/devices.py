"""The devices of a simulated site: sensors that answer in raw units, relays that obey. Pure: messages in and out.

What a sensor sends is the inverse of what the gateway makes of it, so any site's sensors can be simulated.
"""

import json
from collections.abc import Iterator, Mapping
from typing import Any, NamedTuple

from gateway.measure.sensor_plan import SensorPlan
from gateway.plan import PlantPlan


class Sent(NamedTuple):
    """A message that a device sends."""

    topic: str
    payload: str
    retain: bool = False


class Device:
    """One simulated sensor. `level` gives its tank's level; `broken` is a raw value that it sends instead."""

    def __init__(self, plan: SensorPlan, every_s: float, mounted_at: float) -> None:
        self.plan = plan
        self.every_s = every_s
        self.mounted_at = mounted_at
        self.broken: float | None = None
        self._due = 0.0
        self._last: str | None = None

    def speak(self, t: float, level: float) -> Iterator[Sent]:
        """Yield what the device sends at `t` seconds, with its tank at `level`."""
        if self.plan.alive is not None:
            yield from self._speak_of_change(level)
        elif t >= self._due:
            self._due = t + self.every_s
            yield Sent(self.plan.topic, self._payload(level))

    def _speak_of_change(self, level: float) -> Iterator[Sent]:
        alive, payload = self.plan.alive, self._payload(level)
        if alive is not None and self._last is None:
            yes = next(text for text, lives in alive.words.items() if lives)
            yield Sent(alive.topic, _wrapped(yes, alive.pointer.text if alive.pointer else None), retain=True)
        if payload != self._last:
            self._last = payload
            yield Sent(self.plan.topic, payload, retain=True)

    def _payload(self, level: float) -> str:
        pointer = self.plan.pointer.text if self.plan.pointer else None
        if self.plan.method is None:
            word = "wet" if level >= self.mounted_at else "dry"
            return _wrapped(next(text for text, one in self.plan.words.items() if one == word), pointer)
        raw = self.broken if self.broken is not None else self.plan.method.raw(level) / self.plan.scale
        return _wrapped(round(raw, 3), pointer)


def _wrapped(value: float | str, pointer: str | None) -> str:
    """Return a value as a payload: bare, or in JSON where the pointer finds it."""
    if pointer is None:
        return str(value)
    document: Any = value
    for part in reversed(pointer.split("/")[1:]):
        document = {part: document}
    return json.dumps(document)


class Relays:
    """The states of all actuators; each obeys its commands at once."""

    def __init__(self, plan: PlantPlan) -> None:
        self.states = {decl.name: decl.rest for decl in plan.site.actuators}
        self._words: dict[str, tuple[str, Mapping[str, str]]] = {
            command.topic: (name, {payload: state for state, payload in command.payloads.items()})
            for name, command in plan.commands.items()
        }

    @property
    def topics(self) -> tuple[str, ...]:
        """The topics to listen to."""
        return tuple(self._words)

    def obey(self, topic: str, payload: str) -> None:
        """Take a command; what is not understood changes nothing."""
        name, words = self._words.get(topic, ("", {}))
        if payload in words:
            self.states[name] = words[payload]
