"""The facts of `why` as sentences for people: one screen, the answer first."""

from collections.abc import Callable, Iterator
from typing import Any

Facts = dict[str, Any]
Shown = Callable[[int], str]  # a wall time in ns → text in the site's zone


def actuator_sentences(facts: Facts, shown: Shown, offset: int, *, verbose: bool) -> Iterator[str]:
    """Yield the answer for an actuator; `offset` is wall time minus the plant's time."""
    command = facts["command"]
    if command is None:
        yield f"{facts['about']} has not been commanded since the journal began."
        yield f"  {_sentence(facts['reason'])}"
    else:
        yield f"{facts['about']} is {command['state']} since {shown(command['began'])}."
        yield f"  {_sentence(facts['reason'])}"
        yield f"  Sent: `{command['payload']}` on {command['topic']} at {shown(command['at'])}{_again(command)}."
        if facts["sent"] is None:
            yield "  The gateway has started since; nothing has been sent yet."
    change = facts["rule_change"]
    if change is not None:
        yield from _change_sentences(facts["rule"], change, shown, offset)
    for name in facts["overruled"]:
        yield f"  Overruled: rule '{name}' asks for something else."
    yield from _rules(facts["rules"], facts["rule"], shown, offset, verbose=verbose)


def rule_sentences(facts: Facts, shown: Shown, offset: int, *, verbose: bool) -> Iterator[str]:
    """Yield the answer for a rule."""
    change, state = facts["rule_change"], _standing(facts)
    since = f" since {shown(change['at'])}" if change is not None else ""
    yield f"Rule '{facts['about']}' is {state}{since}."
    yield f"  A {facts['rank']} rule that asks {facts['actuator']} for `{facts['asks']}`."
    if change is not None:
        yield from _change_sentences(facts["about"], change, shown, offset)
    if verbose or change is None:
        yield from _now(facts, shown, offset)


def _sentence(text: str) -> str:
    return f"{text[0].upper()}{text[1:]}." if text else ""


def _again(command: Facts) -> str:
    return " (told again after the link came back)" if command["again"] else ""


def _standing(rule: Facts) -> str:
    if rule["latched"]:
        return "in force and latched"
    if rule["in_force"]:
        return "in force"
    return "out of force, undecided" if rule["from"] == "undecided" else "out of force"


def _change_sentences(rule: str, change: Facts, shown: Shown, offset: int) -> Iterator[str]:
    """Yield when and on what grounds a rule last came into force or left it."""
    came = "came into force" if change["in_force"] else "left force"
    yield f"  '{rule}' {came} at {shown(change['at'])}:"
    side = "from" if change["in_force"] or "until" not in change["because"] else "until"
    yield from _tree(change["because"][side], side, change["from_" if side == "from" else "until"], shown, offset)


def _rules(rules: list[Facts], winner: str | None, shown: Shown, offset: int, *, verbose: bool) -> Iterator[str]:
    for rule in rules:
        if rule["rule"] != winner:
            yield f"  Rule '{rule['rule']}' ({rule['rank']}, asks `{rule['asks']}`) is {_standing(rule)}."
        if verbose or (rule["rule"] != winner and rule["from"] in {"undecided", "unknown"}):
            yield from _now(rule, shown, offset)


def _now(rule: Facts, shown: Shown, offset: int) -> Iterator[str]:
    for side in ("from", "until"):
        if side in rule["because"]:
            yield from _tree(rule["because"][side], side, rule[side], shown, offset)


def _tree(tree: Facts, side: str, truth: str, shown: Shown, offset: int, depth: int = 2) -> Iterator[str]:
    """Yield a condition, part by part, with the readings behind it."""
    label = f"{side}: " if depth == 2 else ""
    yield f"{'  ' * depth}{label}{tree['text']} — {truth}{_timer(tree, shown, offset)}"
    for term in tree.get("terms", ()):
        yield from _term(term, shown, depth + 1)
    for part in tree.get("parts", ()):
        yield from _tree(part, side, part["truth"], shown, offset, depth + 1)


def _timer(tree: Facts, shown: Shown, offset: int) -> str:
    if "for_s" not in tree:
        return ""
    if tree["until_change"] is not None:
        return f", decided at {shown(tree['until_change'] + offset)} if nothing changes"
    return f", so since {shown(tree['since'] + offset)}" if tree["since"] is not None else ""


def _term(term: Facts, shown: Shown, depth: int) -> Iterator[str]:
    fault = f" ({term['fault']})" if term["fault"] else ""
    head, *others = [_reading(reading, shown) for reading in term.get("readings", ())] or [""]
    indent = "  " * depth
    yield f"{indent}{term['name']}: {_value(term)}{fault}{head}"
    for other in others:
        yield f"{indent} {other}"


def _value(term: Facts) -> str:
    """Return a value for people: exactly, or what is known of it."""
    value, unit = term["value"], term["unit"]
    if value is None:
        return "unknown"
    if isinstance(value, list):
        low, high = value
        ends = [f"at least {low:.4g} {unit}"] if low is not None else []
        return " and ".join([*ends, *([f"at most {high:.4g} {unit}"] if high is not None else [])])
    return f"{value:.4g} {unit}" if isinstance(value, float) else str(value)


def _reading(reading: Facts, shown: Shown) -> str:
    raw = reading["raw"]
    raw_shown = f"{raw:g} {reading['unit']}" if isinstance(raw, float) else raw if raw is not None else "no value"
    reason = f", {reading['reason']}" if reading["reason"] else ""
    where = f"{reading['sensor']} at {shown(reading['at'])}"
    return f" ← {where}: {raw_shown}, payload `{reading['payload']}` on {reading['topic']}{reason}"
