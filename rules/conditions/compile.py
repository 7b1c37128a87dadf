"""From a checked condition to closures over the board of signals.

A compiled condition is evaluated as a function of time: whatever pass asks, the answer at `t` is the same. Every part
is evaluated every time, since a `for` inside must see each change of its part; nothing is cut short.

`X for d` at `t` is the least that X was at any instant of the closed window [t - d, t]. Its state is three values: what
X is now, `f` the end of X's latest false stretch, `u` the end of its latest unknown stretch. On signals that are never
unknown this is the on-delay (TON) of IEC 61131-3 evaluated at its exact expiry.
"""

import operator
from collections.abc import Callable, Iterable, Sequence
from typing import Any, assert_never

from rules.conditions.tree import (
    SECOND,
    And,
    AtLeast,
    Between,
    Commanded,
    Comparison,
    Condition,
    Held,
    Is,
    Literal,
    Name,
    Not,
    Or,
    Product,
    Relation,
    Status,
    Sum,
    Term,
)
from rules.model import ActuatorDecl, Fault, Signal, SignalDecl
from rules.truth import FALSE, TRUE, UNKNOWN, Truth, at_least

DIGITS = 6  # levels are compared to a micrometre: below that, the arithmetic's own noise would decide

Evaluate = Callable[[int], int]
Explain = Callable[[int], dict[str, Any]]
_Number = Callable[[], float | None]

_TEST: dict[Relation, Callable[[float, float], bool]] = {
    Relation.ABOVE: operator.gt,
    Relation.BELOW: operator.lt,
    Relation.AT_LEAST: operator.ge,
    Relation.AT_MOST: operator.le,
}

_STATUS: dict[str, Callable[[Fault], bool]] = {
    "usable": lambda fault: fault is Fault.NONE,
    "unknown": lambda fault: fault is not Fault.NONE,
    "silent": lambda fault: fault is Fault.SILENT,
    "failed": lambda fault: fault is Fault.FAILED,
}

_FAULT_WORDS = {Fault.NONE: None, Fault.AWAITED: "nothing yet", Fault.SILENT: "silent", Fault.FAILED: "failed"}


class Board:
    """Every signal as it is now. An actuator is a signal too: its value is the state it was last commanded to."""

    def __init__(self, signals: Iterable[SignalDecl], actuators: Iterable[ActuatorDecl]) -> None:
        decls = list(signals)
        names = [decl.name for decl in decls] + [decl.name for decl in actuators]
        self.slot = {name: slot for slot, name in enumerate(names)}
        self.unit = {decl.name: decl.dimension.unit if decl.dimension else "" for decl in decls}
        self.values: list[float | str | None] = [None] * len(names)
        self.faults: list[Fault] = [Fault.AWAITED] * len(names)

    def put(self, slot: int, signal: Signal) -> None:
        """Let a signal be what it is now."""
        self.values[slot], self.faults[slot] = signal

    def forget(self) -> None:
        """Know nothing of any signal."""
        self.values[:] = [None] * len(self.values)
        self.faults[:] = [Fault.AWAITED] * len(self.faults)

    def save(self) -> list[list[Any]]:
        """Return every signal as plain JSON values."""
        return [self.values[:], [int(fault) for fault in self.faults]]

    def restore(self, saved: list[list[Any]]) -> None:
        """Take up what `save` returned."""
        self.values[:] = saved[0]
        self.faults[:] = [Fault(fault) for fault in saved[1]]


class _Timer:
    """The state of one `for`."""

    __slots__ = ("duration", "false_end", "now", "part", "unknown_end")

    def __init__(self, part: Evaluate, duration: int) -> None:
        self.part = part
        self.duration = duration
        self.now: int = UNKNOWN
        self.false_end: int | None = None  # None: it never was false
        self.unknown_end: int | None = None

    def evaluate(self, t: int) -> int:
        """Return the least of the window that ends at `t`."""
        now = self.part(t)
        if now != self.now:
            if self.now == FALSE:
                self.false_end = t
            elif self.now == UNKNOWN:
                self.unknown_end = t
            self.now = now
        since = t - self.duration
        if now == FALSE or (self.false_end is not None and since < self.false_end):
            return FALSE
        if now == UNKNOWN or (self.unknown_end is not None and since < self.unknown_end):
            return UNKNOWN
        return TRUE

    def next_change(self, t: int) -> int | None:
        """Return when the answer may change by itself, after `t`."""
        if self.now == FALSE:
            return None
        if self.false_end is not None and (due := self.false_end + self.duration) > t:
            return due
        if self.now == TRUE and self.unknown_end is not None and (due := self.unknown_end + self.duration) > t:
            return due
        return None

    def begin(self, t: int) -> None:
        """Forget all: before `t` nothing is known."""
        self.now = UNKNOWN
        self.false_end, self.unknown_end = None, t

    def holding_since(self) -> int | None:
        """Return since when the part is true, or None."""
        if self.now != TRUE:
            return None
        return max((end for end in (self.false_end, self.unknown_end) if end is not None), default=None)


