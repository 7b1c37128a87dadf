"""How far a value can be trusted, in the five words of NAMUR NE 107 and in their order of weight."""

from enum import StrEnum


class Status(StrEnum):
    """A status signal. Source: NAMUR NE 107, 2017; the wording of the meanings is ours."""

    GOOD = "good"
    MAINTENANCE_REQUIRED = "maintenance required"  # still valid, the reserve is running out
    OUT_OF_SPECIFICATION = "out of specification"  # outside its rated conditions; uncertain
    FUNCTION_CHECK = "function check"  # someone is working on it
    FAILURE = "failure"  # not a measurement

    @property
    def usable(self) -> bool:
        """Whether rules may act on a value with this status."""
        return self not in {Status.FUNCTION_CHECK, Status.FAILURE}


Told = tuple[Status, str | None]
"""A status with the reason for it."""

_ORDER = tuple(Status)  # from good to failure: NE 107's order of weight, reversed


def worse(one: Told, other: Told) -> Told:
    """Return the graver of two statuses, with its reason; of two that are alike, the first."""
    return other if _ORDER.index(other[0]) > _ORDER.index(one[0]) else one
