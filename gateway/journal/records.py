"""What the journal holds, as rows: inputs, effects, snapshots; and how an input turns into a row and back, exactly."""

import json
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Stop, Wake

RETAINED, LATE = 1, 2  # bits of a message's flags

_KINDS = {Start: "start", LinkUp: "link up", LinkDown: "link down", ClockSet: "clock set", Wake: "wake", Stop: "stop"}
_EVENTS: dict[str, Callable[..., Event]] = {kind: event for event, kind in _KINDS.items()}


class EventRow(NamedTuple):
    """An input: its number, steady and wall time (ns), and what happened."""

    seq: int
    at: int
    event: Event


class EffectRow(NamedTuple):
    """An effect, of the input numbered `seq`. `subject` is the rule, actuator or sensor it is about."""

    seq: int
    t: int
    at: int
    kind: str
    subject: str
    data: dict[str, Any]


class SnapshotRow(NamedTuple):
    """The plant's state after the input numbered `seq`, under the settings with this digest."""

    seq: int
    at: int
    digest: str
    state: dict[str, Any]


@dataclass(slots=True)
class Batch:
    """What is written in one transaction. `token` comes back when it is safely on disk."""

    events: list[EventRow] = field(default_factory=list)
    effects: list[EffectRow] = field(default_factory=list)
    snapshots: list[SnapshotRow] = field(default_factory=list)
    token: object = None


def flags_of(event: Message) -> int:
    """Return a message's flags as one number."""
    return event.retained * RETAINED + event.late * LATE


def told(event: Event) -> tuple[str, str | None]:
    """Return the kind and the data of an input that is no message."""
    kind = _KINDS[type(event)] if not isinstance(event, Message) else "message"
    facts = event._asdict()
    del facts["t"]
    return kind, json.dumps(facts, sort_keys=True) if facts else None


def event_of(t: int, kind: str, topic: str | None, payload: bytes | None, flags: int, data: str | None) -> Event:
    """Return the input that a row holds."""
    if kind == "message":
        return Message(t, topic or "", payload or b"", bool(flags & RETAINED), bool(flags & LATE))
    return _EVENTS[kind](t, **json.loads(data)) if data else _EVENTS[kind](t)
