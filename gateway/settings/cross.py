"""What only shows when the whole site is read: names that stand for nothing, topics that collide, levels out of order.

Each check yields complaints with their place; none stops at the first.
"""

from collections.abc import Iterator, Mapping

from gateway.measure.sensing import ONLY_SOME_USE, SENSES
from gateway.settings.assemble import ALIVE_WORDS, choice_of, condition_of, demand_of, surroundings
from gateway.settings.complaint import Complaint
from gateway.settings.load import SITE_FILE
from gateway.settings.models import Actuator, Common, Rule, Site, TankFile
from gateway.settings.names import Names, TankScope, full, parts
from gateway.settings.sensing import method_of
from gateway.settings.sensor_models import Sensor, Take
from gateway.settings.shaping import shape_of
from gateway.settings.units import SECOND, linear
from gateway.settings.yaml_reader import Node, place_within
from rules.conditions.errors import ConditionError
from rules.quantity import Dimension

Path = tuple[str | int, ...]

SHORTEST_RISE = 10 * SECOND
LATER_IN_PAYLOADS = ("{seq}", "{until}")  # what a device that checks its commands will be told


class _Place:
    """One file of the site, for complaints about it."""

    def __init__(self, file: str, node: Node, text: str) -> None:
        self.file = file
        self.node = node
        self.text = text

    def say(self, path: Path, message: str) -> Complaint:
        """Return a complaint at the value under `path`, or at the nearest value around it."""
        return Complaint(self.file, *self.node.place(*path), message)

    def say_key(self, path: Path, message: str) -> Complaint:
        """Return a complaint at the key that ends `path`."""
        return Complaint(self.file, *self.node.key_place(*path), message)

    def say_within(self, path: Path, column: int, message: str) -> Complaint:
        """Return a complaint at a character, counted from 1, of the text under `path`."""
        node = self.node
        for step in path:
            node = node.child(step) or node
        return Complaint(self.file, *place_within(self.text, node, column), message)


def cross_check(site: Site, nodes: Mapping[str, Node]) -> list[Complaint]:
    """Return every complaint about the site as a whole."""
    by_file = {file: _Place(file, node, site.texts[file]) for file, node in nodes.items()}
    of_tank = {place.node.value["tank"].value: place for file, place in by_file.items() if file != SITE_FILE}
    places = [by_file[SITE_FILE], *(of_tank[tank] for tank in site.tanks)]
    complaints: list[Complaint] = []
    sound = True
    for (_, part), place in zip(parts(site), places, strict=True):
        if isinstance(part, TankFile):
            slips = list(_tank(part, place))
            complaints += slips
            sound = sound and not slips
    for (tank, part), place in zip(parts(site), places, strict=True):
        if sound:  # a method may ask for its tank's shape and brim
            complaints += _sensors(site, tank, part, place)
        complaints += _actuators(part, place)
    complaints += _topics(site, places)
    complaints += _names(site, places)
    # Rules are read only where what they name is sound; else one slip would be told many times over.
    return complaints or list(_rules(site, places))


def _tank(tank: TankFile, place: _Place) -> Iterator[Complaint]:
    if tank.shape is not None:
        try:
            height = shape_of(tank.shape).height
        except ValueError as problem:
            yield place.say(("shape",), str(problem))
            return
        if tank.brim is not None and tank.brim > height:
            yield place.say(("brim",), f"the brim is above the tank's height of {height:g} m")
    if tank.brim is not None and tank.suction is not None and tank.suction >= tank.brim:
        yield place.say(("suction",), f"the suction level is not below the brim of {tank.brim:g} m")
    if isinstance(tank.level, Take):
        yield from _take(tank, tank.level, place)
    elif tank.level is not None and (slip := _no_level(tank, tank.level)):
        yield place.say(("level",), slip)
    if tank.rise_over < SHORTEST_RISE:
        yield place.say(("rise_over",), f"a rise is told over {SHORTEST_RISE // SECOND} s or more")
    for name in set(tank.sensors) & set(tank.actuators):
        yield place.say_key(("actuators", name), f"`{name}` is a sensor of this tank already")


def _no_level(tank: TankFile, name: str) -> str | None:
    """Return why a sensor gives no level, or None."""
    if name not in tank.sensors:
        return f"`{name}` is no sensor of this tank; known: {', '.join(tank.sensors) or 'none'}"
    senses = tank.sensors[name].senses
    return f"`{name}` is a {senses} and gives no level" if senses in {"contact", "temperature"} else None


def _take(tank: TankFile, take: Take, place: _Place) -> Iterator[Complaint]:
    for index, name in enumerate(take.of):
        if slip := _no_level(tank, name):
            yield place.say(("level", "of", index), slip)
        elif name in take.of[:index]:
            yield place.say(("level", "of", index), f"`{name}` stands here twice")
    if take.need is not None and take.need > len(take.of):
        yield place.say(("level", "need"), f"there are {len(take.of)} sensors; {take.need} of them can never be usable")


