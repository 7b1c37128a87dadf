"""From the demands of rules to one state of one actuator.

Ranks overrule each other in the order trip, interlock, auto. With no demand an actuator rests, if all is known, and is
safe otherwise: rest needs knowledge. While a rule is still undecided since the start, nothing is sent on its word, and
nothing moves away from safe before every protective rule has been decided once.

Pure functions over rules; the state of an actuator is kept by the engine.
"""

from collections.abc import Sequence
from enum import StrEnum
from typing import NamedTuple

from rules.model import ActuatorDecl, Rank
from rules.rule import Rule


class Fallback(StrEnum):
    """What an actuator does while rules are still undecided."""

    AS_FOUND = "as found"  # after a start: it is left alone
    SAFE = "safe"  # after a long outage of the link, or once we have commanded it


class Decision(NamedTuple):
    """What an actuator is to do and why. A `state` of None leaves it as it was found."""

    state: str | None
    rank: Rank | None
    rule: str | None
    reason: str
    overruled: tuple[str, ...] = ()


def arbitrate(actuator: ActuatorDecl, rules: Sequence[Rule], fallback: Fallback) -> Decision:
    """Return the one state for `actuator`, from all `rules` that name it, in file order."""
    asking = [rule for rule in rules if rule.in_force]
    for rank in (Rank.TRIP, Rank.INTERLOCK):
        if chosen := _chosen(actuator, asking, rank):
            return _demanded(chosen, asking)
    unmet = [rule for rule in rules if not rule.met]
    if chosen := _chosen(actuator, [rule for rule in asking if rule.met], Rank.AUTO):
        waiting = next((rule for rule in unmet if rule.protective), None)
        if waiting is None or chosen.decl.state == actuator.safe:
            return _demanded(chosen, asking)
        return _undecided(actuator, waiting, fallback)
    if unmet:
        return _undecided(actuator, unmet[0], fallback)
    return _at_rest(actuator, rules)


def _chosen(actuator: ActuatorDecl, asking: Sequence[Rule], rank: Rank) -> Rule | None:
    """Return the rule that wins within a rank: `prefer` among protective ones, else the first in file order."""
    rivals = [rule for rule in asking if rule.decl.rank == rank]
    if rank != Rank.AUTO:
        preferred = [rule for rule in rivals if rule.decl.state == actuator.prefer]
        rivals = preferred or rivals
    return rivals[0] if rivals else None


def _demanded(chosen: Rule, asking: Sequence[Rule]) -> Decision:
    decl = chosen.decl
    overruled = tuple(rule.decl.name for rule in asking if rule.decl.state != decl.state)
    reason = f"{decl.rank.word} rule '{decl.name}' is in force{' (latched)' if chosen.latched else ''}"
    return Decision(decl.state, decl.rank, decl.name, reason, overruled)


def _undecided(actuator: ActuatorDecl, waiting: Rule, fallback: Fallback) -> Decision:
    name = waiting.decl.name
    if fallback is Fallback.SAFE:
        return Decision(actuator.safe, Rank.SAFE, None, f"rule '{name}' is not decided yet, so it is put to safe")
    return Decision(None, None, None, f"rule '{name}' is not decided yet since the start, so it is left as found")


def _at_rest(actuator: ActuatorDecl, rules: Sequence[Rule]) -> Decision:
    blind = next((rule.decl.name for rule in rules if rule.blind), None)
    if blind is None:
        return Decision(actuator.rest, Rank.REST, None, "no rule asks for anything, so it rests")
    return Decision(actuator.safe, Rank.SAFE, None, f"rule '{blind}' cannot be decided, so it is put to safe")
