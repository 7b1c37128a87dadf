"""Why an actuator or a rule is, or was, as it is: facts out of the journal, and the same in plain sentences.

The plant is brought back to the time in question and asked; what brought the state about is read from the journal. No
rule is evaluated here.
"""

from typing import Any

from gateway.journal.reader import Reader, Span
from gateway.journal.records import EffectRow
from gateway.plant import Plant

Facts = dict[str, Any]


def why_actuator(reader: Reader, plant: Plant, name: str, at: int) -> Facts:
    """Return why the actuator `name` was as it was at the wall time `at`: `plant` is the plant of that time."""
    told = plant.explain(name)
    command = _newest(reader, name, ("command",), at)
    facts: Facts = {"about": name, "kind": "actuator", **told, "command": None, "rule_change": None}
    if told["since"] is not None:
        facts["since"] = told["since"] + plant.offset
    if command is not None:
        began = _beginning(reader, name, command, at)
        facts["command"] = {"at": command.at, "began": began, **command.data}
    if told["rule"] is not None:
        facts["rule_change"] = _change(reader, told["rule"], at)
    return facts


def why_rule(reader: Reader, plant: Plant, name: str, at: int) -> Facts:
    """Return why the rule `name` was in or out of force at the wall time `at`."""
    actuator = next(rule.actuator for rule in plant.plan.site.rules if rule.name == name)
    rule = next(one for one in plant.explain(actuator)["rules"] if one["rule"] == name)
    return {"about": name, "kind": "rule", "actuator": actuator, **rule, "rule_change": _change(reader, name, at)}


def _newest(reader: Reader, subject: str, kinds: tuple[str, ...], at: int) -> EffectRow | None:
    rows = reader.effects(subjects=(subject,), kinds=kinds, span=Span(0, at), newest=1)
    return rows[-1] if rows else None


def _beginning(reader: Reader, actuator: str, command: EffectRow, at: int) -> int:
    """Return when the state that `command` gave was first commanded, through all renewals."""
    rows = reader.effects(subjects=(actuator,), kinds=("command",), span=Span(0, at), newest=1000)
    began = command.at
    for row in reversed(rows):
        if row.data["state"] != command.data["state"]:
            break
        began = row.at
    return began


def _change(reader: Reader, rule: str, at: int) -> Facts | None:
    row = _newest(reader, rule, ("rule",), at)
    return None if row is None else {"at": row.at, **row.data}
