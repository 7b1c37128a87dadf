"""From settings to the plain descriptions that the plant and the link are built from."""

import re

from gateway.measure.calibration import Covered
from gateway.measure.combine import Take as CombineBy
from gateway.measure.payloads.own_time import OwnTime
from gateway.measure.sensing import SENSES
from gateway.measure.sensor_plan import AlivePlan, SensorPlan
from gateway.measure.tank import TankPlan
from gateway.measure.trend.totals import Calendar
from gateway.meters import QUANTITIES
from gateway.plan import CommandPlan, PlantPlan
from gateway.settings import models
from gateway.settings.calendar import calendar_of
from gateway.settings.names import Names, TankScope, actuator_of, full, parts, signal_of
from gateway.settings.sensing import Surroundings, method_of
from gateway.settings.sensor_models import Sensor, Take
from gateway.settings.shaping import shape_of
from gateway.settings.units import SECOND, linear, read
from rules.conditions.check import check
from rules.conditions.parse import parse
from rules.conditions.terms import names_of
from rules.conditions.tree import Condition
from rules.model import ActuatorDecl, OnUnknown, Rank, Rhythm, RuleDecl, SignalDecl, SiteDecl
from rules.quantity import Dimension

ALIVE_WORDS = {"yes": True, "no": False}


def plant_plan(site: models.Site) -> PlantPlan:
    """Return everything that decides, from settings that have been checked."""
    names = Names(site)
    calendar = calendar_of(site.file.timezone)
    return PlantPlan(
        site=declare(site, names),
        sensors=tuple(
            sensor_plan(site, tank, name, sensor) for tank, part in parts(site) for name, sensor in part.sensors.items()
        ),
        tanks=tuple(tank_plan(tank, calendar) for tank in site.tanks.values() if tank.level is not None),
        commands={
            full(tank, name): command_plan(actuator)
            for tank, part in parts(site)
            for name, actuator in part.actuators.items()
        },
    )


def declare(site: models.Site, names: Names) -> SiteDecl:
    """Return the site as the engine sees it: signals, actuators and rules in file order."""
    actuators: list[ActuatorDecl] = []
    rules: list[RuleDecl] = []
    for tank, part in parts(site):
        actuators += [actuator_of(full(tank, name), actuator) for name, actuator in part.actuators.items()]
        rules += [rule_decl(tank, name, rule, names) for name, rule in part.rules.items()]
    asked = {name for rule in rules for name in names_of(rule.from_) | names_of(rule.until)}
    signals: list[SignalDecl] = []
    for tank, part in parts(site):
        for quantity in QUANTITIES if tank else ():
            decl = names.meanings.get(full(tank, quantity))
            if isinstance(decl, SignalDecl) and (quantity == "level" or decl.name in asked):
                signals.append(decl)
        signals += [signal_of(tank, name, sensor) for name, sensor in part.sensors.items()]
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


def sensor_plan(site: models.Site, tank: str | None, name: str, sensor: Sensor) -> SensorPlan:
    """Return how one sensor is measured; raise ValueError for what does not fit."""
    every = sensor.expect_every
    contact = sensor.senses == "contact"
    unit = sensor.unit or SENSES[sensor.senses].unit
    scale, zero, _ = linear(unit) if unit else (1.0, 0.0, Dimension.NUMBER)
    built = None if contact else method_of(sensor, surroundings(site, tank))
    return SensorPlan(
        name=full(tank, name),
        topic=sensor.topic,
        pointer=sensor.field,
        senml=sensor.senml,
        own_time=None if sensor.time is None else OwnTime(sensor.time.field, sensor.time.as_),
        buffers=sensor.buffers,
        method=built and built.method,
        scale=scale,
        zero=zero,
        unit=unit,
        words=_words(sensor) if contact else {},
        raw_range=_range(sensor),
        covers=_covers(sensor),
        fastest=sensor.fastest,
        frozen_after=sensor.frozen_after,
        despike=sensor.despike or 0,
        lag=sensor.lag or 0,
        silent_after=sensor.silent_after if sensor.silent_after is not None else every and every * 3,
        tolerate=sensor.tolerate if sensor.tolerate is not None else every or 0,
        good_again=sensor.good_again or (1 if contact else 2),
        alive=_alive(sensor),
        feels=built.feels if built else {},
        method_at=built and built.method_at,
    )


