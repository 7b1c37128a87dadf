"""What a site declares to the control core: signals, actuators, rules.

Frozen descriptions and nothing that changes. `gateway.settings` writes them from the user's files; the engine reads
them once. Quantities are in SI units, times and durations in whole nanoseconds.
"""

import math
from dataclasses import dataclass
from enum import IntEnum, StrEnum
from typing import Any, NamedTuple

from rules.conditions.tree import Condition
from rules.quantity import Dimension

SECOND = 1_000_000_000


class Fault(IntEnum):
    """Why a signal has no usable value."""

    NONE = 0  # it has one
    AWAITED = 1  # nothing has come since the start or since the link was lost
    SILENT = 2  # it stopped coming
    FAILED = 3  # it comes, and is not a measurement


class Bounds(NamedTuple):
    """All that is known of a number: it lies between `low` and `high`, both included. Either may be infinite."""

    low: float
    high: float

    def save(self) -> list[float | None]:
        """Return both ends as plain JSON values, None for an infinite one."""
        return [end if math.isfinite(end) else None for end in self]


Value = float | str | Bounds | None


def saved(value: Value) -> Any:
    """Return a value as plain JSON."""
    return value.save() if isinstance(value, Bounds) else value


def restored(plain: Any) -> Value:
    """Return the value that `saved` returned as plain JSON."""
    if not isinstance(plain, list):
        return plain  # type: ignore[no-any-return]  # a number, a word or nothing, as JSON has it
    low, high = plain
    return Bounds(-math.inf if low is None else low, math.inf if high is None else high)


class Signal(NamedTuple):
    """A signal at one instant.

    `value` is a number in SI units, the bounds between which it is known to lie, a contact's word, or None when there
    is a fault.
    """

    value: Value
    fault: Fault


class Rank(IntEnum):
    """The rank of a demand; a lower number overrules a higher one.

    The last two are what is left when nobody asks: rest where all is known, safe where it is not. Between interlock and
    auto there is a place for the operators' `hand`.
    """

    TRIP = 0
    INTERLOCK = 1
    AUTO = 3
    REST = 4
    SAFE = 5

    @property
    def word(self) -> str:
        """The rank as the settings write it."""
        return self.name.lower()


class OnUnknown(StrEnum):
    """What a rule does when its condition has been unknown for longer than it tolerates."""

    ACT = "act"
    HOLD = "hold"
    RELEASE = "release"


@dataclass(frozen=True, slots=True, kw_only=True)
class Rhythm:
    """`act for … every …`: in force for the first part of each period while unknown. Both in nanoseconds."""

    act_for: int
    every: int


@dataclass(frozen=True, slots=True, kw_only=True)
class SignalDecl:
    """One signal: its full name (`tank.name`, or bare at site level) and what it is.

    A number has a dimension; a contact has its words. Exactly one of the two is given.
    """

    name: str
    dimension: Dimension | None = None
    words: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class ActuatorDecl:
    """One actuator with the states it can be asked for. All of `rest`, `safe` and `prefer` are among `states`."""

    name: str
    states: tuple[str, ...]
    rest: str
    safe: str
    prefer: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleDecl:
    """One rule: asks `actuator` for `state`, from one condition until another (until None: until `from_` is false)."""

    name: str
    rank: Rank
    actuator: str
    state: str
    from_: Condition
    until: Condition | None = None
    if_unknown: OnUnknown | Rhythm = OnUnknown.RELEASE
    if_blind: OnUnknown | Rhythm | None = None  # None: as if_unknown
    unknown_for: int = 0
    latch: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteDecl:
    """Everything the engine needs to know, in file order."""

    signals: tuple[SignalDecl, ...] = ()
    actuators: tuple[ActuatorDecl, ...] = ()
    rules: tuple[RuleDecl, ...] = ()
    startup_grace: int = 60 * SECOND
    link_tolerance: int = 30 * SECOND
