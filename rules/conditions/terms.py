"""Numbers in conditions, and how they compare: known exactly, known only within bounds, or not known.

A comparison of bounds is decided where it is the same for every value within them. Values are compared to a
micrometre: below that, the arithmetic's own noise would decide.
"""

import operator
from collections.abc import Callable
from dataclasses import fields, is_dataclass
from typing import assert_never

from rules.conditions.tree import Commanded, Is, Literal, Name, Product, Relation, Status, Sum, Term
from rules.model import Bounds
from rules.truth import FALSE, TRUE, UNKNOWN

DIGITS = 6

Number = Callable[[], float | Bounds | None]

TEST: dict[Relation, Callable[[float, float], bool]] = {
    Relation.ABOVE: operator.gt,
    Relation.BELOW: operator.lt,
    Relation.AT_LEAST: operator.ge,
    Relation.AT_MOST: operator.le,
}


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


def total(left: Number, right: Number, sign: float) -> Number:
    """Return the sum of two numbers, the second times `sign`."""

    def read() -> float | Bounds | None:
        a, b = left(), right()
        if a is None or b is None:
            return None
        if isinstance(a, float) and isinstance(b, float):
            return a + sign * b
        one, other = spread(a), scaled(sign, spread(b))
        return Bounds(one.low + other.low, one.high + other.high)

    return read


def product(factor: float, term: Number) -> Number:
    """Return a number times a plain one."""

    def read() -> float | Bounds | None:
        value = term()
        return scaled(factor, value) if isinstance(value, Bounds) else None if value is None else factor * value

    return read


def spread(value: float | Bounds) -> Bounds:
    """Return a value as bounds."""
    return value if isinstance(value, Bounds) else Bounds(value, value)


def scaled(factor: float, value: Bounds) -> Bounds:
    """Return bounds times a plain number."""
    if factor == 0.0:
        return Bounds(0.0, 0.0)
    ends = factor * value.low, factor * value.high
    return Bounds(min(ends), max(ends))


def compared(relation: Relation, left: Bounds, right: Bounds) -> int:
    """Return whether the relation holds for every pair of values within the bounds, for none, or for some."""
    test = TEST[relation]
    upward = relation in {Relation.ABOVE, Relation.AT_LEAST}
    worst = (left.low, right.high) if upward else (left.high, right.low)
    best = (left.high, right.low) if upward else (left.low, right.high)
    if test(round(worst[0], DIGITS), round(worst[1], DIGITS)):
        return TRUE
    return UNKNOWN if test(round(best[0], DIGITS), round(best[1], DIGITS)) else FALSE


def names_in(term: Term) -> list[Name]:
    """Return every name in a term, in the order in which they are written."""
    match term:
        case Name():
            return [term]
        case Sum():
            return names_in(term.left) + names_in(term.right)
        case Product():
            return names_in(term.term)
        case _:
            return []


def names_of(tree: object) -> set[str]:
    """Return the name of everything that a condition, or a part of one, reads."""
    if isinstance(tree, tuple):
        return {name for part in tree for name in names_of(part)}
    if isinstance(tree, Literal) or not is_dataclass(tree):
        return set()
    if isinstance(tree, Name | Is | Commanded | Status):
        return {tree.name}
    return {name for part in fields(tree) for name in names_of(getattr(tree, part.name))}
