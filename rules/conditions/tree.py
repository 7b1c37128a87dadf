"""The tree of a condition after reading and after checking.

Frozen nodes and nothing else. Names in a checked tree are full (`tank.name`), values are in SI units. Every node knows
its canonical text, with all parentheses, which reads back to the same tree.
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Status:
    """`name is usable`, `unknown`, `silent` or `failed`: always true or false."""

    name: str
    word: str


Condition = Status
