"""Methods that follow the surroundings: the temperature of air or water, the air's pressure.

The method is made anew when a value of the surroundings changes, not for each reading; methods themselves know nothing
of it. Pure: the same surroundings give the same method, whatever they were before.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from gateway.measure.sensing.method import Converted, Method
from gateway.measure.status import Status


@dataclass(frozen=True, slots=True)
class Compensated:
    """From what is felt, in SI units and by name, to a method.

    `usual` names everything that `build` takes, in its order, with what is taken until it is felt; None: there is no
    level without it. `build` may raise ValueError, whose sentence is then the reason that there is no level.
    """

    build: Callable[..., Method]
    usual: Mapping[str, float | None]

    def __call__(self, felt: Mapping[str, float]) -> Method:
        """Return the method for what is felt. Never raises."""
        values = {name: felt.get(name, usual) for name, usual in self.usual.items()}
        missing = " and ".join(name for name, value in values.items() if value is None)
        if missing:
            return NoMethod(f"there is no level without the {missing}")
        try:
            return self.build(*values.values())
        except ValueError as problem:
            return NoMethod(str(problem))


@dataclass(frozen=True, slots=True)
class NoMethod:
    """What stands in while there is no method: every raw value is a failure, for the reason given."""

    reason: str

    def convert(self, raw: float) -> Converted:  # noqa: ARG002 - whatever it is
        """Return the failure."""
        return Converted(None, Status.FAILURE, self.reason)

    def raw(self, level: float) -> float:
        """Raise ValueError: no raw value belongs to any level."""
        raise ValueError(f"no raw value belongs to a level of {level:g} m: {self.reason}")
