"""The one door of the control core: `Engine.step(event)` returns effects; `Engine.wake_at` says when to come again.

The order within an instant is part of the contract. A step at `t` first fires every deadline before `t`, each at its
own time; then the event is applied; a deadline at `t` itself fires with the next later event, so that every input at
`t` precedes it. One pass is: values → conditions → all rules from one snapshot → arbitration. Conditions see the
states of actuators from before the pass; if those changed, another pass follows at the same instant, at most eight.
Commands are netted: at most one per actuator and step.
"""

import heapq
import math
from bisect import bisect_left
from collections.abc import Iterable
from typing import Any, assert_never

from rules.arbitration import Decision, Fallback, arbitrate
from rules.conditions.board import Board
from rules.conditions.terms import DIGITS
from rules.conditions.tree import SECOND
from rules.effects import Commanded, Effect, Noted, ReasonChanged, RuleChanged, netted
from rules.events import Event, LinkLost, LinkProven, Passed, Signals, Started
from rules.grace import Grace
from rules.model import ActuatorDecl, Fault, Rank, Signal, SiteDecl, Value
from rules.rule import Rule, Side, earlier

NOWHERE = (math.inf, -math.inf)  # the edges of a signal that stands between none
NEAR = 2 * 10.0**-DIGITS
MOST_PASSES = 8  # rules that still move actuators after so many passes at one instant chase each other

_KNOWN = frozenset({Side.FALSE, Side.TRUE})
_NOTHING_DECIDED = Decision(None, None, None, "nothing has been decided yet")


class _Actuator:
    """One actuator: what is decided, and what was last sent."""

    __slots__ = ("decided", "decl", "rules", "sent", "since", "slot")

    def __init__(self, decl: ActuatorDecl, slot: int, rules: list[Rule]) -> None:
        self.decl = decl
        self.slot = slot
        self.rules = rules
        self.decided = _NOTHING_DECIDED
        self.sent: str | None = None  # since the start
        self.since: int | None = None  # when it was put into the state that it was last sent


