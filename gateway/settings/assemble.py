"""From settings to the plain descriptions that the plant and the link are built from."""

import re
from collections.abc import Callable
from typing import TypeVar

from gateway.measure.calibration import Line
from gateway.measure.sensing import SENSES
from gateway.measure.sensing.capacitance import Capacitance
from gateway.measure.sensing.current import Current
from gateway.measure.sensing.distance import Distance
from gateway.measure.sensing.frequency import Frequency
from gateway.measure.sensing.level import Level
from gateway.measure.sensing.method import Method
from gateway.measure.sensor_plan import AlivePlan, SensorPlan
from gateway.measure.shapes import Shape
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.plan import CommandPlan, PlantPlan, TankPlan
from gateway.settings import models
from gateway.settings.names import Names, TankScope, actuator_of, full, parts, signal_of
from gateway.settings.units import SECOND, read, scale
from rules.conditions.check import check
from rules.conditions.parse import parse
from rules.conditions.tree import Condition
from rules.model import ActuatorDecl, OnUnknown, Rank, Rhythm, RuleDecl, SignalDecl, SiteDecl
from rules.quantity import Dimension

T = TypeVar("T")

ALIVE_WORDS = {"yes": True, "no": False}


def plant_plan(site: models.Site) -> PlantPlan:
    """Return everything that decides, from settings that have been checked."""
    names = Names(site)
    return PlantPlan(
        site=declare(site, names),
        sensors=tuple(
            sensor_plan(tank, name, sensor, site.tanks.get(tank or ""))
            for tank, part in parts(site)
            for name, sensor in part.sensors.items()
        ),
        tanks=tuple(tank_plan(tank) for tank in site.tanks.values() if tank.level is not None),
        commands={
            full(tank, name): command_plan(actuator)
            for tank, part in parts(site)
            for name, actuator in part.actuators.items()
        },
    )


def declare(site: models.Site, names: Names) -> SiteDecl:
    """Return the site as the engine sees it: signals, actuators and rules in file order."""
    signals: list[SignalDecl] = []
    actuators: list[ActuatorDecl] = []
    rules: list[RuleDecl] = []
    for tank, part in parts(site):
        if tank:
            measured = (names.meanings.get(full(tank, word)) for word in ("level", "volume"))
            signals += [decl for decl in measured if isinstance(decl, SignalDecl)]
        signals += [signal_of(full(tank, name), sensor) for name, sensor in part.sensors.items()]
        actuators += [actuator_of(full(tank, name), actuator) for name, actuator in part.actuators.items()]
        rules += [rule_decl(tank, name, rule, names) for name, rule in part.rules.items()]
    return SiteDecl(
        signals=tuple(signals),
        actuators=tuple(actuators),
        rules=tuple(rules),
        startup_grace=site.file.startup_grace,
        link_tolerance=site.file.broker.link_tolerance,
    )


# ---- rules --------------------------------------------------------------------------------------------------


def rule_decl(tank: str | None, name: str, rule: models.Rule, names: Names) -> RuleDecl:
    """Return one rule; raise ConditionError or ValueError for what does not fit."""
    scope = TankScope(names, tank)
    actuator, state = demand_of(rule.demand, scope)
    return RuleDecl(
        name=full(tank, name),
        rank=Rank[rule.rank.upper()],
        actuator=actuator.name,
        state=state,
        from_=condition_of(rule.from_, scope),
        until=None if rule.until is None else condition_of(rule.until, scope),
        if_unknown=choice_of(rule.if_unknown or "release"),
        if_blind=None if rule.if_blind is None else choice_of(rule.if_blind),
        unknown_for=rule.unknown_for,
        latch=rule.latch,
    )


def condition_of(text: str, scope: TankScope) -> Condition:
    """Return a condition, read and checked; raise ConditionError for what does not fit."""
    return check(parse(text), scope, read)


def demand_of(text: str, scope: TankScope) -> tuple[ActuatorDecl, str]:
    """Return the actuator and the state that a demand asks for; raise ValueError for what does not fit."""
    if re.fullmatch(r"\d+ of .*", text):
        raise ValueError("pump sets are not yet supported")
    name, _, state = text.partition(" ")
    actuator = scope.resolve(name)
    if not isinstance(actuator, ActuatorDecl):
        known = [name for name in scope.known() if isinstance(scope.resolve(name), ActuatorDecl)]
        raise ValueError(f"`{name}` is no actuator; known: {', '.join(known) or 'none'}")
    if state not in actuator.states:
        raise ValueError(f"`{name}` has no state `{state}`; it has {', '.join(actuator.states)}")
    return actuator, state


_RHYTHM = re.compile(r"act for (.+) every (.+)")


def choice_of(text: str) -> OnUnknown | Rhythm:
    """Return what a rule does when it cannot be decided; raise ValueError for what does not fit."""
    found = _RHYTHM.fullmatch(text)
    if found is None:
        return OnUnknown(text)
    act_for, every = (read(part) for part in found.groups())
    if act_for.dimension is not Dimension.TIME or every.dimension is not Dimension.TIME:
        raise ValueError(f"`{text}`: expected two times, such as `act for 3 min every 20 min`")
    if not 1 <= act_for.value < every.value:
        raise ValueError(f"`{text}`: the first time is shorter than the second, and at least `1 s`")
    return Rhythm(act_for=round(act_for.value * SECOND), every=round(every.value * SECOND))


