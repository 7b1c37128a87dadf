"""What of effects goes into the journal. Pure."""

from typing import Any

from gateway.effects import Command, Effect, Note, Reason, RuleChange, SensorChange, Value
from gateway.journal.records import EffectRow

_KINDS = {Command: "command", Reason: "reason", RuleChange: "rule", SensorChange: "sensor", Note: "note"}
_SUBJECTS = {Command: "actuator", Reason: "actuator", RuleChange: "rule", SensorChange: "sensor", Note: "about"}


def effect_row(seq: int, effect: Effect) -> EffectRow | None:
    """Return the journal's row for an effect; None for values, which the inputs give again."""
    if isinstance(effect, Value):
        return None
    data: dict[str, Any] = effect._asdict()
    t, at, subject = data.pop("t"), data.pop("at"), data.pop(_SUBJECTS[type(effect)])
    return EffectRow(seq, t, at, _KINDS[type(effect)], subject, data)
