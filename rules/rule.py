"""One rule: when it comes into force, stays, and leaves.

The behaviour is the table below, over what is known of `from` and of `until`. A trip or an interlock is set-dominant
(`from` wins), an auto rule is reset-dominant (`until` wins); a protective rule leaves force only when `until` is true
and `from` is known to be false, unless it says `release`. Time comes as a number; nothing here knows a clock.
"""

from enum import Enum, IntEnum
from typing import Any, assert_never

from rules.conditions.board import Board
from rules.conditions.compile import Compiled, compile_condition
from rules.model import OnUnknown, Rank, Rhythm, RuleDecl
from rules.truth import UNKNOWN


class Side(IntEnum):
    """What is known of one of a rule's two conditions."""

    FALSE = 0
    TOLERATED = 1  # unknown, for no longer than the rule tolerates
    TRUE = 2
    UNDECIDED = 3  # unknown for longer

    @property
    def word(self) -> str:
        """The side as people read it."""
        return ("false", "unknown", "true", "undecided")[self]


class Outcome(Enum):
    """What a cell of the table says."""

    IN = "in force"
    OUT = "out of force"
    IF_ACT = "in force if the rule says act"
    UNLESS_RELEASE = "in force unless the rule says release"
    IF_ACT_OR_HELD = "in force if the rule says act, or says hold and is a trip or an interlock"
    IF_PROTECTIVE = "in force if the rule is a trip or an interlock, or says act"


F, U, T, X = Side.FALSE, Side.TOLERATED, Side.TRUE, Side.UNDECIDED
_IN, _OUT = Outcome.IN, Outcome.OUT

# (from, until) → what an out-of-force rule becomes, what an in-force rule becomes.
TABLE: dict[tuple[Side, Side], tuple[Outcome, Outcome]] = {
    (T, T): (_IN, _IN),  # and out for an auto rule: see AUTO_TABLE
    (T, F): (_IN, _IN),
    (T, U): (_IN, _IN),
    (T, X): (_IN, _IN),
    (F, T): (_OUT, _OUT),
    (F, F): (_OUT, _IN),
    (F, U): (_OUT, _IN),
    (F, X): (_OUT, Outcome.UNLESS_RELEASE),
    (U, T): (_OUT, Outcome.IF_PROTECTIVE),
    (U, F): (_OUT, _IN),
    (U, U): (_OUT, _IN),
    (U, X): (_OUT, Outcome.UNLESS_RELEASE),
    (X, T): (Outcome.IF_ACT, Outcome.IF_ACT_OR_HELD),
    (X, F): (Outcome.IF_ACT, _IN),
    (X, U): (Outcome.IF_ACT, _IN),
    (X, X): (Outcome.IF_ACT, Outcome.UNLESS_RELEASE),
}

# Where an auto rule differs.
AUTO_TABLE: dict[tuple[Side, Side], tuple[Outcome, Outcome]] = {**TABLE, (T, T): (_OUT, _OUT)}


def decide(cell: Outcome, choice: OnUnknown, *, protective: bool, acts_blindly: bool) -> bool:
    """Return whether a cell of the table means "in force" for a rule of this kind.

    `choice` is what the rule says of unknown at this instant; `acts_blindly` whether its `if_unknown` is `act`.
    """
    match cell:
        case Outcome.IN:
            return True
        case Outcome.OUT:
            return False
        case Outcome.IF_ACT:
            return choice is OnUnknown.ACT
        case Outcome.UNLESS_RELEASE:
            return choice is not OnUnknown.RELEASE
        case Outcome.IF_ACT_OR_HELD:
            return choice is OnUnknown.ACT or (choice is OnUnknown.HOLD and protective)
        case Outcome.IF_PROTECTIVE:
            return protective or acts_blindly
        case _:
            assert_never(cell)


Verdicts = dict[tuple[Side, Side, bool, OnUnknown], bool]


def verdicts(rank: Rank, if_unknown: OnUnknown | Rhythm) -> Verdicts:
    """Return the whole table worked out for one rule: (from, until, in force, choice) → in force."""
    protective = rank != Rank.AUTO
    table = TABLE if protective else AUTO_TABLE
    acts_blindly = if_unknown is OnUnknown.ACT
    return {
        (*sides, in_force, choice): decide(cells[in_force], choice, protective=protective, acts_blindly=acts_blindly)
        for sides, cells in table.items()
        for in_force in (False, True)
        for choice in OnUnknown
    }


# What the two sides are when there is no `until` of its own: it is the mirror image of `from`.
_MIRROR = {F: T, T: F, U: U, X: X}


class _Watch:
    """One condition of a rule with the time since which it has been unknown."""

    __slots__ = ("compiled", "decided_by", "since")

    def __init__(self, compiled: Compiled) -> None:
        self.compiled = compiled
        self.since: int | None = None  # unknown since
        self.decided_by: int | None = None  # when tolerated unknown becomes undecided; each look works it out anew

    def look(self, t: int, tolerance: int, grace_until: int) -> Side:
        """Return what is known of the condition at `t`."""
        truth = self.compiled.evaluate(t)
        if truth != UNKNOWN:
            self.since = self.decided_by = None
            return T if truth else F
        if self.since is None:
            self.since = t
        limit = max(self.since + tolerance, grace_until)
        self.decided_by = limit
        return X if t >= limit else U

    def next_change(self, t: int) -> int | None:
        """Return when the side may next change by itself."""
        change = self.compiled.next_change(t)
        limit = self.decided_by
        if limit is not None and limit > t and (change is None or limit < change):
            return limit
        return change