class Compiled:
    """One condition with its timers."""

    __slots__ = ("_board", "_timers", "bounds", "evaluate", "explain", "inputs")

    def __init__(
        self, board: Board, inputs: Sequence[int], evaluate: Evaluate, explain: Explain, timers: Sequence[_Timer]
    ) -> None:
        self._board = board
        self._timers = tuple(timers)
        self.inputs = tuple(sorted(set(inputs)))
        self.bounds: dict[int, list[float] | None] = {}  # see `_Workshop.bounds`
        self.evaluate = evaluate
        self.explain = explain

    def next_change(self, t: int) -> int | None:
        """Return the earliest time after `t` at which the truth may change by itself."""
        if not self._timers:
            return None
        soonest: int | None = None
        for timer in self._timers:
            due = timer.next_change(t)
            if due is not None and (soonest is None or due < soonest):
                soonest = due
        return soonest

    def blind(self) -> bool:
        """Return whether it reads signals, and not one of them is usable."""
        faults = self._board.faults
        return bool(self.inputs) and all(faults[slot] is not Fault.NONE for slot in self.inputs)

    def begin(self, t: int) -> None:
        """Begin at `t`: no `for` remembers anything before it."""
        for timer in self._timers:
            timer.begin(t)

    def save(self) -> list[list[int | None]]:
        """Return the timers' state as plain JSON values."""
        return [[int(timer.now), timer.false_end, timer.unknown_end] for timer in self._timers]

    def restore(self, saved: list[list[int | None]]) -> None:
        """Take up the state that `save` returned."""
        for timer, (now, false_end, unknown_end) in zip(self._timers, saved, strict=True):
            timer.now = UNKNOWN if now is None else now
            timer.false_end, timer.unknown_end = false_end, unknown_end


def compile_condition(tree: Condition, board: Board) -> Compiled:
    """Return `tree`, which has been checked, ready to be evaluated on `board`."""
    workshop = _Workshop(board)
    evaluate, explain = workshop.condition(tree)
    compiled = Compiled(board, workshop.inputs, evaluate, explain, workshop.timers)
    compiled.bounds = workshop.bounds
    return compiled


class _Workshop:
    """Compiles one condition, gathering its inputs and timers, inner timers first."""

    def __init__(self, board: Board) -> None:
        self.board = board
        self.inputs: list[int] = []
        self.timers: list[_Timer] = []
        # For each slot that is only compared with constants, those constants: while a value stays between the same two
        # of them, no truth changes. None for a slot that is read in any other way.
        self.bounds: dict[int, list[float] | None] = {}

    def condition(self, node: Condition) -> tuple[Evaluate, Explain]:
        match node:
            case Comparison():
                return self._comparison(node)
            case Between():
                return self._between(node)
            case Is() | Commanded():
                return self._word(node)
            case Status():
                return self._status(node)
            case Not():
                return self._not(node)
            case And() | Or() | AtLeast():
                return self._many(node)
            case Held():
                return self._held(node)
            case _:
                assert_never(node)

    # ---- quantities -----------------------------------------------------------------------------------------------

    def _slot(self, name: str) -> int:
        slot = self.board.slot[name]
        self.inputs.append(slot)
        self.bounds[slot] = None
        return slot

    def number(self, term: Term) -> _Number:
        match term:
            case Literal() | Name() if term.quantity is not None:
                constant = term.quantity.value
                return lambda: constant
            case Name():
                return self._signal(self._slot(term.name))
            case Sum():
                return _sum(self.number(term.left), self.number(term.right), -1.0 if term.minus else 1.0)
            case Product():
                return _product(term.factor, self.number(term.term))
            case _:
                raise ValueError(f"{term} has not been checked")

    def _signal(self, slot: int) -> _Number:
        values = self.board.values

        def read() -> float | None:
            value = values[slot]
            return value if isinstance(value, float) else None

        return read

    # ---- basic conditions -----------------------------------------------------------------------------------------

    def _comparison(self, node: Comparison) -> tuple[Evaluate, Explain]:
        test = _TEST[node.relation]
        fast = self._against_constant(node)
        if fast is not None:
            return self._explained(node, fast, (node.left, node.right))
        left, right = self.number(node.left), self.number(node.right)

        def evaluate(_: int) -> int:
            a, b = left(), right()
            if a is None or b is None:
                return UNKNOWN
            return TRUE if test(round(a, DIGITS), round(b, DIGITS)) else FALSE

        return self._explained(node, evaluate, (node.left, node.right))

    def _against_constant(self, node: Comparison) -> Evaluate | None:
        """Return the form for the commonest comparison, a signal with a constant; None when it is not one."""
        left, bound = node.left, constant(node.right)
        if not isinstance(left, Name) or left.quantity is not None or bound is None:
            return None
        slot, values, test = self.board.slot[left.name], self.board.values, _TEST[node.relation]
        bound = round(bound, DIGITS)
        self.inputs.append(slot)
        bounds = self.bounds.setdefault(slot, [])
        if bounds is not None:
            bounds.append(bound)

        def evaluate(_: int) -> int:
            value = values[slot]
            if value is None:
                return UNKNOWN
            return TRUE if test(round(value, DIGITS), bound) else FALSE  # type: ignore[arg-type]  # a number: checked

        return evaluate

    def _between(self, node: Between) -> tuple[Evaluate, Explain]:
        value, low, high = self.number(node.term), self.number(node.low), self.number(node.high)

        def evaluate(_: int) -> int:
            x, a, b = value(), low(), high()
            if x is None or a is None or b is None:
                return UNKNOWN
            return TRUE if round(a, DIGITS) <= round(x, DIGITS) <= round(b, DIGITS) else FALSE

        return self._explained(node, evaluate, (node.term, node.low, node.high))

    def _word(self, node: Is | Commanded) -> tuple[Evaluate, Explain]:
        slot, values, word = self._slot(node.name), self.board.values, node.word

        def evaluate(_: int) -> int:
            value = values[slot]
            if value is None:
                return UNKNOWN
            return TRUE if value == word else FALSE

        return self._explained(node, evaluate, (Name(node.name),))

    def _status(self, node: Status) -> tuple[Evaluate, Explain]:
        slot, faults, test = self._slot(node.name), self.board.faults, _STATUS[node.word]

        def evaluate(_: int) -> int:
            return TRUE if test(faults[slot]) else FALSE

        return self._explained(node, evaluate, (Name(node.name),))

    # ---- logical words --------------------------------------------------------------------------------------------

    def _not(self, node: Not) -> tuple[Evaluate, Explain]:
        part, told = self.condition(node.part)

        def evaluate(t: int) -> int:
            return 2 - part(t)

        return evaluate, _composed(node, evaluate, (told,))

    def _many(self, node: And | Or | AtLeast) -> tuple[Evaluate, Explain]:
        pairs = [self.condition(part) for part in node.parts]
        parts = [evaluate for evaluate, _ in pairs]
        evaluate = _joined(node, parts)
        return evaluate, _composed(node, evaluate, tuple(told for _, told in pairs))

    def _held(self, node: Held) -> tuple[Evaluate, Explain]:
        part, told = self.condition(node.part)
        timer = _Timer(part, node.nanoseconds)
        self.timers.append(timer)

        def explain(t: int) -> dict[str, Any]:
            return {
                "text": str(node),
                "truth": Truth(timer.evaluate(t)).word,
                "for_s": timer.duration / SECOND,
                "since": timer.holding_since(),
                "until_change": timer.next_change(t),
                "parts": [told(t)],
            }

        return timer.evaluate, explain

    # ---- explanation ----------------------------------------------------------------------------------------------

    def _explained(self, node: Condition, evaluate: Evaluate, terms: tuple[Term, ...]) -> tuple[Evaluate, Explain]:
        board = self.board
        names = [name for term in terms for name in _names(term)]

        def explain(t: int) -> dict[str, Any]:
            return {
                "text": str(node),
                "truth": Truth(evaluate(t)).word,
                "terms": [_term(board, name) for name in names],
            }

        return evaluate, explain


