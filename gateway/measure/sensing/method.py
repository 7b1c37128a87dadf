"""What every sensing method offers: from a raw value to a level, and back."""

from typing import NamedTuple, Protocol

from gateway.measure.status import Status


class Converted(NamedTuple):
    """What a raw value means. `level` in m, or None when it is no measurement; then `reason` says why.

    `signalled`: the device itself says that it has failed. `held`: in this band a value in use stays in use, and one
    that is not stays so.
    """

    level: float | None
    status: Status = Status.GOOD
    reason: str | None = None
    signalled: bool = False
    held: bool = False


class Method(Protocol):
    """One way to sense a level. Raw values are in SI units."""

    def convert(self, raw: float) -> Converted:
        """Return what `raw` means. Never raises, for any finite number."""

    def raw(self, level: float) -> float:
        """Return the raw value at `level` in m; the inverse of `convert`. Raises ValueError where there is none."""