class Rule:
    """One rule with its state."""

    __slots__ = (
        "_verdicts",
        "deadline",
        "decl",
        "from_",
        "from_side",
        "in_force",
        "inputs",
        "latched",
        "met",
        "until",
        "until_side",
    )

    def __init__(self, decl: RuleDecl, board: Board) -> None:
        self.decl = decl
        self.from_ = _Watch(compile_condition(decl.from_, board))
        self.until = _Watch(compile_condition(decl.until, board)) if decl.until is not None else None
        own = self.until.compiled.inputs if self.until else ()
        self._verdicts = verdicts(decl.rank, decl.if_unknown)
        self.inputs = tuple(sorted({*self.from_.compiled.inputs, *own}))
        self.in_force = self.latched = False
        self.met = False  # decided at least once since the start, or since the link was lost for long
        self.from_side = self.until_side = U
        self.deadline: int | None = None

    def bounds(self, slot: int) -> list[float] | None:
        """Return the constants that the signal in `slot` is compared with, or None when it is read in another way."""
        found: list[float] = []
        for watch in self._watches():
            bounds = watch.compiled.bounds.get(slot, [])
            if bounds is None:
                return None
            found += bounds
        return found

    @property
    def protective(self) -> bool:
        """Whether the rule is a trip or an interlock."""
        return self.decl.rank != Rank.AUTO

    @property
    def blind(self) -> bool:
        """Whether the rule asks for nothing because it cannot be decided."""
        return self.from_side is X and not self.in_force

    def judge(self, t: int, grace_until: int) -> bool:
        """Bring the rule up to `t`; return whether anything that others see has changed."""
        decl = self.decl
        from_ = self.from_.look(t, decl.unknown_for, grace_until)
        until = _MIRROR[from_] if self.until is None else self.until.look(t, decl.unknown_for, grace_until)
        if from_ is self.from_side and until is self.until_side and from_ is not X and until is not X:
            # The table is idempotent, and so is the latch: with both sides as they were, nothing else can have changed.
            self.deadline = self._next_change(t)
            return False
        before = (self.in_force, self.latched, self.from_side, self.until_side)
        self.from_side, self.until_side = from_, until
        choice = self._choice(t, from_, until)
        self.in_force = self.latched or self._verdicts[from_, until, self.in_force, choice]
        self.latched = self.latched or (decl.latch and from_ is T and self.in_force)
        self.deadline = self._next_change(t)
        return before != (self.in_force, self.latched, from_, until)

    def explain(self, t: int) -> dict[str, Any]:
        """Return why the rule is in or out of force, as plain JSON values."""
        told: dict[str, Any] = {"from": self.from_.compiled.explain(t)}
        if self.until is not None:
            told["until"] = self.until.compiled.explain(t)
        return told

    def begin(self, t: int, now: int) -> None:
        """Start at `t` from what was saved at `now`: durations of unknown go on, windows of `for` begin anew."""
        self.met = False
        self.from_side = self.until_side = U
        self.deadline = None
        for watch in self._watches():
            watch.compiled.begin(t)
            watch.decided_by = None
            if watch.since is not None:
                watch.since += t - now

    def save(self) -> dict[str, Any]:
        """Return the state as plain JSON values."""
        return {
            "in_force": self.in_force,
            "latched": self.latched,
            "met": self.met,
            "sides": [int(self.from_side), int(self.until_side)],
            "deadline": self.deadline,
            "watches": [[watch.since, watch.compiled.save()] for watch in self._watches()],
        }

    def restore(self, saved: dict[str, Any]) -> None:
        """Take up the state that `save` returned."""
        self.in_force, self.latched, self.met = saved["in_force"], saved["latched"], saved["met"]
        self.from_side, self.until_side = (Side(side) for side in saved["sides"])
        self.deadline = saved["deadline"]
        for watch, (since, compiled) in zip(self._watches(), saved["watches"], strict=True):
            watch.since = since
            watch.compiled.restore(compiled)

    def _watches(self) -> list[_Watch]:
        return [self.from_] if self.until is None else [self.from_, self.until]

    def _deciding(self, from_: Side, until: Side) -> _Watch | None:
        """Return the condition whose being unknown decides, if any does."""
        if from_ is X:
            return self.from_
        return self.until if until is X else None

    def _choice(self, t: int, from_: Side, until: Side) -> OnUnknown:
        """Return what the rule says of unknown at this instant."""
        deciding = self._deciding(from_, until)
        if deciding is None:
            return OnUnknown.HOLD  # no cell asks
        said = self._said(deciding)
        if isinstance(said, Rhythm):
            return OnUnknown.ACT if _phase(t, deciding, said) < said.act_for else OnUnknown.RELEASE
        return said

    def _said(self, deciding: _Watch) -> OnUnknown | Rhythm:
        decl = self.decl
        if decl.if_blind is not None and deciding.compiled.blind():
            return decl.if_blind
        return decl.if_unknown

    def _next_change(self, t: int) -> int | None:
        """Return when the rule may next change by itself."""
        soonest = self.from_.next_change(t)
        if self.until is not None:
            soonest = earlier(soonest, self.until.next_change(t))
        if self.from_side is not X and self.until_side is not X:
            return soonest
        deciding = self._deciding(self.from_side, self.until_side)
        if deciding is not None and isinstance(said := self._said(deciding), Rhythm):
            phase = _phase(t, deciding, said)
            soonest = earlier(soonest, t + (said.act_for if phase < said.act_for else said.every) - phase)
        return soonest


def earlier(one: int | None, other: int | None) -> int | None:
    """Return the earlier of two times, where None is never."""
    if one is None or (other is not None and other < one):
        return other
    return one


def _phase(t: int, deciding: _Watch, rhythm: Rhythm) -> int:
    """Return how far into its period the rhythm is; it began when the condition became undecided."""
    began = deciding.decided_by if deciding.decided_by is not None else t
    return (t - began) % rhythm.every