def constant(term: Term) -> float | None:
    """Return what a checked term is worth when it never changes, else None."""
    match term:
        case Literal() | Name():
            return None if term.quantity is None else term.quantity.value
        case Sum():
            left, right = constant(term.left), constant(term.right)
            return None if left is None or right is None else left + (-right if term.minus else right)
        case Product():
            inner = constant(term.term)
            return None if inner is None else term.factor * inner
        case _:
            assert_never(term)


def _sum(left: _Number, right: _Number, sign: float) -> _Number:
    def read() -> float | None:
        a, b = left(), right()
        return None if a is None or b is None else a + sign * b

    return read


def _product(factor: float, term: _Number) -> _Number:
    def read() -> float | None:
        value = term()
        return None if value is None else factor * value

    return read


def _joined(node: And | Or | AtLeast, parts: list[Evaluate]) -> Evaluate:
    match node:
        case And():
            return lambda t: min([part(t) for part in parts])
        case Or():
            return lambda t: max([part(t) for part in parts])
        case AtLeast():
            needed = node.needed
            return lambda t: at_least(needed, [part(t) for part in parts])
        case _:
            assert_never(node)


def _composed(node: Condition, evaluate: Evaluate, told: tuple[Explain, ...]) -> Explain:
    def explain(t: int) -> dict[str, Any]:
        return {"text": str(node), "truth": Truth(evaluate(t)).word, "parts": [part(t) for part in told]}

    return explain


def _names(term: Term) -> list[Name]:
    match term:
        case Name():
            return [term]
        case Sum():
            return _names(term.left) + _names(term.right)
        case Product():
            return _names(term.term)
        case _:
            return []


def _term(board: Board, name: Name) -> dict[str, Any]:
    """Return one name of a comparison with its value, for people."""
    if name.quantity is not None:
        return {"name": name.name, "value": name.quantity.value, "unit": name.quantity.dimension.unit, "fault": None}
    slot = board.slot[name.name]
    fault = _FAULT_WORDS[board.faults[slot]]
    return {"name": name.name, "value": board.values[slot], "unit": board.unit.get(name.name, ""), "fault": fault}
