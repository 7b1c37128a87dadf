"""From a checked condition to closures over the board of signals.

A compiled condition is evaluated as a function of time: whatever pass asks, the answer at `t` is the same. Every part
is evaluated every time, since a `for` inside must see each change of its part; nothing is cut short.
"""

from collections.abc import Callable, Sequence
from typing import Any, assert_never

from rules.conditions.board import Board
from rules.conditions.terms import DIGITS, TEST, Number, compared, constant, names_in, product, spread, total
from rules.conditions.timer import Evaluate, Timer
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
from rules.model import Bounds, Fault, saved
from rules.truth import FALSE, TRUE, UNKNOWN, Truth, at_least

Explain = Callable[[int], dict[str, Any]]

_STATUS: dict[str, Callable[[Fault], bool]] = {
    "usable": lambda fault: fault is Fault.NONE,
    "unknown": lambda fault: fault is not Fault.NONE,
    "silent": lambda fault: fault is Fault.SILENT,
    "failed": lambda fault: fault is Fault.FAILED,
}

_FAULT_WORDS = {Fault.NONE: None, Fault.AWAITED: "nothing yet", Fault.SILENT: "silent", Fault.FAILED: "failed"}


class Compiled:
    """One condition with its timers."""

    __slots__ = ("_board", "_timers", "bounds", "evaluate", "explain", "inputs")

    def __init__(
        self, board: Board, inputs: Sequence[int], evaluate: Evaluate, explain: Explain, timers: Sequence[Timer]
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
        self.timers: list[Timer] = []
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

    def number(self, term: Term) -> Number:
        match term:
            case Literal() | Name() if term.quantity is not None:
                constant = term.quantity.value
                return lambda: constant
            case Name():
                return self._signal(self._slot(term.name))
            case Sum():
                return total(self.number(term.left), self.number(term.right), -1.0 if term.minus else 1.0)
            case Product():
                return product(term.factor, self.number(term.term))
            case _:
                raise ValueError(f"{term} has not been checked")

    def _signal(self, slot: int) -> Number:
        values = self.board.values

        def read() -> float | Bounds | None:
            value = values[slot]
            return value if isinstance(value, float | Bounds) else None

        return read

    # ---- basic conditions -----------------------------------------------------------------------------------------

    def _comparison(self, node: Comparison) -> tuple[Evaluate, Explain]:
        relation = node.relation
        fast = self._against_constant(node)
        if fast is not None:
            return self._explained(node, fast, (node.left, node.right))
        left, right = self.number(node.left), self.number(node.right)

        def evaluate(_: int) -> int:
            a, b = left(), right()
            return UNKNOWN if a is None or b is None else compared(relation, spread(a), spread(b))

        return self._explained(node, evaluate, (node.left, node.right))

    def _against_constant(self, node: Comparison) -> Evaluate | None:
        """Return the form for the commonest comparison, a signal with a constant; None when it is not one."""
        left, bound = node.left, constant(node.right)
        if not isinstance(left, Name) or left.quantity is not None or bound is None:
            return None
        slot, values, relation = self.board.slot[left.name], self.board.values, node.relation
        test, bound = TEST[relation], round(bound, DIGITS)
        exact = spread(bound)
        self.inputs.append(slot)
        bounds = self.bounds.setdefault(slot, [])
        if bounds is not None:
            bounds.append(bound)

        def evaluate(_: int) -> int:
            value = values[slot]
            if isinstance(value, float):
                return TRUE if test(round(value, DIGITS), bound) else FALSE
            return compared(relation, spread(value), exact) if isinstance(value, Bounds) else UNKNOWN

        return evaluate

    def _between(self, node: Between) -> tuple[Evaluate, Explain]:
        value, low, high = self.number(node.term), self.number(node.low), self.number(node.high)

        def evaluate(_: int) -> int:
            x, a, b = value(), low(), high()
            if x is None or a is None or b is None:
                return UNKNOWN
            x = spread(x)
            return min(
                compared(Relation.AT_LEAST, x, spread(a)),
                compared(Relation.AT_MOST, x, spread(b)),
            )

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
        timer = Timer(part, node.nanoseconds)
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
        names = [name for term in terms for name in names_in(term)]

        def explain(t: int) -> dict[str, Any]:
            return {
                "text": str(node),
                "truth": Truth(evaluate(t)).word,
                "terms": [_term(board, name) for name in names],
            }

        return evaluate, explain


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


def _term(board: Board, name: Name) -> dict[str, Any]:
    """Return one name of a comparison with its value, for people."""
    if name.quantity is not None:
        return {"name": name.name, "value": name.quantity.value, "unit": name.quantity.dimension.unit, "fault": None}
    slot = board.slot[name.name]
    value, fault = saved(board.values[slot]), _FAULT_WORDS[board.faults[slot]]
    return {"name": name.name, "value": value, "unit": board.unit.get(name.name, ""), "fault": fault}
