"""What one sensor is, as the settings describe it. Nothing here changes."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from gateway.measure.calibration import Covered
from gateway.measure.payloads.own_time import OwnTime
from gateway.measure.payloads.payload import Pointer
from gateway.measure.sensing.method import Method


@dataclass(frozen=True, slots=True, kw_only=True)
class AlivePlan:
    """Where a sensor that sends only changes says whether it is alive, and in which words."""

    topic: str
    pointer: Pointer | None = None
    words: Mapping[str, bool] = field(default_factory=dict)  # payload → alive


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorPlan:
    """One sensor as the settings describe it. `name` is full; raw value in SI units = `scale` · number + `zero`.

    Exactly one of `method` (a number) and `words` (a contact: payload → word) is given. `raw_range` is in SI units,
    durations in ns, `fastest` in m/s. `senml` is the name of a record in a pack. `covers` is what a probe reaches.
    `feels` names the other sensors that `method` depends on, by what they give, and `method_at` builds it anew for what
    they say. `alive` makes it a sensor that sends only changes.
    """

    name: str
    topic: str
    pointer: Pointer | None = None
    senml: str | None = None
    own_time: OwnTime | None = None
    buffers: bool = False
    method: Method | None = None
    scale: float = 1.0
    zero: float = 0.0
    unit: str = ""
    words: Mapping[str, str] = field(default_factory=dict)
    raw_range: tuple[float, float] | None = None
    covers: Covered | None = None
    fastest: float | None = None
    frozen_after: int | None = None
    despike: int = 0
    lag: int = 0
    silent_after: int | None = None
    tolerate: int = 0
    good_again: int = 2
    alive: AlivePlan | None = None
    feels: Mapping[str, str] = field(default_factory=dict)
    method_at: Callable[[Mapping[str, float]], Method] | None = None
