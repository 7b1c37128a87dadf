"""From a tree as written to a checked one: every name known, every unit fitting, every word one that can occur.

What a name means is asked of a `Scope`, how a value with its unit reads of `read`; so this package knows neither the
user's files nor a unit library.
"""

import difflib
from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from typing import Protocol, assert_never

from rules.conditions.errors import ConditionError
from rules.conditions.terms import constant
from rules.conditions.tree import (
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
    Status,
    Sum,
    Term,
)
from rules.model import ActuatorDecl, SignalDecl
from rules.quantity import Dimension, Quantity

Read = Callable[[str], Quantity]


@dataclass(frozen=True, slots=True)
class Constant:
    """A quantity of a tank that never changes, under its full name: the brim, the suction level."""

    name: str
    quantity: Quantity


Meaning = SignalDecl | ActuatorDecl | Constant


class Scope(Protocol):
    """What names mean where a condition stands."""

    def resolve(self, name: str) -> Meaning | None:
        """Return what `name`, as written, stands for."""

    def known(self) -> Iterable[str]:
        """Return every name that could stand here, as it would be written."""

    def full_scale(self, name: str) -> Quantity | None:
        """Return what 100 % of the signal with the full name `name` is, if that is known."""


def check(tree: Condition, scope: Scope, read: Read) -> Condition:
    """Return `tree` with full names and SI values; raise ConditionError at the first thing that does not fit."""
    return _Checker(scope, read).condition(tree)


