"""Replay: a trace of messages through the plant in virtual time, with every deadline fired at its exact time."""

from collections.abc import Iterable, Iterator
from typing import Any

from gateway.effects import Command, Effect, RuleChange, Value
from gateway.events import LinkUp, Message, Start, Wake
from gateway.plant import Plant
from gateway.review.trace import TraceLine
from gateway.topics import moment, rounded


def replay(plant: Plant, lines: Iterable[TraceLine]) -> Iterator[Effect]:
    """Yield what the plant wants done. The gateway starts, and its link is proven, at the time of the first line."""
    started = False
    for line in lines:
        if not started:
            started = True
            yield from plant.step(Start(line.t, 0))
            yield from plant.step(LinkUp(line.t))
        yield from passed(plant, line.t)
        if line.topic is not None:
            yield from plant.step(Message(line.t, line.topic, line.payload))
        else:
            yield from plant.step(Wake(line.t))


def passed(plant: Plant, t: int) -> Iterator[Effect]:
    """Let time pass up to `t`: each deadline before it fires in a step of its own."""
    while (due := plant.wake_at) is not None and due < t:
        yield from plant.step(Wake(due + 1))


def record_of(effect: Effect, *, values: bool) -> dict[str, Any] | None:
    """Return an effect as a record of the replay's output; None for what is not told there."""
    match effect:
        case Command():
            facts: dict[str, Any] = {
                "record": "command",
                "actuator": effect.actuator,
                "state": effect.state,
                "topic": effect.topic,
                "payload": effect.payload,
                "rule": effect.rule,
                "rank": effect.rank,
            }
        case RuleChange():
            facts = {
                "record": "rule",
                "rule": effect.rule,
                "in_force": effect.in_force,
                "latched": effect.latched,
            }
        case Value() if values:
            facts = {
                "record": "value",
                "tank": effect.tank,
                "level_m": rounded(effect.level if isinstance(effect.level, float) else None, 6),
                "volume_l": rounded(None if effect.volume is None else effect.volume * 1000, 3),
                "flow_l_s": rounded(None if effect.flow is None else effect.flow * 1000, 4),
                "status": effect.status,
            }
        case _:
            return None
    return {"at": moment(effect.at), **facts}
