"""What names mean in the conditions of a site: the scope of one tank, or of the site itself."""

from collections.abc import Iterable

from gateway.settings.models import Actuator, Common, Site
from gateway.settings.sensing import dimension_of
from gateway.settings.sensor_models import Sensor
from gateway.settings.shaping import shape_of
from rules.conditions.check import Constant, Meaning
from rules.model import ActuatorDecl, SignalDecl
from rules.quantity import Dimension, Quantity


def full(tank: str | None, name: str) -> str:
    """Return the full name of something in a tank, or at site level."""
    return f"{tank}.{name}" if tank else name


def signal_of(tank: str | None, name: str, sensor: Sensor) -> SignalDecl:
    """Return a sensor as the engine sees it."""
    if sensor.senses == "contact":
        return SignalDecl(name=full(tank, name), words=tuple(sensor.payloads or ("wet", "dry")))
    return SignalDecl(name=full(tank, name), dimension=dimension_of(sensor, in_a_tank=tank is not None))


def actuator_of(name: str, actuator: Actuator) -> ActuatorDecl:
    """Return an actuator as the engine sees it, with what the settings leave out filled in."""
    states = tuple(actuator.states)
    rest = actuator.rest or states[0]
    safe = actuator.safe or rest
    return ActuatorDecl(name=name, states=states, rest=rest, safe=safe, prefer=actuator.prefer or safe)


def parts(site: Site) -> list[tuple[str | None, Common]]:
    """Return the site's own part and its tanks, in file order, each with the tank's name."""
    return [(None, site.file), *site.tanks.items()]


class Names:
    """Every name of a site, by its full form."""

    def __init__(self, site: Site) -> None:
        self.meanings: dict[str, Meaning] = {}
        self.scales: dict[str, Quantity] = {}
        for tank, part in parts(site):
            for name, sensor in part.sensors.items():
                self.meanings[full(tank, name)] = signal_of(tank, name, sensor)
            for name, actuator in part.actuators.items():
                self.meanings[full(tank, name)] = actuator_of(full(tank, name), actuator)
        for name in site.tanks:
            self._add_tank(site, name)

    def _add_tank(self, site: Site, tank: str) -> None:
        one = site.tanks[tank]
        for word, value in (("brim", one.brim), ("suction", one.suction)):
            if value is not None:
                name = full(tank, word)
                self.meanings[name] = Constant(name, Quantity(value, Dimension.LENGTH))
        if one.level is None:
            return
        for name, sensor in one.sensors.items():
            if one.brim is not None and dimension_of(sensor, in_a_tank=True) is Dimension.LENGTH:
                self.scales[full(tank, name)] = Quantity(one.brim, Dimension.LENGTH)
        self._add_quantity(full(tank, "level"), Dimension.LENGTH, one.brim)
        self._add_quantity(full(tank, "rise"), Dimension.SPEED)
        if one.brim is not None:
            self._add_quantity(full(tank, "time_to_brim"), Dimension.TIME)
        if one.suction is not None:
            self._add_quantity(full(tank, "time_to_suction"), Dimension.TIME)
        if one.shape is not None:
            brim = None if one.brim is None else shape_of(one.shape).volume(one.brim)
            self._add_quantity(full(tank, "volume"), Dimension.VOLUME, brim)
            self._add_quantity(full(tank, "flow"), Dimension.FLOW)
            if brim is not None:
                self._add_quantity(full(tank, "ullage"), Dimension.VOLUME, brim)

    def _add_quantity(self, name: str, dimension: Dimension, scale: float | None = None) -> None:
        self.meanings[name] = SignalDecl(name=name, dimension=dimension)
        if scale is not None:
            self.scales[name] = Quantity(scale, dimension)


class TankScope:
    """What names mean in one tank (or at site level, where `tank` is None): own ones stand bare, others in full."""

    def __init__(self, names: Names, tank: str | None) -> None:
        self._names = names
        self._tank = tank

    def resolve(self, name: str) -> Meaning | None:
        """Return what `name` stands for; a tank's own names come before those of the site."""
        own = None if "." in name else self._names.meanings.get(full(self._tank, name))
        return own or self._names.meanings.get(name)

    def known(self) -> Iterable[str]:
        """Return every name as it would be written here."""
        prefix = f"{self._tank}."
        for name in self._names.meanings:
            yield name.removeprefix(prefix) if self._tank else name

    def full_scale(self, name: str) -> Quantity | None:
        """Return the brim, or the volume at the brim."""
        return self._names.scales.get(name)
