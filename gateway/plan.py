"""What a plant is built from: plain descriptions, made from the settings and free of them. Nothing here changes."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.tank import TankPlan
from rules.model import SiteDecl


@dataclass(frozen=True, slots=True, kw_only=True)
class CommandPlan:
    """The message that puts an actuator into each of its states."""

    topic: str
    payloads: Mapping[str, str]
    qos: int = 1
    retain: bool = False
    expiry_s: int | None = 10


@dataclass(frozen=True, slots=True, kw_only=True)
class PlantPlan:
    """Everything that decides: the site for the engine, sensors and tanks in file order, commands by actuator."""

    site: SiteDecl
    sensors: tuple[SensorPlan, ...] = ()
    tanks: tuple[TankPlan, ...] = ()
    commands: Mapping[str, CommandPlan] = field(default_factory=dict)