# ---- sensors ------------------------------------------------------------------------------------------------


def _sensors(site: Site, tank: str | None, part: Common, place: _Place) -> Iterator[Complaint]:
    around = surroundings(site, tank)
    for name, sensor in part.sensors.items():
        path: Path = ("sensors", name)
        yield from _timing(sensor, place, path)
        yield from _payload(sensor, place, path)
        yield from (slips := [*_unused(sensor, place, path), *_bounds(sensor, place, path)])
        if sensor.senses == "contact":
            yield from _contact(sensor, place, path)
            continue
        yield from (misfits := list(_unit_fits(sensor, place, path)))
        if slips or misfits:
            continue  # what the method would say of them is said already
        try:
            method_of(sensor, around)
        except ValueError as problem:
            yield place.say((*path, "senses"), str(problem))


def _payload(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    """Complain of ways to read a payload that do not go together."""
    if sensor.senml is not None:
        for key in ("field", "time"):
            if getattr(sensor, key) is not None:
                yield place.say_key((*path, key), f"a SenML pack has its own order; `{key}` has no place in it")
    elif sensor.time is not None and sensor.field is None:
        yield place.say((*path, "time"), "`field` is missing: where beside its time the value stands")
    if sensor.buffers and sensor.time is None and sensor.senml is None:
        yield place.say((*path, "buffers"), "a device that stores its readings must send their `time`")
    if sensor.buffers and sensor.on_change is not None:
        yield place.say((*path, "buffers"), "a sensor that sends only changes cannot store them")


def _timing(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    if sensor.on_change is None and sensor.expect_every is None:
        message = "`expect_every` is missing; a sensor that sends only changes has `on_change` instead"
        yield place.say(path, message)
    if sensor.on_change is not None and sensor.expect_every is not None:
        yield place.say((*path, "expect_every"), "a sensor that sends only changes is not expected to send often")
    if sensor.expect_every == 0:
        yield place.say((*path, "expect_every"), "expected more than no time")
    if sensor.on_change is not None:
        alive: Path = (*path, "on_change", "alive", "payloads")
        for word in set(sensor.on_change.alive.payloads) - set(ALIVE_WORDS):
            yield place.say_key((*alive, word), f"`{word}` is neither yes nor no")
        if "yes" not in sensor.on_change.alive.payloads:
            yield place.say(alive, "`yes` is missing")


def _unused(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    """Complain of each key that this way to sense does not use, so that nobody believes that it does something."""
    for key in sorted(ONLY_SOME_USE - SENSES[sensor.senses].uses):
        if getattr(sensor, key) is not None:
            yield place.say_key((*path, key), f"`{sensor.senses}` does not use `{key}`")


def _contact(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    if sensor.payloads is not None and len(set(sensor.payloads.values())) < len(sensor.payloads):
        yield place.say((*path, "payloads"), "two words have the same payload")


def _unit_fits(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    wanted = SENSES[sensor.senses].raw
    kinds = " or ".join(dimension.words for dimension in wanted)
    if sensor.unit is not None and linear(sensor.unit)[2] not in wanted:
        yield place.say((*path, "unit"), f"`{sensor.unit}` is no unit of {kinds}")
    for index, bound in enumerate(sensor.range or ()):
        if bound.dimension not in wanted:
            yield place.say((*path, "range", index), f"this is {bound.dimension.words}; expected {kinds}")


_LENGTHS, _PRESSURES = {Dimension.LENGTH}, {Dimension.PRESSURE}
_SPANS = dict.fromkeys(SENSES, (_LENGTHS,)) | {"current": (_LENGTHS, _PRESSURES)}


def _bounds(sensor: Sensor, place: _Place, path: Path) -> Iterator[Complaint]:
    for key in ("range", "span"):
        pair = getattr(sensor, key)
        if pair is None:
            continue
        if len(pair) != 2:
            yield place.say((*path, key), "expected two values: `[low, high]`")
        elif key == "range" and not pair[0].value < pair[1].value:
            yield place.say((*path, key), "the first value is the lower one")
        elif key == "span" and {value.dimension for value in pair} not in _SPANS[sensor.senses]:
            yield place.say((*path, key), "expected two lengths, or of a `current` two pressures")
        elif pair[0].value == pair[1].value:
            yield place.say((*path, key), "the two values are the same")


# ---- actuators and topics -----------------------------------------------------------------------------------


def _actuators(part: Common, place: _Place) -> Iterator[Complaint]:
    for name, actuator in part.actuators.items():
        path: Path = ("actuators", name)
        if len(set(actuator.states)) < len(actuator.states):
            yield place.say((*path, "states"), "a state stands here twice")
        for key in ("rest", "safe", "prefer"):
            state = getattr(actuator, key)
            if state is not None and state not in actuator.states:
                yield place.say((*path, key), f"`{state}` is none of its states: {', '.join(actuator.states)}")
        yield from _payloads(actuator, place, (*path, "command", "payloads"))


def _payloads(actuator: Actuator, place: _Place, path: Path) -> Iterator[Complaint]:
    payloads = actuator.command.payloads
    if payloads is None:
        return
    for state in actuator.states:
        if state not in payloads:
            yield place.say(path, f"the payload for `{state}` is missing")
    for word in payloads:
        if word not in actuator.states:
            yield place.say_key((*path, word), f"`{word}` is none of its states: {', '.join(actuator.states)}")
    if len(set(payloads.values())) < len(payloads):
        yield place.say(path, "two states have the same payload")
    for state, payload in payloads.items():
        for later in LATER_IN_PAYLOADS:
            if later in payload:
                yield place.say((*path, state), f"`{later}` is not yet supported")


def _topics(site: Site, places: list[_Place]) -> Iterator[Complaint]:
    """Complain of a command's topic that is not one actuator's alone, and of our own topics used by others."""
    owners: dict[str, str] = {}
    for (tank, part), place in zip(parts(site), places, strict=True):
        for name, actuator in part.actuators.items():
            topic, path = actuator.command.topic, ("actuators", name, "command", "topic")
            if topic in owners:
                yield place.say(path, f"`{topic}` commands {owners[topic]} already")
            owners[topic] = full(tank, name)
            yield from _own(site, place, path, topic)
    for (_, part), place in zip(parts(site), places, strict=True):
        for name, sensor in part.sensors.items():
            heard: dict[Path, str] = {("sensors", name, "topic"): sensor.topic}
            if sensor.on_change is not None:
                heard["sensors", name, "on_change", "alive", "topic"] = sensor.on_change.alive.topic
            for where, topic in heard.items():
                if topic in owners:
                    message = f"`{topic}` is where {owners[topic]} is commanded; the gateway would hear itself"
                    yield place.say(where, message)
                yield from _own(site, place, where, topic)


def _own(site: Site, place: _Place, path: Path, topic: str) -> Iterator[Complaint]:
    root = site.publish_under
    if topic == root or topic.startswith(f"{root}/"):
        yield place.say(path, f"`{root}/…` are the gateway's own topics")


def _names(site: Site, places: list[_Place]) -> Iterator[Complaint]:
    for name in {*site.file.sensors, *site.file.actuators} & set(site.tanks):
        yield places[0].say_key(("sensors" if name in site.file.sensors else "actuators", name), f"`{name}` is a tank")
    for name in set(site.file.sensors) & set(site.file.actuators):
        yield places[0].say_key(("actuators", name), f"`{name}` is a sensor already")
    seen: dict[str, str] = {}
    for name in site.tanks:
        if name.lower() in seen:
            yield places[0].say((), f"the tanks `{seen[name.lower()]}` and `{name}` differ in capitals only")
        seen[name.lower()] = name


# ---- rules --------------------------------------------------------------------------------------------------


def _rules(site: Site, places: list[_Place]) -> Iterator[Complaint]:
    names = Names(site)
    trips: dict[str, tuple[str, str]] = {}
    for (tank, part), place in zip(parts(site), places, strict=True):
        scope = TankScope(names, tank)
        for name, rule in part.rules.items():
            path: Path = ("rules", name)
            if not name.strip() or len(name) > 80 or "." in name or "/" in name or not name.isprintable():
                yield place.say_key(path, "a rule's name is a few words, without `.` and `/`")
            yield from _conditions(rule, place, path, scope)
            yield from _unknown(rule, place, path)
            yield from _demand(rule, place, path, scope, trips, full(tank, name))


def _conditions(rule: Rule, place: _Place, path: Path, scope: TankScope) -> Iterator[Complaint]:
    for key, text in (("from", rule.from_), ("until", rule.until)):
        if text is None:
            continue
        try:
            condition_of(text, scope)
        except ConditionError as problem:
            yield place.say_within((*path, key), problem.column, problem.message)


def _unknown(rule: Rule, place: _Place, path: Path) -> Iterator[Complaint]:
    if rule.rank != "auto" and rule.if_unknown is None:
        yield place.say(path, f"`if_unknown` is missing; it must be said of every {rule.rank}: act, hold or release")
    if rule.rank == "auto" and rule.latch:
        yield place.say((*path, "latch"), "only a trip or an interlock latches")
    for key in ("if_unknown", "if_blind"):
        try:
            choice_of(getattr(rule, key) or "release")
        except ValueError as problem:
            yield place.say((*path, key), str(problem))


def _demand(
    rule: Rule, place: _Place, path: Path, scope: TankScope, trips: dict[str, tuple[str, str]], name: str
) -> Iterator[Complaint]:
    try:
        actuator, state = demand_of(rule.demand, scope)
    except ValueError as problem:
        yield place.say((*path, "demand"), str(problem))
        return
    if rule.rank != "trip":
        return
    other, asked = trips.setdefault(actuator.name, (name, state))
    if asked != state:
        message = f"the trip '{other}' asks {actuator.name} for `{asked}`; two trips cannot ask for different states"
        yield place.say((*path, "demand"), message)
