"""What the tests of conditions share: signals with short names, sentences over them, and a board to set."""

from collections.abc import Iterable

from rules.conditions.board import Board
from rules.conditions.check import Meaning, check
from rules.conditions.compile import Compiled, compile_condition
from rules.conditions.parse import parse
from rules.conditions.tree import SECOND, Condition
from rules.model import ActuatorDecl, Bounds, Fault, Signal, SignalDecl, Value
from rules.quantity import Dimension, Quantity
from rules.truth import FALSE, TRUE

CONTACTS = ("a", "b", "c")
SIGNALS = (
    *(SignalDecl(name=name, words=("yes", "no")) for name in CONTACTS),
    SignalDecl(name="x", dimension=Dimension.LENGTH),
    SignalDecl(name="y", dimension=Dimension.LENGTH),
)


class Scope:
    """Declared signals and actuators, each by its own name."""

    def __init__(self, declared: Iterable[SignalDecl | ActuatorDecl] = SIGNALS) -> None:
        self._declared = {decl.name: decl for decl in declared}

    def resolve(self, name: str) -> Meaning | None:
        """Return what was declared under the name."""
        return self._declared.get(name)

    def known(self) -> Iterable[str]:
        """Return the names."""
        return self._declared

    def full_scale(self, name: str) -> Quantity | None:
        """Return nothing: there is no brim."""
        del name
        return None


def read(text: str) -> Quantity:
    """Return a value in metres, seconds or as a plain number."""
    number, _, unit = text.partition(" ")
    return Quantity(float(number), {"m": Dimension.LENGTH, "s": Dimension.TIME}.get(unit, Dimension.NUMBER))


def sentence(text: str, declared: Iterable[SignalDecl | ActuatorDecl] = SIGNALS) -> Condition:
    """Return a checked condition."""
    return check(parse(text), Scope(declared), read)


class Trial:
    """One condition on a board of its own, from the start at 0 on."""

    def __init__(self, text: str) -> None:
        self.board = Board(SIGNALS, ())
        self.compiled: Compiled = compile_condition(sentence(text), self.board)
        self.compiled.begin(0)

    def put(self, name: str, truth: int | None = None, *, value: float | Bounds | None = None) -> None:
        """Let a contact be yes, no or unknown; or the quantity be a value, or known within bounds."""
        words: dict[int, str] = {TRUE: "yes", FALSE: "no"}
        word: Value = words.get(truth) if truth is not None else value
        self.board.put(self.board.slot[name], Signal(word, Fault.NONE if word is not None else Fault.SILENT))

    def at(self, seconds: float) -> int:
        """Return the truth at a time."""
        return self.compiled.evaluate(round(seconds * SECOND))