class Engine:
    """All rules and actuators of a site, as one deterministic state machine."""

    def __init__(self, site: SiteDecl) -> None:
        self.site = site
        self.board = Board(site.signals, site.actuators)
        self.now = 0
        self._rules = [Rule(decl, self.board) for decl in site.rules]
        self._actuators = [self._actuator(decl) for decl in site.actuators]
        places = {decl.name: index for index, decl in enumerate(site.actuators)}
        self._actuator_of = [places[decl.actuator] for decl in site.rules]
        self._readers = self._index()
        self._edges = [self._edges_of(slot) for slot in range(len(self.board.values))]
        self._between = [NOWHERE] * len(self._edges)  # between which edges each signal stands
        self._heap: list[tuple[int, int]] = []  # (deadline, rule), entries of superseded deadlines included
        self._fallback = Fallback.AS_FOUND
        self._proven = False
        self._outage_due: int | None = None  # when an outage of the link becomes a long one
        self._settled_due: int | None = None  # when, after a long outage, rules that are still unknown decide so
        self._grace = Grace(site.startup_grace)

    def _actuator(self, decl: ActuatorDecl) -> _Actuator:
        rules = [rule for rule in self._rules if rule.decl.actuator == decl.name]
        return _Actuator(decl, self.board.slot[decl.name], rules)

    def _index(self) -> list[list[int]]:
        """Return, for each slot of the board, the rules that read it."""
        readers: list[list[int]] = [[] for _ in self.board.values]
        for index, rule in enumerate(self._rules):
            for slot in rule.inputs:
                readers[slot].append(index)
        return readers

    def _edges_of(self, slot: int) -> tuple[float, ...] | None:
        """Return every constant that a signal is compared with, ascending; None when it is read in other ways too."""
        found: set[float] = set()
        for index in self._readers[slot]:
            bounds = self._rules[index].bounds(slot)
            if bounds is None:
                return None
            found.update(bounds)
        return tuple(sorted(found))

    # ---- the door -------------------------------------------------------------------------------------------------

    def step(self, event: Event) -> list[Effect]:
        """Let `event` happen and return what is to be done about it. Raises for no event."""
        effects: list[Effect] = []
        t = event.t if isinstance(event, Started) else max(event.t, self.now)
        if not isinstance(event, Started):
            self._fire_before(t, effects)
        match event:
            case Signals():
                self._apply(t, event.changes, effects)
            case Passed():
                pass
            case LinkProven():
                self._prove(t, effects)
            case LinkLost():
                self._lose(t)
            case Started():
                self._start(t, effects)
            case _:
                assert_never(event)
        self.now = t
        return netted(effects, Commanded)

    @property
    def wake_at(self) -> int | None:
        """When something may change without a new event; the shell then steps with any later time."""
        due = self._rule_due()
        if self._outage_due is not None or self._settled_due is not None:
            due = earlier(due, earlier(self._outage_due, self._settled_due))
        return due

    # ---- deadlines ------------------------------------------------------------------------------------------------

    def _rule_due(self) -> int | None:
        heap = self._heap
        while heap and self._rules[heap[0][1]].deadline != heap[0][0]:
            heapq.heappop(heap)
        return heap[0][0] if heap else None

    def _fire_before(self, t: int, effects: list[Effect]) -> None:
        """Fire every deadline before `t` at its own time; at one time, rules come before the link's outage."""
        while (due := self.wake_at) is not None and due < t:
            if due == self._rule_due():
                self._settle(due, self._pop_due(due), effects)
            elif due == self._outage_due:
                self._give_up_link(due, effects)
            else:
                self._accept_unknown(due, effects)
            self.now = due

    def _pop_due(self, due: int) -> set[int]:
        heap, rules = self._heap, set[int]()
        while heap and heap[0][0] == due:
            rules.add(heapq.heappop(heap)[1])
        return rules

    # ---- events ---------------------------------------------------------------------------------------------------

    def _apply(self, t: int, changes: Iterable[tuple[int, Signal]], effects: list[Effect]) -> None:
        values, faults = self.board.values, self.board.faults
        touched: set[int] = set()
        for slot, (value, fault) in changes:
            if values[slot] != value or faults[slot] is not fault:
                values[slot], faults[slot] = value, fault
                readers = self._readers[slot]
                if readers and self._crossed(slot, value):
                    touched.update(readers)
        if touched:
            self._settle(t, touched, effects)

    def _crossed(self, slot: int, value: Value) -> bool:
        """Return whether a changed signal can change any truth: not while it stays between the same two edges."""
        low, high = self._between[slot]
        if isinstance(value, float):
            if low < value < high:
                return False
            self._between[slot] = self._around(slot, value)
        else:
            self._between[slot] = NOWHERE
        return True

    def _around(self, slot: int, value: float) -> tuple[float, float]:
        """Return the two edges between which a value stands: while it stays there, no comparison with it changes.

        Values are compared with `DIGITS` digits, so what is nearer to an edge than that is not between any.
        """
        edges = self._edges[slot]
        if edges is None:
            return NOWHERE
        place = bisect_left(edges, value)
        low = edges[place - 1] + NEAR if place else -math.inf
        high = edges[place] - NEAR if place < len(edges) else math.inf
        return (low, high) if low < value < high else NOWHERE

    def _prove(self, t: int, effects: list[Effect]) -> None:
        """Tell every actuator its state, again if need be, now that the link works."""
        self._proven, self._outage_due = True, None
        if self._fallback is Fallback.SAFE:
            self._settled_due = t + self.site.startup_grace
        changed = [actuator for actuator in self._actuators if self._send(t, actuator, effects, renew=True)]
        self._settle(t, self._readers_of(changed), effects)

    def _lose(self, t: int) -> None:
        if self._proven:
            self._outage_due = t + self.site.link_tolerance
        self._proven = False

    def _give_up_link(self, t: int, effects: list[Effect]) -> None:
        """Take the outage for a long one: what was known is too old, and every actuator is safe until known."""
        self._outage_due = self._settled_due = None
        self._fallback = Fallback.SAFE
        for rule in self._rules:
            rule.met = False
        self._decide_all(t, effects)

    def _accept_unknown(self, t: int, effects: list[Effect]) -> None:
        """Leave what is still unknown to each rule's own word: the link has worked for long enough."""
        self._settled_due = None
        self._fallback = Fallback.AS_FOUND
        for rule in self._rules:
            self._meet(rule)
        self._decide_all(t, effects)

    def _start(self, t: int, effects: list[Effect]) -> None:
        """Begin a new stretch of time at `t`, which may be less than any time before."""
        granted = self._grace.begin(t, self.now)
        if granted < self.site.startup_grace:
            effects.append(Noted(t, "gateway", f"restarting often: {granted / SECOND:g} s of start-up grace are left"))
        self._heap.clear()
        self._fallback, self._proven, self._settled_due = Fallback.AS_FOUND, False, None
        self._outage_due = t + self.site.link_tolerance
        self.board.forget()
        self._between = [NOWHERE] * len(self._edges)
        for rule in self._rules:
            rule.begin(t, self.now)
        for actuator in self._actuators:
            actuator.decided, actuator.sent = _NOTHING_DECIDED, None
        self.now = t
        self._settle(t, range(len(self._rules)), effects)
        self._decide_all(t, effects)

    def _decide_all(self, t: int, effects: list[Effect]) -> None:
        changed = [actuator for actuator in self._actuators if self._decide(t, actuator, effects)]
        self._settle(t, self._readers_of(changed), effects)

    # ---- passes ---------------------------------------------------------------------------------------------------

    def _settle(self, t: int, rules: Iterable[int], effects: list[Effect]) -> None:
        """Judge `rules`, arbitrate what they ask, and repeat for rules that read what changed."""
        pending = rules if isinstance(rules, set) else set(rules)
        for _ in range(MOST_PASSES):
            if not pending:
                return
            pending = self._pass(t, pending, effects)
        if pending:
            self._stop_chase(t, pending, effects)

    def _pass(self, t: int, rules: set[int], effects: list[Effect]) -> set[int]:
        """Judge `rules` from one snapshot, then arbitrate; return the rules that read an actuator that changed."""
        touched = {self._actuator_of[index] for index in sorted(rules) if self._judge(t, index, effects)}
        if not touched:
            return touched
        actuators = [self._actuators[index] for index in sorted(touched)]
        return self._readers_of([actuator for actuator in actuators if self._decide(t, actuator, effects)])

    def _judge(self, t: int, index: int, effects: list[Effect]) -> bool:
        """Bring one rule up to `t`; return whether its actuator must be arbitrated again."""
        rule = self._rules[index]
        in_force, latched, deadline = rule.in_force, rule.latched, rule.deadline
        changed = rule.judge(t, self._grace.until)
        if rule.deadline != deadline and rule.deadline is not None:
            heapq.heappush(self._heap, (rule.deadline, index))
        if changed:
            self._meet(rule)
            if in_force != rule.in_force or latched != rule.latched:
                effects.append(_rule_changed(t, rule))
        return changed

    def _meet(self, rule: Rule) -> None:
        """Note that a rule has been decided since the start; after a long outage only knowledge counts as that."""
        side = rule.from_side
        rule.met = rule.met or side in _KNOWN or (side is Side.UNDECIDED and self._fallback is Fallback.AS_FOUND)

    def _decide(self, t: int, actuator: _Actuator, effects: list[Effect]) -> bool:
        """Arbitrate one actuator; return whether its commanded state has changed."""
        # What we have commanded ourselves is not "as found" any more.
        fallback = self._fallback if actuator.sent is None else Fallback.SAFE
        decision = arbitrate(actuator.decl, actuator.rules, fallback)
        if decision == actuator.decided:
            return False
        same_state = decision.state == actuator.decided.state
        actuator.decided = decision
        if not same_state:
            return self._send(t, actuator, effects, renew=False)
        if self._proven and decision.state is not None:
            effects.append(ReasonChanged(t, actuator.decl.name, *decision))
        return False

    def _send(self, t: int, actuator: _Actuator, effects: list[Effect], *, renew: bool) -> bool:
        """Command the decided state if the link allows; return whether the commanded state has changed."""
        decision, state = actuator.decided, actuator.decided.state
        if state is None or not self._proven:
            return False
        changed = state != actuator.sent
        if changed or renew:
            effects.append(Commanded(t, actuator.decl.name, state, *decision[1:], again=not changed))
        if changed:
            actuator.sent, actuator.since = state, t
            self.board.put(actuator.slot, Signal(state, Fault.NONE))
        return changed

    def _readers_of(self, actuators: Iterable[_Actuator]) -> set[int]:
        return {reader for actuator in actuators for reader in self._readers[actuator.slot]}

    def _stop_chase(self, t: int, pending: set[int], effects: list[Effect]) -> None:
        """Rules that move each other's actuators without end are a fault of the settings: put those to safe.

        A trip or an interlock that is in force at the end still has its way.
        """
        names = ", ".join(f"'{self._rules[index].decl.name}'" for index in sorted(pending))
        reason = f"rules chase each other: {names}"
        effects.append(Noted(t, "gateway", reason))
        for index in sorted({self._actuator_of[index] for index in pending}):
            actuator = self._actuators[index]
            decision = arbitrate(actuator.decl, actuator.rules, Fallback.SAFE)
            if decision.rank not in {Rank.TRIP, Rank.INTERLOCK}:
                decision = Decision(actuator.decl.safe, Rank.SAFE, None, f"{reason}, so it is put to safe")
            actuator.decided = decision
            self._send(t, actuator, effects, renew=False)

    # ---- for people, and for the journal --------------------------------------------------------------------------

    def explain(self, actuator: str) -> dict[str, Any]:
        """Return why `actuator` is as it is, as plain JSON values: the decision, and every rule that names it.

        Raises KeyError for a name that is no actuator.
        """
        found = next((one for one in self._actuators if one.decl.name == actuator), None)
        if found is None:
            raise KeyError(actuator)
        decision = found.decided
        return {
            "actuator": actuator,
            "state": decision.state,
            "sent": found.sent,
            "since": found.since,
            "rank": decision.rank.word if decision.rank is not None else None,
            "rule": decision.rule,
            "reason": decision.reason,
            "overruled": list(decision.overruled),
            "rules": [_told(self.now, rule) for rule in found.rules],
        }

    def adopt(self, before: "Engine") -> list[str]:
        """Take over, from an engine of other settings, the rules that have not changed; return what is lost by it.

        To be followed by a `Started`, which makes everything else anew.
        """
        self.now = before.now
        self._grace.restore(before._grace.save())  # noqa: SLF001 - one engine of another
        same = {rule.decl.name: rule for rule in self._rules}
        lost = []
        for old in before._rules:  # noqa: SLF001 - one engine of another
            rule = same.get(old.decl.name)
            if rule is not None and rule.decl == old.decl:
                rule.restore(old.save())
            elif old.latched:
                lost.append(
                    f"rule '{old.decl.name}' was latched; it has been changed or removed, and its latch with it"
                )
        return lost

    def save(self) -> dict[str, Any]:
        """Return the whole state as plain JSON values."""
        return {
            "now": self.now,
            "fallback": self._fallback.value,
            "proven": self._proven,
            "outage_due": self._outage_due,
            "settled_due": self._settled_due,
            "grace": self._grace.save(),
            "board": self.board.save(),
            "rules": [rule.save() for rule in self._rules],
            "actuators": [[list(one.decided), one.sent, one.since] for one in self._actuators],
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned for the same site."""
        self.now, self._proven = saved["now"], saved["proven"]
        self._fallback = Fallback(saved["fallback"])
        self._outage_due, self._settled_due = saved["outage_due"], saved["settled_due"]
        self._grace.restore(saved["grace"])
        self.board.restore(saved["board"])
        self._between = [NOWHERE] * len(self._edges)
        for rule, state in zip(self._rules, saved["rules"], strict=True):
            rule.restore(state)
        for one, (decided, sent, since) in zip(self._actuators, saved["actuators"], strict=True):
            state, rank, rule, reason, overruled = decided
            one.decided = Decision(state, None if rank is None else Rank(rank), rule, reason, tuple(overruled))
            one.sent, one.since = sent, since
        self._heap = [(rule.deadline, index) for index, rule in enumerate(self._rules) if rule.deadline is not None]
        heapq.heapify(self._heap)


def _rule_changed(t: int, rule: Rule) -> RuleChanged:
    sides = (rule.from_side.word, rule.until_side.word)
    return RuleChanged(t, rule.decl.name, rule.in_force, rule.latched, *sides, rule.explain(t))


def _told(now: int, rule: Rule) -> dict[str, Any]:
    """Return one rule for people."""
    return {
        "rule": rule.decl.name,
        "rank": rule.decl.rank.word,
        "asks": rule.decl.state,
        "in_force": rule.in_force,
        "latched": rule.latched,
        "from": rule.from_side.word,
        "until": rule.until_side.word,
        "because": rule.explain(now),
    }
