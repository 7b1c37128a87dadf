"""The tree of a condition, as written and as checked.

Frozen nodes and nothing else. In a tree as written, names and values are text with their column; in a checked tree,
names are full (`tank.name`) and values are in SI units. `str(node)` is the canonical text, with all parentheses; it
reads back to the same tree.
"""

from dataclasses import dataclass, field
from enum import StrEnum

from rules.quantity import Quantity

SECOND = 1_000_000_000


class Relation(StrEnum):
    """How two quantities are compared. `>` and its kin are other spellings of the same four."""

    ABOVE = "above"
    BELOW = "below"
    AT_LEAST = "at least"
    AT_MOST = "at most"


@dataclass(frozen=True, slots=True)
class Literal:
    """A value with its unit as it was written; `quantity` once checked."""

    text: str
    quantity: Quantity | None = None
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the value as it was written."""
        return self.text


@dataclass(frozen=True, slots=True)
class Name:
    """A signal, an actuator, or a constant of a tank. `quantity` is the value of a constant, once checked."""

    name: str
    quantity: Quantity | None = None
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the name."""
        return self.name


@dataclass(frozen=True, slots=True)
class Sum:
    """The sum, or with `minus` the difference, of two quantities."""

    left: "Term"
    right: "Term"
    minus: bool = False

    def __str__(self) -> str:
        """Return the sum in parentheses."""
        return f"({self.left} {'-' if self.minus else '+'} {self.right})"


@dataclass(frozen=True, slots=True)
class Product:
    """A quantity times a plain number."""

    factor: float
    term: "Term"

    def __str__(self) -> str:
        """Return the product in parentheses."""
        return f"({self.factor!r} * {self.term})"


Term = Literal | Name | Sum | Product


@dataclass(frozen=True, slots=True)
class Comparison:
    """`quantity relation quantity`."""

    left: Term
    relation: Relation
    right: Term
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the comparison."""
        return f"{self.left} {self.relation} {self.right}"


@dataclass(frozen=True, slots=True)
class Between:
    """`quantity between low and high`, both ends included."""

    term: Term
    low: Term
    high: Term
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the comparison."""
        return f"{self.term} between {self.low} and {self.high}"


@dataclass(frozen=True, slots=True)
class Is:
    """`name is word`: the word of a contact, or the state of an actuator."""

    name: str
    word: str
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the comparison."""
        return f"{self.name} is {self.word}"


@dataclass(frozen=True, slots=True)
class Commanded:
    """`actuator commanded state`."""

    name: str
    word: str
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the comparison."""
        return f"{self.name} commanded {self.word}"


@dataclass(frozen=True, slots=True)
class Status:
    """`name is usable`, `unknown`, `silent` or `failed`: always true or false, never unknown."""

    name: str
    word: str
    column: int = field(default=0, compare=False)

    def __str__(self) -> str:
        """Return the comparison."""
        return f"{self.name} is {self.word}"


@dataclass(frozen=True, slots=True)
class Not:
    """True where the part is false."""

    part: "Condition"

    def __str__(self) -> str:
        """Return the negation, its part in parentheses where that has more than one word to it."""
        return f"not {_grouped(self.part)}"


@dataclass(frozen=True, slots=True)
class And:
    """True where every part is true."""

    parts: tuple["Condition", ...]

    def __str__(self) -> str:
        """Return the parts, each in parentheses."""
        return " and ".join(_grouped(part) for part in self.parts)


@dataclass(frozen=True, slots=True)
class Or:
    """True where some part is true."""

    parts: tuple["Condition", ...]

    def __str__(self) -> str:
        """Return the parts, each in parentheses."""
        return " or ".join(_grouped(part) for part in self.parts)


@dataclass(frozen=True, slots=True)
class AtLeast:
    """True where at least `needed` of the parts are true."""

    needed: int
    parts: tuple["Condition", ...]

    def __str__(self) -> str:
        """Return the vote."""
        return f"at least {self.needed} of ({', '.join(str(part) for part in self.parts)})"


@dataclass(frozen=True, slots=True)
class Held:
    """True once the part has been true for the whole duration, without a break."""

    part: "Condition"
    duration: Literal

    @property
    def nanoseconds(self) -> int:
        """The duration, once checked."""
        return 0 if self.duration.quantity is None else round(self.duration.quantity.value * SECOND)

    def __str__(self) -> str:
        """Return the part in parentheses, and the duration."""
        return f"{_grouped(self.part)} for {self.duration}"


Condition = Comparison | Between | Is | Commanded | Status | Not | And | Or | AtLeast | Held


def _grouped(part: Condition) -> str:
    """Return the text of a part, in parentheses, so that no reader needs to know what binds tighter."""
    return f"({part})"
