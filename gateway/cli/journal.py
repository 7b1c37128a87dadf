"""`brimward journal list`: the audit trail."""

from typing import Annotated, Any

import typer

from gateway.cli.common import AsJson, SiteArgument, named, print_json
from gateway.cli.times import read_end, read_time, shown
from gateway.errors import InputError
from gateway.events import Message
from gateway.journal.reader import Reader, Span
from gateway.journal.records import EffectRow, EventRow, told
from gateway.measure.payloads.payload import shown_payload
from gateway.plant import Plant
from gateway.recall import reader_of
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load
from gateway.topics import moment

KINDS = ("command", "reason", "rule", "sensor", "volumes", "pump flow", "note", "gateway", "reading")

MOST = 1_000_000  # rows; more at once is a matter for a program, with --from and --to

journal = typer.Typer(help="The audit trail.", no_args_is_help=True)


@journal.callback()
def _group() -> None:
    """Look at the audit trail."""


@journal.command("list")
def list_command(
    site: SiteArgument,
    begin: Annotated[str | None, typer.Option("--from", help="The first time, such as `2026-05-01 03:00`.")] = None,
    end: Annotated[str | None, typer.Option("--to", help="The last time.")] = None,
    tank: Annotated[str | None, typer.Option("--tank", help="Only what is about this tank.")] = None,
    actuator: Annotated[str | None, typer.Option("--actuator", help="Only what is about this actuator.")] = None,
    kind: Annotated[str | None, typer.Option("--kind", help=f"Only this kind: {', '.join(KINDS)}.")] = None,
    limit: Annotated[int, typer.Option("--limit", help="The newest so many; 0: all.", min=0, max=MOST)] = 100,
    as_json: AsJson = False,
) -> None:
    """List what has happened, the newest last; readings only when asked for with --kind reading.

    Example: brimward journal list config_examples/hill-dairy --from 03:00 --actuator cooling-unit
    """
    settings = load(site)
    plant = Plant(plant_plan(settings))
    zone = settings.file.timezone
    span = Span(
        read_time(begin, zone) if begin is not None else 0, read_end(end, zone) if end is not None else Span().end
    )
    if kind is not None and kind not in KINDS:
        raise InputError(f"`{kind}` is no kind; known: {', '.join(KINDS)}")
    about = named(actuator, plant.plan.commands, "actuator") if actuator else None
    if tank is not None and tank not in settings.tanks:
        raise InputError(f"`{tank}` is no tank of this site; known: {', '.join(settings.tanks)}")
    reader = reader_of(settings)
    rows = _Rows(reader, plant, span, limit or -1).all(kind, tank, about)
    for at, facts, text in rows[-limit:] if limit else rows:
        if as_json:
            print_json({"at": moment(at), **facts})
        else:
            typer.echo(f"{shown(at, zone)}  {text}")


Row = tuple[int, dict[str, Any], str]


class _Rows:
    """Gathers rows of the journal, each with its facts and its line for people."""

    def __init__(self, reader: Reader, plant: Plant, span: Span, newest: int) -> None:
        self.reader, self.plant, self.span, self.newest = reader, plant, span, newest

    def all(self, kind: str | None, tank: str | None, actuator: str | None) -> list[Row]:
        """Return the rows that are asked for, in the order of time."""
        if kind == "reading":
            return self._readings(tank)
        rows: list[Row] = []
        if kind in {None, "gateway"} and tank is None and actuator is None:
            rows += [_of_event(row) for row in self.reader.notable(self.span, self.newest)]
        if kind != "gateway":
            rows += self._effects(kind, tank, actuator)
        return sorted(rows, key=lambda row: row[0])

    def _effects(self, kind: str | None, tank: str | None, actuator: str | None) -> list[Row]:
        subjects = None if tank is None and actuator is None else self._subjects(tank, actuator)
        found = self.reader.effects(
            subjects=subjects, kinds=(kind,) if kind else (), span=self.span, newest=self.newest
        )
        return [_of_effect(row) for row in found]

    def _subjects(self, tank: str | None, actuator: str | None) -> tuple[str, ...]:
        """Return whose effects to show: an actuator with its rules, or all that is in a tank."""
        plan = self.plant.plan
        if actuator is not None:
            return (actuator, *(rule.name for rule in plan.site.rules if rule.actuator == actuator))
        names = [*(one.name for one in plan.sensors), *plan.commands, *(rule.name for rule in plan.site.rules)]
        return (tank or "", *(name for name in names if name.startswith(f"{tank}.")))

    def _readings(self, tank: str | None) -> list[Row]:
        chosen = [one for one in self.plant.meters.sensors if tank is None or one.plan.name.startswith(f"{tank}.")]
        topics = tuple({topic for one in chosen for topic in one.topics})
        rows = self.reader.messages(topics, self.span, self.newest)
        return [_of_message(row.at, row.event) for row in rows if isinstance(row.event, Message)]


def _of_message(at: int, event: Message) -> Row:
    payload = shown_payload(event.payload)
    facts = {"record": "reading", "topic": event.topic, "payload": payload}
    marks = [word for word, true in (("retained", event.retained), ("late", event.late)) if true]
    return (
        at,
        {**facts, "retained": event.retained, "late": event.late},
        " ".join([f"reading  {event.topic}  {payload}", *(f"({mark})" for mark in marks)]),
    )


def _of_event(row: EventRow) -> Row:
    kind, _ = told(row.event)
    reason = getattr(row.event, "reason", "")
    text = {"start": "the gateway has started", "stop": "the gateway has stopped", "link up": "the link is proven"}
    line = text.get(kind, "the link is lost" if kind == "link down" else "the wall clock was set")
    facts = {"record": "gateway", "event": kind, "reason": reason or None}
    return row.at, facts, f"gateway  {line}" + (f": {reason}" if reason else "")


_VOLUMES = (("into", "in"), ("out", "out"), ("spilled", "spilled"))


def _of_effect(row: EffectRow) -> Row:
    data, about = row.data, row.subject
    facts = {"record": row.kind, "about": about, **{key: value for key, value in data.items() if key != "because"}}
    match row.kind:
        case "command":
            again = ", told again" if data["again"] else ""
            line = f"command  {about} → {data['state']}{again}: {data['reason']}"
        case "reason":
            line = f"reason   {about} stays {data['state']}: {data['reason']}"
        case "rule":
            line = f"rule     '{about}' {'comes into' if data['in_force'] else 'leaves'} force"
            line += " and latches" if data["latched"] else ""
        case "sensor":
            reason = f": {data['reason']}" if data["reason"] else ""
            line = f"sensor   {about} is {data['status']}{reason}"
        case "volumes":
            litres = ", ".join(f"{data[key] * 1000:.0f} l {word}" for key, word in _VOLUMES)
            line = f"volumes  {about} {data['period']} {data['name']}: {litres}"
        case "pump flow":
            line = f"pump     {about} took {data['flow'] * 1000:.3g} l/s in this run"
        case _:
            line = f"note     {about}: {data['text']}"
    return row.at, facts, line
