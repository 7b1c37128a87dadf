"""`brimward check`: reads everything, says what is wrong and what is risky."""

from typing import Annotated

import typer

from gateway.cli.common import SiteArgument
from gateway.measure.probe import Probe, Regime
from gateway.plan import PlantPlan
from gateway.settings.advice import advise
from gateway.settings.assemble import plant_plan
from gateway.settings.complaint import SettingsError
from gateway.settings.load import load
from gateway.settings.models import Site
from gateway.settings.names import full, parts
from gateway.settings.sensing import probe_of
from rules.model import RuleDecl


def check_command(
    site: SiteArgument,
    strict: Annotated[bool, typer.Option("--strict", help="What is risky also ends with status 1.")] = False,
    verbose: Annotated[bool, typer.Option("-v", "--verbose", help="Print every rule in full.")] = False,
) -> None:
    """Read a site's settings; say what is wrong, what is risky and why.

    Example: brimward check config_examples/hill-dairy -v
    """
    try:
        settings = load(site)
    except SettingsError as error:
        count = len(error.complaints)
        typer.echo(str(error))
        typer.echo(f"{count} {'complaint' if count == 1 else 'complaints'}; nothing of it can be used yet")
        raise typer.Exit(1) from None
    plan = plant_plan(settings)
    risks = advise(settings, plan)
    _summarise(settings, plan, verbose=verbose)
    for risk in risks:
        typer.echo(f"risky: {risk}")
    if strict and risks:
        raise typer.Exit(1)


def _summarise(settings: Site, plan: PlantPlan, *, verbose: bool) -> None:
    site = plan.site
    things = {
        "tank": len(settings.tanks),
        "sensor": len(plan.sensors),
        "actuator": len(site.actuators),
        "rule": len(site.rules),
    }
    counts = ", ".join(f"{count} {thing}{'' if count == 1 else 's'}" for thing, count in things.items())
    typer.echo(f"{settings.name}: {counts}; all of it can be used")
    if not verbose:
        return
    for tank, part in parts(settings):
        for name, sensor in part.sensors.items():
            if sensor.probe is not None:
                typer.echo(_probe_told(full(tank, name), probe_of(sensor)))
    for rule in site.rules:
        typer.echo(_told(rule))


_REGIMES = {
    Regime.CONDUCTOR: "the liquid conducts, so the coating alone counts",
    Regime.DIELECTRIC: "the liquid is a dielectric",
    Regime.NEITHER: "the liquid is neither a conductor nor a dielectric at this frequency",
}


def _probe_told(name: str, probe: Probe) -> str:
    """Return what the dimensions of a probe come to."""
    ends = f"{probe.dry * 1e12:.1f} pF dry, {probe.wet * 1e12:.1f} pF wet"
    return f"  {name}: {ends}, {probe.picofarads_per_millimetre:.3g} pF/mm; {_REGIMES[probe.regime]}"


def _told(rule: RuleDecl) -> str:
    until = rule.until if rule.until is not None else f"not ({rule.from_})"
    lines = [
        f"  {rule.name}: {rule.rank.word} → {rule.actuator} {rule.state}{', latches' if rule.latch else ''}",
        f"    from  {rule.from_}",
        f"    until {until}",
    ]
    return "\n".join(lines)