class _Checker:
    def __init__(self, scope: Scope, read: Read) -> None:
        self.scope = scope
        self.read = read

    def condition(self, node: Condition) -> Condition:
        match node:
            case Comparison():
                left, right = self.alike(node.left, node.right)
                return replace(node, left=left, right=right)
            case Between():
                return self.between(node)
            case Is():
                return self.word(node)
            case Commanded():
                return self.commanded(node)
            case Status():
                return self.status(node)
            case Not():
                return Not(self.condition(node.part))
            case And() | Or():
                return type(node)(tuple(self.condition(part) for part in node.parts))
            case AtLeast():
                return AtLeast(node.needed, tuple(self.condition(part) for part in node.parts))
            case Held():
                return Held(self.condition(node.part), self.duration(node.duration))
            case _:
                assert_never(node)

    # ---- names ----------------------------------------------------------------------------------------------------

    def meaning(self, name: str, column: int) -> Meaning:
        """Return what a name stands for."""
        meaning = self.scope.resolve(name)
        if meaning is None:
            raise self.unknown(name, column)
        return meaning

    def unknown(self, name: str, column: int) -> ConditionError:
        """Return the complaint about a name that stands for nothing."""
        nearest = difflib.get_close_matches(name, list(self.scope.known()), n=1)
        hint = f"; did you mean `{nearest[0]}`?" if nearest else ""
        before, minus, _ = name.partition("-")
        if minus and not nearest and self.scope.resolve(before) is not None:
            hint = "; a minus sign needs blanks around it"
        return ConditionError(
            f"`{name}` is not known here{hint}",
            column,
            found=name,
            expected="the name of a sensor, a tank's level or an actuator",
            nearest=nearest[0] if nearest else "",
        )

    # ---- words ----------------------------------------------------------------------------------------------------

    def word(self, node: Is) -> Condition:
        meaning = self.meaning(node.name, node.column)
        match meaning:
            case SignalDecl(words=words) if words:
                self.among(node.word, words, node, f"`{node.name}` can be")
            case ActuatorDecl():
                self.among(node.word, meaning.states, node, f"`{node.name}` can be")
            case _:
                raise ConditionError(
                    f"`{node.name}` is a quantity; compare it, as in `{node.name} above …`",
                    node.column,
                    found=node.word,
                )
        return replace(node, name=meaning.name)

    def commanded(self, node: Commanded) -> Condition:
        meaning = self.meaning(node.name, node.column)
        if not isinstance(meaning, ActuatorDecl):
            raise ConditionError(f"`{node.name}` is no actuator, so nothing commands it", node.column, found=node.name)
        self.among(node.word, meaning.states, node, f"`{node.name}` can be commanded")
        return replace(node, name=meaning.name)

    def status(self, node: Status) -> Condition:
        meaning = self.meaning(node.name, node.column)
        if not isinstance(meaning, SignalDecl):
            raise ConditionError(
                f"`{node.name}` is no signal, so it is never {node.word}", node.column, found=node.name
            )
        return replace(node, name=meaning.name)

    @staticmethod
    def among(word: str, words: tuple[str, ...], node: Is | Commanded, subject: str) -> None:
        """Raise unless `word` is one of `words`."""
        if word in words:
            return
        listed = ", ".join(words)
        nearest = difflib.get_close_matches(word, words, n=1)
        raise ConditionError(
            f"{subject} {listed}, never `{word}`",
            node.column,
            found=word,
            expected=listed,
            nearest=nearest[0] if nearest else "",
        )

    # ---- quantities -----------------------------------------------------------------------------------------------

    def alike(self, left: Term, right: Term) -> tuple[Term, Term]:
        """Return both terms checked; raise unless they are of one dimension, with percentages turned into it."""
        left, right = self.term(left), self.term(right)
        left, right = self.scaled(left, right), self.scaled(right, left)
        one, other = self.dimension(left), self.dimension(right)
        if one is not other:
            # The side that is plainly written is the one to mend: a literal rather than a name.
            wrong, fine = (left, right) if isinstance(left, Literal) else (right, left)
            raise self.mismatch(wrong, fine)
        return left, right

    def mismatch(self, wrong: Term, fine: Term) -> ConditionError:
        """Return the complaint about a term that is of another kind than what it is compared with."""
        wanted, got = self.dimension(fine), self.dimension(wrong)
        if got is Dimension.NUMBER:
            message = f"`{wrong}` needs a unit: `{fine}` is {wanted.words}, held in {wanted.unit}"
        else:
            message = f"`{wrong}` is {got.words}, but `{fine}` is {wanted.words}"
        return ConditionError(message, _column(wrong), found=str(wrong), expected=wanted.words)

    def term(self, term: Term) -> Term:
        match term:
            case Literal():
                return replace(term, quantity=self.literal(term))
            case Name():
                return self.name(term)
            case Sum():
                left, right = self.alike(term.left, term.right)
                return Sum(left, right, term.minus)
            case Product():
                return Product(term.factor, self.term(term.term))
            case _:
                assert_never(term)

    def name(self, term: Name) -> Name:
        meaning = self.meaning(term.name, term.column)
        match meaning:
            case Constant():
                return replace(term, name=meaning.name, quantity=meaning.quantity)
            case SignalDecl(dimension=Dimension()):
                return replace(term, name=meaning.name)
            case SignalDecl(words=words):
                listed = ", ".join(words)
                raise ConditionError(
                    f"`{term.name}` is a contact; ask `{term.name} is …` with one of {listed}",
                    term.column,
                    found=term.name,
                )
            case _:
                raise ConditionError(
                    f"`{term.name}` is an actuator; ask `{term.name} is …`", term.column, found=term.name
                )

    def literal(self, term: Literal) -> Quantity:
        try:
            return self.read(term.text)
        except ValueError as problem:
            raise ConditionError(str(problem), term.column, found=term.text) from None

    def scaled(self, term: Term, beside: Term) -> Term:
        """Return a percentage as the share that it is of the signal beside it; anything else as it is."""
        if not isinstance(term, Literal) or self.dimension(term) is not Dimension.SHARE or term.quantity is None:
            return term
        full = next((full for name in _names(beside) if (full := self.scope.full_scale(name)) is not None), None)
        if full is None:
            raise ConditionError(f"`{term}` of what? `{beside}` has no brim to be a percentage of", term.column)
        return replace(term, quantity=Quantity(term.quantity.value * full.value, full.dimension))

    def dimension(self, term: Term) -> Dimension:
        match term:
            case Literal() | Name() if term.quantity is not None:
                return term.quantity.dimension
            case Name():
                meaning = self.scope.resolve(term.name)
                found = meaning.dimension if isinstance(meaning, SignalDecl) else None
                return found or Dimension.NUMBER
            case Sum():
                return self.dimension(term.left)
            case Product():
                return self.dimension(term.term)
            case _:
                return Dimension.NUMBER

    def between(self, node: Between) -> Between:
        term, low = self.alike(node.term, node.low)
        _, high = self.alike(node.term, node.high)
        least, most = constant(low), constant(high)
        if least is not None and most is not None and least > most:
            message = f"`{node.low}` is more than `{node.high}`, so this is never true; the lower one comes first"
            raise ConditionError(message, _column(node.low), found=str(node.low))
        return replace(node, term=term, low=low, high=high)

    def duration(self, term: Literal) -> Literal:
        quantity = self.literal(term)
        if quantity.dimension is not Dimension.TIME:
            raise ConditionError(
                f"`for` takes a time such as `10 s`, not `{term}`", term.column, found=term.text, expected="a time"
            )
        if quantity.value < 0:
            raise ConditionError(f"`{term}`: a time cannot be negative", term.column, found=term.text)
        return replace(term, quantity=quantity)


def _names(term: Term) -> list[str]:
    match term:
        case Name():
            return [term.name]
        case Sum():
            return _names(term.left) + _names(term.right)
        case Product():
            return _names(term.term)
        case _:
            return []


def _column(term: Term) -> int:
    match term:
        case Literal() | Name():
            return term.column
        case Sum():
            return _column(term.left)
        case Product():
            return _column(term.term)
        case _:
            assert_never(term)
