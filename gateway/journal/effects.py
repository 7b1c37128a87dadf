"""What of effects goes into the journal. Pure."""

from typing import Any

from gateway.effects import Command, Effect, Note, PumpFlow, Reason, RuleChange, SensorChange, Value, Volumes
from gateway.journal.records import EffectRow

_KINDS = {
    Command: ("command", "actuator"),
    Reason: ("reason", "actuator"),
    RuleChange: ("rule", "rule"),
    SensorChange: ("sensor", "sensor"),
    Volumes: ("volumes", "tank"),
    PumpFlow: ("pump flow", "actuator"),
    Note: ("note", "about"),
}
"""The word for each effect in the journal, and the field that says what it is about."""


def effect_row(seq: int, effect: Effect) -> EffectRow | None:
    """Return the journal's row for an effect; None for values, which the inputs give again."""
    if isinstance(effect, Value):
        return None
    kind, about = _KINDS[type(effect)]
    data: dict[str, Any] = effect._asdict()
    t, at, subject = data.pop("t"), data.pop("at"), data.pop(about)
    return EffectRow(seq, t, at, kind, subject, data)
