"""Everything that the engine can want done.

Each effect carries the time `t` at which it took effect, in nanoseconds on the events' clock, and enough to be
journaled and explained by itself.
"""

from typing import Any, NamedTuple

from rules.model import Rank


class RuleChanged(NamedTuple):
    """A rule came into force, left it, or became latched.

    `from_` and `until` are the words of their truth: true, false, unknown (tolerated), undecided (not tolerated).
    `because` is the explanation of the conditions at that instant, as plain JSON values.
    """

    t: int
    rule: str
    in_force: bool
    latched: bool
    from_: str
    until: str
    because: dict[str, Any]


class Commanded(NamedTuple):
    """An actuator is to be put into a state.

    `rank` is rest or safe, and `rule` None, when nobody asks. `reason` is one plain sentence. `overruled` are the
    rules in force that asked for something else. `again` is true when the state is only renewed.
    """

    t: int
    actuator: str
    state: str
    rank: Rank | None
    rule: str | None
    reason: str
    overruled: tuple[str, ...]
    again: bool


class ReasonChanged(NamedTuple):
    """An actuator stays as it is, and for another reason than before; the fields are those of `Commanded`."""

    t: int
    actuator: str
    state: str | None
    rank: Rank | None
    rule: str | None
    reason: str
    overruled: tuple[str, ...]


class Noted(NamedTuple):
    """Something that people should know: `about` is the rule or actuator it concerns."""

    t: int
    about: str
    text: str


Effect = RuleChanged | Commanded | ReasonChanged | Noted
