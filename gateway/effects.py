"""Everything that the plant can want done, ready for the link, the journal and people.

Each effect carries the steady time `t` and the wall time `at` (UTC, ns since 1970) at which it took effect.
"""

from typing import Any, NamedTuple

from rules.model import Bounds


class Command(NamedTuple):
    """An actuator is to be put into a state: the message that does it, and why.

    `rank` is rest or safe, and `rule` None, when no rule asks. `again` is true when a state is only renewed.
    """

    t: int
    at: int
    actuator: str
    state: str
    topic: str
    payload: str
    qos: int
    retain: bool
    expiry_s: int | None
    rank: str | None
    rule: str | None
    reason: str
    overruled: tuple[str, ...]
    again: bool


class Reason(NamedTuple):
    """An actuator stays in its state, and for another reason than before."""

    t: int
    at: int
    actuator: str
    state: str
    rank: str | None
    rule: str | None
    reason: str
    overruled: tuple[str, ...]


class RuleChange(NamedTuple):
    """A rule came into force, left it, or became latched. `because` explains its conditions with their readings."""

    t: int
    at: int
    rule: str
    in_force: bool
    latched: bool
    from_: str
    until: str
    because: dict[str, Any]


class Value(NamedTuple):
    """A tank's level has been measured, exactly or within bounds, or has ceased to be known.

    In m, share of the brim, m3, and m3/s (net).
    """

    t: int
    at: int
    tank: str
    level: float | Bounds | None
    share: float | None
    volume: float | None
    flow: float | None
    status: str
    reason: str | None


class SensorChange(NamedTuple):
    """A sensor's status has changed (NAMUR NE 107), for the reason given."""

    t: int
    at: int
    sensor: str
    status: str
    reason: str | None


class Volumes(NamedTuple):
    """What went into a tank, out of it and over its brim in a period that has ended; in m3.

    `period` is hour, day, month or season; `name` says which one.
    """

    t: int
    at: int
    tank: str
    period: str
    name: str
    into: float
    out: float
    spilled: float


class PumpFlow(NamedTuple):
    """What a pump has taken in a run that is over, as the level tells, in m3/s."""

    t: int
    at: int
    actuator: str
    flow: float


class Note(NamedTuple):
    """Something that people should know."""

    t: int
    at: int
    about: str
    text: str


Effect = Command | Reason | RuleChange | Value | SensorChange | Volumes | PumpFlow | Note
