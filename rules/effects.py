"""Everything that the engine can want done.

Each effect carries the time `t` at which it took effect, in nanoseconds on the events' clock, and enough to be
journaled and explained by itself.
"""

from typing import Any, NamedTuple, Protocol, TypeVar

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


class _Command(Protocol):
    @property
    def actuator(self) -> str: ...
    @property
    def again(self) -> bool: ...


E = TypeVar("E")


def netted(effects: list[E], command: type[_Command]) -> list[E]:
    """Return the effects of one step with at most one command per actuator: the last change, else one renewal.

    A renewal tells the state that the change before it has brought, so nothing is lost with it.
    """
    if len(effects) < 2:
        return effects
    kept: dict[str, int] = {}
    for index, effect in enumerate(effects):
        if isinstance(effect, command) and not (effect.again and effect.actuator in kept):
            kept[effect.actuator] = index
    return [e for index, e in enumerate(effects) if not isinstance(e, command) or kept[e.actuator] == index]