# ---- sensors and tanks --------------------------------------------------------------------------------------


def sensor_plan(tank: str | None, name: str, sensor: models.Sensor, owner: models.TankFile | None) -> SensorPlan:
    """Return how one sensor is measured; raise ValueError for what does not fit."""
    every = sensor.expect_every
    contact = sensor.senses == "contact"
    unit = sensor.unit or SENSES[sensor.senses].unit
    factor, _ = scale(unit) if unit else (1.0, Dimension.NUMBER)
    return SensorPlan(
        name=full(tank, name),
        topic=sensor.topic,
        pointer=sensor.field,
        method=None if contact else method_of(sensor, owner),
        scale=factor,
        unit=unit,
        words=_words(sensor) if contact else {},
        raw_range=_range(sensor),
        silent_after=sensor.silent_after if sensor.silent_after is not None else every and every * 3,
        tolerate=sensor.tolerate if sensor.tolerate is not None else every or 0,
        good_again=sensor.good_again or (1 if contact else 2),
        alive=_alive(sensor),
    )


def _words(sensor: models.Sensor) -> dict[str, str]:
    return {payload: word for word, payload in (sensor.payloads or {"wet": "1", "dry": "0"}).items()}


def _range(sensor: models.Sensor) -> tuple[float, float] | None:
    return None if sensor.range is None else (sensor.range[0].value, sensor.range[1].value)


def _alive(sensor: models.Sensor) -> AlivePlan | None:
    if sensor.on_change is None:
        return None
    alive = sensor.on_change.alive
    words = {payload: ALIVE_WORDS.get(word, False) for word, payload in alive.payloads.items()}
    return AlivePlan(topic=alive.topic, pointer=alive.field, words=words)


def method_of(sensor: models.Sensor, owner: models.TankFile | None) -> Method:
    """Return how raw values become levels; raise ValueError, with a sentence, when something for it is missing."""
    match sensor.senses:
        case "level":
            return _level(sensor, owner)
        case "distance":
            return Distance(_needed(sensor.mounted_at, "mounted_at"))
        case "current":
            low, high = _needed(sensor.span, "span")
            return Current(low.value, high.value, sensor.mounted_at)
        case "capacitance":
            return Capacitance(_line(sensor, lambda raw: raw))
        case "frequency":
            return Frequency(_line(sensor, lambda raw: 1 / raw))
        case other:
            raise ValueError(f"`{other}` is not yet supported")


def _needed(value: T | None, key: str) -> T:
    if value is None:
        raise ValueError(f"`{key}` is missing; this way to sense needs it")
    return value


def _line(sensor: models.Sensor, linear: Callable[[float], float]) -> Line:
    """Return the line through the two points of a calibration, in the quantity in which the method is linear."""
    (raw_0, level_0), (raw_1, level_1) = _needed(sensor.calibration, "calibration").points
    wanted = SENSES[sensor.senses].raw
    for raw in (raw_0, raw_1):
        if raw.dimension not in wanted:
            raise ValueError(f"a point of the calibration has {raw.dimension.words} where {wanted[0].words} belongs")
        if not raw.value > 0:
            raise ValueError("a raw value of the calibration is more than nothing")
    return Line(linear(raw_0.value), level_0, linear(raw_1.value), level_1)


def _level(sensor: models.Sensor, owner: models.TankFile | None) -> Level:
    """Return the method of a device that sends the level itself: as a length, a share of the brim, or a volume."""
    line = None if sensor.calibration is None else _line(sensor, lambda raw: raw)
    _, dimension = scale(sensor.unit or "m")
    if dimension is Dimension.SHARE:
        brim = _needed(owner.brim if owner else None, "the tank's brim")
        return Level(lambda share: share * brim, lambda level: level / brim, line)
    if dimension is Dimension.VOLUME:
        shape = shape_of(_needed(owner.shape if owner else None, "the tank's shape"))
        return Level(shape.level, shape.volume, line)
    return Level(line=line)


def tank_plan(tank: models.TankFile) -> TankPlan:
    """Return a tank whose level is measured."""
    shape = None if tank.shape is None else shape_of(tank.shape)
    return TankPlan(name=tank.tank, level_sensor=full(tank.tank, tank.level or ""), shape=shape, brim=tank.brim)


def shape_of(shape: models.Shape) -> Shape:
    """Return the inside of a tank."""
    if shape.form == "rectangular":
        return rectangular(shape.length or 0.0, shape.width or 0.0, shape.height)
    return vertical_cylinder(shape.diameter or 0.0, shape.height)


def command_plan(actuator: models.Actuator) -> CommandPlan:
    """Return the messages that put an actuator into its states."""
    command = actuator.command
    return CommandPlan(
        topic=command.topic,
        payloads=command.payloads or {state: state for state in actuator.states},
        qos=command.qos,
        retain=command.retain,
        expiry_s=max(1, round(command.expiry / SECOND)),
    )