def surroundings(site: models.Site, tank: str | None) -> Surroundings:
    """Return what a sensor's method may ask of its tank and of the site."""
    owner = site.tanks.get(tank or "")

    def sensor(name: str, sense: str) -> str:
        own = None if "." in name else owner and owner.sensors.get(name)
        where, _, word = name.rpartition(".")
        other = site.tanks[where].sensors.get(word) if where in site.tanks else site.file.sensors.get(name)
        found = own or other
        if found is None or found.senses != sense or (sense == "pressure" and (own or where)):
            at_site_level = " at site level" if sense == "pressure" else ""
            raise ValueError(f"`{name}` is no sensor{at_site_level} that senses {sense}")
        return full(tank, name) if own else name

    return Surroundings(
        brim=owner.brim if owner else None,
        shape=shape_of(owner.shape) if owner and owner.shape else None,
        in_a_tank=owner is not None,
        sensor=sensor,
    )


def _covers(sensor: Sensor) -> Covered | None:
    """Return what a probe reaches: as said, or as its dimensions have it."""
    said = None if sensor.calibration is None else sensor.calibration.covers
    if said is not None:
        return Covered(said[0], said[1])
    low = sensor.mounted_at or 0.0
    return None if sensor.probe is None else Covered(low, low + sensor.probe.length)


def _words(sensor: Sensor) -> dict[str, str]:
    return {payload: word for word, payload in (sensor.payloads or {"wet": "1", "dry": "0"}).items()}


def _range(sensor: Sensor) -> tuple[float, float] | None:
    return None if sensor.range is None else (sensor.range[0].value, sensor.range[1].value)


def _alive(sensor: Sensor) -> AlivePlan | None:
    if sensor.on_change is None:
        return None
    alive = sensor.on_change.alive
    words = {payload: ALIVE_WORDS.get(word, False) for word, payload in alive.payloads.items()}
    return AlivePlan(topic=alive.topic, pointer=alive.field, words=words)


def tank_plan(tank: models.TankFile, calendar: Calendar) -> TankPlan:
    """Return a tank whose level is measured."""
    name, level = tank.tank, tank.level
    sensors = level.of if isinstance(level, Take) else [level or ""]
    return TankPlan(
        name=name,
        sensors=tuple(full(name, sensor) for sensor in sensors),
        take=_combine_by(level) if isinstance(level, Take) else CombineBy(way="first", need=1),
        floats={
            full(name, one): sensor.mounted_at
            for one, sensor in tank.sensors.items()
            if sensor.mounted_at is not None and is_float(sensor)
        },
        shape=None if tank.shape is None else shape_of(tank.shape),
        brim=tank.brim,
        suction=tank.suction,
        pumps={
            full(name, one): actuator.rated.flow
            for one, actuator in tank.actuators.items()
            if actuator.rated is not None and actuator.rated.flow is not None
        },
        rise_over=tank.rise_over,
        calendar=calendar,
    )


def _combine_by(take: Take) -> CombineBy:
    """Return how sensors are combined; of three and more, their middle needs two, anything else one."""
    usual = 2 if take.take == "middle" and len(take.of) > 2 else 1
    return CombineBy(way=take.take, need=take.need or usual, agree_within=take.agree_within)


def is_float(sensor: Sensor) -> bool:
    """Return whether a sensor is a contact that hangs at a height and says wet or dry."""
    words = set(sensor.payloads or ("wet", "dry"))
    return sensor.senses == "contact" and sensor.mounted_at is not None and words == {"wet", "dry"}


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
