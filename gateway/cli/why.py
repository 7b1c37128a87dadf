"""`brimward why`: why an actuator or a rule is, or was, as it is."""

from typing import Annotated

import typer

from gateway.cli.common import AsJson, SiteArgument, named, print_json
from gateway.cli.times import read_end, shown
from gateway.errors import InputError
from gateway.journal.reader import Span
from gateway.plant import Plant
from gateway.recall import reader_of, recall, recall_at
from gateway.review.sentences import actuator_sentences, rule_sentences
from gateway.review.why import why_actuator, why_rule
from gateway.settings.load import load


def why_command(
    site: SiteArgument,
    name: Annotated[str, typer.Argument(help="An actuator or a rule.", metavar="ACTUATOR-OR-RULE")],
    state: Annotated[str | None, typer.Argument(help="Why not in this state (not yet supported).")] = None,
    at: Annotated[str | None, typer.Option("--at", help="A time, such as `03:12`; else the latest known.")] = None,
    verbose: Annotated[bool, typer.Option("-v", "--verbose", help="Every condition with its values.")] = False,
    as_json: AsJson = False,
) -> None:
    """Say why an actuator or a rule is, or was, in its state: rule, condition, level, raw reading, time.

    Example: brimward why config_examples/hill-dairy cooling-unit --at 03:12
    """
    if state is not None:
        raise InputError("`why` with a state, why it was not in it, is not yet supported")
    settings = load(site)
    zone = settings.file.timezone
    reader = reader_of(settings)
    when = read_end(at, zone) if at is not None else Span().end
    found = recall_at(reader, settings, when) if at is not None else recall(reader, settings)
    if found is None:
        raise InputError(
            "the journal does not reach back to that time" if at is not None else "nothing has happened yet"
        )
    plant, _ = found
    full, is_actuator = _meant(plant, name)
    told = why_actuator(reader, plant, full, when) if is_actuator else why_rule(reader, plant, full, when)
    if as_json:
        print_json(told)
        return
    sentences = actuator_sentences if is_actuator else rule_sentences
    for line in sentences(told, lambda moment: shown(moment, zone), plant.offset, verbose=verbose):
        typer.echo(line)


def _meant(plant: Plant, name: str) -> tuple[str, bool]:
    """Return the full name that was meant, and whether it is an actuator."""
    actuators = list(plant.plan.commands)
    full = named(name, [*actuators, *(rule.name for rule in plant.plan.site.rules)], "actuator or rule")
    return full, full in actuators
