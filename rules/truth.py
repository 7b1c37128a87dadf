"""Three-valued truth: strong Kleene logic on whole numbers.

False, unknown and true are 0, 1 and 2, so that `and` is the least, `or` the greatest and `not` the mirror image.
Nothing else lives here.

Source: S. C. Kleene, Introduction to Metamathematics, 1952, section 64.
"""

from collections.abc import Iterable
from enum import IntEnum


class Truth(IntEnum):
    """A truth value; the order of the numbers is the order of truth."""

    FALSE = 0
    UNKNOWN = 1
    TRUE = 2

    @property
    def word(self) -> str:
        """The value as people read it."""
        return ("false", "unknown", "true")[self]


FALSE, UNKNOWN, TRUE = Truth.FALSE, Truth.UNKNOWN, Truth.TRUE


def negate(value: int) -> int:
    """Return not `value`."""
    return 2 - value


def at_least(needed: int, values: Iterable[int]) -> int:
    """Return whether at least `needed` of `values` are true.

    True when that many are true, false when so many can no longer be, unknown otherwise.
    """
    true = possible = 0
    for value in values:
        true += value == TRUE
        possible += value != FALSE
    if true >= needed:
        return TRUE
    return UNKNOWN if possible >= needed else FALSE
