"""`brimward listen`: what arrives, live, raw and converted, and what matches nothing."""

import time
from datetime import UTC, datetime
from typing import Annotated, Any
from zoneinfo import ZoneInfo

import typer

from gateway.cli.common import AsJson, SiteArgument, named, print_json
from gateway.connect import link_options
from gateway.link.tap import Heard, Tap
from gateway.measure.combine import range_of
from gateway.measure.payloads.payload import shown_payload
from gateway.measure.sensor import Sensor
from gateway.plan import PlantPlan
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load
from gateway.topics import moment, rounded
from rules.model import Bounds, saved


def listen_command(
    site: SiteArgument,
    sensor: Annotated[str | None, typer.Argument(help="Only this sensor.", metavar="[TANK.SENSOR]")] = None,
    as_json: AsJson = False,
    duration: Annotated[float | None, typer.Option("--for", help="Seconds to listen; else until Ctrl-C.")] = None,
) -> None:
    """Show what arrives on the site's topics, raw and converted, and topics beside them that match nothing.

    Example: brimward listen config_examples/hill-dairy condensate-drum.probe
    """
    settings = load(site)
    plan = plant_plan(settings)
    ear = _Ear(plan, settings.file.timezone, only=sensor, as_json=as_json, own=settings.publish_under)
    tap = Tap(link_options(settings, ()), ear.filters)
    until = time.monotonic() + (duration if duration is not None else float("inf"))
    try:
        while time.monotonic() < until:
            for heard in tap.heard(within_s=min(0.5, max(0.0, until - time.monotonic()))):
                ear.show(heard)
                if time.monotonic() >= until:
                    break
    except KeyboardInterrupt:
        pass
    finally:
        tap.close()


class _Ear:
    """Turns messages into lines."""

    def __init__(self, plan: PlantPlan, zone: str, *, only: str | None, as_json: bool, own: str) -> None:
        by_name = {one.name: one for one in plan.sensors}
        chosen = list(by_name.values()) if only is None else [by_name[named(only, by_name, "sensor")]]
        self.sensors = [Sensor(one) for one in chosen]
        self.units = {decl.name: decl.dimension.unit for decl in plan.site.signals if decl.dimension is not None}
        self.zone = ZoneInfo(zone)
        self.as_json = as_json
        self.own = own
        self.commands = {command.topic: actuator for actuator, command in plan.commands.items()}
        self.unmatched: set[str] = set()
        self.filters = self._filters(only)

    def _filters(self, only: str | None) -> list[str]:
        """Return what to subscribe to: the sensors' topics, and what lies beside them under the same first words."""
        topics = [topic for sensor in self.sensors for topic in sensor.topics]
        if only is not None:
            return topics
        return sorted({f"{topic.split('/', 1)[0]}/#" if "/" in topic else topic for topic in topics})

    def show(self, heard: Heard) -> None:
        """Print one message: once for each sensor that listens to it, or once as matching nothing."""
        found = [sensor for sensor in self.sensors if heard.topic in sensor.topics]
        for sensor in found:
            self._show_reading(sensor, heard)
        if not found and heard.topic in self.commands:
            self._print({"topic": heard.topic, "note": f"commands {self.commands[heard.topic]}"}, heard)
        elif not found and not heard.topic.startswith(f"{self.own}/") and heard.topic not in self.unmatched:
            if len(self.unmatched) < 10_000:  # a bound, should topics never end
                self.unmatched.add(heard.topic)
            self._print({"topic": heard.topic, "note": "matches nothing"}, heard)

    def _show_reading(self, sensor: Sensor, heard: Heard) -> None:
        before = sensor.no_news
        sensor.take(time.time_ns(), heard.topic, heard.payload, retained=heard.retained)
        if sensor.no_news is not None and sensor.no_news is not before:
            self._print({"sensor": sensor.plan.name, "topic": heard.topic, "note": sensor.no_news.reason}, heard)
            return
        last = sensor.last
        if heard.topic != sensor.plan.topic or last is None or (heard.retained and not sensor.on_change):
            kind = "retained: not a live reading" if heard.topic == sensor.plan.topic else "sign of life"
            self._print({"sensor": sensor.plan.name, "topic": heard.topic, "note": kind}, heard)
            return
        value = rounded(last.value, 4) if isinstance(last.value, float) else last.value
        clock = None if sensor.ages is None else sensor.ages.offset
        facts = {"sensor": sensor.plan.name, "raw": last.raw, "unit": sensor.plan.unit, "value": value}
        facts |= {"status": last.status.value, "reason": last.reason, "clock_s": clock and round(clock / 1e9, 3)}
        self._print(facts, heard)

    def _print(self, facts: dict[str, Any], heard: Heard) -> None:
        payload = shown_payload(heard.payload)
        if self.as_json:
            plain = {key: saved(value) for key, value in facts.items()}
            print_json({"at": moment(time.time_ns()), "topic": heard.topic, "payload": payload, **plain})
            return
        clock = f"{datetime.now(UTC).astimezone(self.zone):%H:%M:%S}"
        if "note" in facts:
            typer.echo(f"{clock}  {facts.get('sensor', heard.topic)}  {payload!r}  {facts['note']}")
            return
        reason = f": {facts['reason']}" if facts["reason"] else ""
        behind = f"  its clock: {-facts['clock_s']:+.1f} s" if facts["clock_s"] else ""
        shown = _shown(facts["value"], self.units.get(facts["sensor"], ""))
        typer.echo(f"{clock}  {facts['sensor']}  {payload}  → {shown}  {facts['status']}{reason}{behind}")


def _shown(value: Any, unit: str) -> str:
    """Return a value for people: a number, what is known of one, or a word."""
    if isinstance(value, float):
        return f"{value:.4f} {unit}" if unit == "m" else f"{value:.6g} {unit}"
    return range_of(value) if isinstance(value, Bounds) else value or "no value"
