"""What is not wrong in a site's settings and still risky: each with its reason and, where there is one, a figure."""

from collections.abc import Iterator

from gateway.plan import PlantPlan
from gateway.settings.models import Site
from gateway.settings.names import full, parts
from gateway.settings.sensing import probe_of
from gateway.settings.units import SECOND
from rules.conditions.terms import constant
from rules.conditions.tree import And, AtLeast, Comparison, Condition, Held, Name, Not, Or, Relation
from rules.model import OnUnknown, Rank, RuleDecl


def advise(site: Site, plan: PlantPlan) -> list[str]:
    """Return what is risky, in file order."""
    return [*_about_broker(site), *_about_sensors(site), *_about_actuators(site, plan), *_about_rules(site, plan)]


def _about_broker(site: Site) -> Iterator[str]:
    broker = site.file.broker
    address = broker.url
    near = address.transport != "tcp" or address.host in {"127.0.0.1", "::1", "localhost"}
    if not near and not address.tls:
        yield f"broker {address.host}: not encrypted; anyone on the network can read, and send commands (use mqtts://)"
    if not near and broker.username is None and broker.certificate is None:
        yield f"broker {address.host}: no user name and no certificate; anyone on the network can be the gateway"
    if address.transport == "embedded":
        yield "the embedded broker is for trials: it keeps nothing, and devices must find its port"


def _about_sensors(site: Site) -> Iterator[str]:
    for tank, part in parts(site):
        for name, sensor in part.sensors.items():
            silent, every = sensor.silent_after, sensor.expect_every
            if silent is not None and every is not None and silent <= every:
                told = f"counts as silent after {silent / SECOND:g} s, though it sends every {every / SECOND:g} s"
                yield f"{full(tank, name)}: {told}; it is unknown between readings"
            warning = None if sensor.probe is None else probe_of(sensor).warning
            if warning is not None:
                yield f"{full(tank, name)}: {warning}"


def _about_actuators(site: Site, plan: PlantPlan) -> Iterator[str]:
    protected = {rule.actuator for rule in plan.site.rules if rule.rank <= Rank.INTERLOCK}
    asked = {rule.actuator for rule in plan.site.rules}
    for tank, part in parts(site):
        for name, actuator in part.actuators.items():
            who = full(tank, name)
            if actuator.safe is None and who in protected:
                rest = actuator.rest or actuator.states[0]
                yield f"{who}: `safe` is not written, so it is `{rest}`, its rest, also when nothing is known"
            if actuator.command.qos == 0:
                yield f"{who}: commands at qos 0 can be lost without a trace"
            if actuator.command.retain:
                yield f"{who}: a retained command reaches a device that comes back days later"
            if who not in asked:
                yield f"{who}: no rule asks anything of it"


def _about_rules(site: Site, plan: PlantPlan) -> Iterator[str]:
    brims = {full(tank.tank, "level"): tank.brim for tank in site.tanks.values() if tank.brim is not None}
    for rule in plan.site.rules:
        if rule.until is None and any(True for _ in _comparisons(rule.from_)):
            yield f"'{rule.name}': no `until`, so no dead band; a level at its threshold switches again and again"
        if rule.rank <= Rank.INTERLOCK and rule.if_unknown is OnUnknown.RELEASE:
            yield f"'{rule.name}': a {rule.rank.word} that releases when it cannot be decided protects nothing then"
        yield from _above_brim(rule, brims)


def _above_brim(rule: RuleDecl, brims: dict[str, float]) -> Iterator[str]:
    for comparison in _comparisons(rule.from_):
        left, bound = comparison.left, constant(comparison.right)
        brim = brims.get(left.name) if isinstance(left, Name) else None
        upward = comparison.relation in {Relation.ABOVE, Relation.AT_LEAST}
        if brim is not None and bound is not None and upward and bound >= brim:
            yield f"'{rule.name}': {comparison} is {bound - brim:g} m above the brim; it comes after the spill"


def _comparisons(node: Condition) -> Iterator[Comparison]:
    match node:
        case Comparison():
            yield node
        case Not() | Held():
            yield from _comparisons(node.part)
        case And() | Or() | AtLeast():
            for part in node.parts:
                yield from _comparisons(part)
        case _:
            return
