"""One level from several sensors, and what remains of it when some of them fail.

Every way (middle, highest, lowest, mean, first) is monotone in each sensor, so what is known only within bounds
combines to bounds. Two sensors of which neither can be told to be wrong, and which disagree, leave only what lies
between them: a rule then acts where both would have it act, and is undecided in between. Floats that hang at a height
bound the level too: wet says at least, dry says at most. Pure.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple

from gateway.measure.status import Status, Told, worse
from rules.conditions.terms import spread
from rules.model import Bounds, Fault, Value

Numbers = Sequence[float]


class Member(NamedTuple):
    """One sensor as it is now: what it says of the level, and how far that can be trusted."""

    name: str
    value: Value
    fault: Fault
    status: Status
    reason: str | None


class Combined(NamedTuple):
    """The level, exactly or within bounds, or the fault; with its status."""

    value: float | Bounds | None
    fault: Fault
    status: Status
    reason: str | None


def _middle(values: Numbers) -> float:
    ordered, half = sorted(values), len(values) // 2
    return ordered[half] if len(values) % 2 else (ordered[half - 1] + ordered[half]) / 2


WAYS: dict[str, Callable[[Numbers], float]] = {
    "middle": _middle,
    "highest": max,
    "lowest": min,
    "mean": lambda values: math.fsum(values) / len(values),
    "first": lambda values: values[0],
}
"""How one level is taken from several; `first` is the first usable one in the order of the settings."""

_UNDECIDED_BY_TWO = frozenset({"middle", "mean"})  # of two that disagree, these would make up a third value


@dataclass(frozen=True, slots=True, kw_only=True)
class Take:
    """How one level is taken from several sensors. `agree_within` in m; `need` of them must be usable."""

    way: str
    need: int
    agree_within: float | None = None


def combine(take: Take, members: Sequence[Member]) -> Combined:
    """Return the level that `members` make."""
    usable = [member for member in members if member.fault is Fault.NONE]
    missing = [member for member in members if member.fault is not Fault.NONE]
    if len(usable) < take.need:
        fault = max(member.fault for member in missing)
        told = f"{len(usable)} of {len(members)} usable, {take.need} needed: {_told(missing)}"
        return Combined(None, fault, Status.FAILURE, told)
    spreads = [_bounds(member) for member in usable]
    counted = spreads[:1] if take.way == "first" else spreads
    status: Told = Status.GOOD, None
    for member in usable[: len(counted)]:
        status = worse(status, (member.status, member.reason))
    if missing:
        status = worse(status, (Status.MAINTENANCE_REQUIRED, _told(missing)))
    apart = max(one.low for one in spreads) - min(one.high for one in spreads)
    disagree = take.agree_within is not None and apart > take.agree_within
    if disagree:
        said = ", ".join(f"{one.name} {_shown(one)}" for one in usable)
        status = worse(status, (Status.OUT_OF_SPECIFICATION, f"they disagree by {apart * 1000:.0f} mm: {said}"))
    if disagree and len(usable) == 2 and take.way in _UNDECIDED_BY_TWO:
        low, high = min(one.low for one in spreads), max(one.high for one in spreads)
    else:
        way = WAYS[take.way]
        low, high = way([one.low for one in counted]), way([one.high for one in counted])
    return Combined(low if low == high else Bounds(low, high), Fault.NONE, *status)


def _bounds(member: Member) -> Bounds:
    if isinstance(member.value, float | Bounds):
        return spread(member.value)
    raise TypeError(f"{member.name} is usable and gives no level")


def _told(missing: Sequence[Member]) -> str:
    return "; ".join(f"{member.name} is not usable ({member.reason})" for member in missing)


def _shown(member: Member) -> str:
    known = _bounds(member)
    return f"{known.low:.3f} m" if known.low == known.high else "within bounds"


# ---- floats -----------------------------------------------------------------------------------------------------


class Float(NamedTuple):
    """A contact that hangs at a height in m. `wet` None: it is not usable."""

    name: str
    mounted_at: float
    wet: bool | None


def bounded(level: Combined, floats: Sequence[Float]) -> Combined:
    """Return the level with what the floats add to it where no sensor gives it exactly."""
    if level.fault is Fault.NONE and not isinstance(level.value, Bounds):
        return level
    low = max((one.mounted_at for one in floats if one.wet is True), default=-math.inf)
    high = min((one.mounted_at for one in floats if one.wet is False), default=math.inf)
    if isinstance(level.value, Bounds):
        low, high = max(low, level.value.low), min(high, level.value.high)
    if (low, high) == (-math.inf, math.inf):
        return level
    if low > high:
        return Combined(None, Fault.FAILED, Status.FAILURE, f"at least {low:g} m and at most {high:g} m cannot both be")
    told = f"only known: {range_of(Bounds(low, high))}"
    status = worse((level.status, level.reason), (Status.OUT_OF_SPECIFICATION, told))
    if level.fault is not Fault.NONE:
        status = Status.OUT_OF_SPECIFICATION, f"{level.reason}; {told}, by the floats"
    return Combined(Bounds(low, high), Fault.NONE, *status)


def range_of(known: Bounds) -> str:
    """Return bounds for people."""
    low, high = known
    ends = [f"at least {low:g} m"] if math.isfinite(low) else []
    return " and ".join([*ends, *([f"at most {high:g} m"] if math.isfinite(high) else [])])


def contradiction(level: float, floats: Sequence[Float], margin: float) -> str | None:
    """Return what speaks against an exact level by more than `margin` in m, or None."""
    for one in floats:
        if one.wet is True and level < one.mounted_at - margin:
            return f"{one.name} at {one.mounted_at:g} m is wet, and the level is said to be {level:.3f} m"
        if one.wet is False and level > one.mounted_at + margin:
            return f"{one.name} at {one.mounted_at:g} m is dry, and the level is said to be {level:.3f} m"
    return None
