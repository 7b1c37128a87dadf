"""`brimward demo`: a whole site on this machine, told in plain words."""

import logging
import queue
import shutil
import tempfile
import threading
import time
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Annotated

import typer

from gateway.cli.common import read_span
from gateway.cli.times import shown
from gateway.clock import Clock
from gateway.connect import link_options
from gateway.effects import Command, Effect, RuleChange, SensorChange, Value
from gateway.events import Event
from gateway.examples import example
from gateway.journal.reader import Reader, Span
from gateway.link.embedded import EmbeddedBroker
from gateway.link.messages import LinkNews
from gateway.measure.combine import range_of
from gateway.plan import PlantPlan
from gateway.plant import Plant
from gateway.recall import recall_at
from gateway.review.sentences import actuator_sentences
from gateway.review.why import why_actuator
from gateway.service import Service
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load
from gateway.settings.models import Site
from gateway.simulate.site import SimulatedSite

SPEED = 20.0  # minutes of plant life in three seconds; faster, and a busy machine would seem to silence sensors
ASKED = "condensate-drum.cooling-unit"


def demo_command(
    duration: Annotated[str, typer.Option("--for", help="How long, in real time.")] = "60 s",
    no_web: Annotated[bool, typer.Option("--no-web", help="Without the page (there is none yet).")] = False,
) -> None:
    """Run a whole site on this machine: broker, simulated plant, gateway; and tell what happens and why.

    Example: brimward demo --for "60 s"
    """
    del no_web  # accepted, so that scripts written today go on working when there is a page
    seconds = read_span(duration)
    with tempfile.TemporaryDirectory(prefix="brimward-demo-") as folder:
        site_folder = Path(folder) / "hill-dairy"
        shutil.copytree(example("hill-dairy"), site_folder, ignore=shutil.ignore_patterns("var"))
        _Demo(load(site_folder)).run(seconds)


class _Demo:
    """The parts of the demo, and the voice that tells of them."""

    def __init__(self, site: Site) -> None:
        self.site = site
        self.zone = site.file.timezone
        self.plan: PlantPlan = plant_plan(site)
        self.clock = Clock(SPEED)
        self.lines: queue.Queue[str] = queue.Queue()
        self.levels: dict[str, Value] = {}
        self.commands = 0
        self.minute = -1

    def run(self, seconds: float) -> None:
        """Run for so many real seconds, then sum up and ask why."""
        broker = EmbeddedBroker()
        port = broker.start()
        simulated = SimulatedSite(self.site, self.plan, port, self.clock, self.say_incident)
        options = link_options(self.site, Plant(self.plan).topics, port=port)
        service = Service(self.site, options, self.clock, _quiet_log(), self.hear)
        gateway = threading.Thread(target=service.run, name="control", daemon=True)
        self._introduce(port)
        gateway.start()
        simulated.start()
        try:
            self._tell_until(time.monotonic() + seconds)
        except KeyboardInterrupt:
            typer.echo()
        finally:
            simulated.stop()
            service.stop()
            gateway.join()
            broker.stop()
        self._sum_up(simulated)
        self._ask_why()

    def _introduce(self, port: int) -> None:
        typer.echo(f"{self.site.file.title}: an invented site, {SPEED:g} times faster than life.")
        typer.echo(f"A broker of its own on 127.0.0.1:{port}, a simulated plant, and the gateway. Ctrl-C ends it.")
        typer.echo("Not a safety system: a real site has an independent, hard-wired cut-out where harm can be done.\n")

    # ---- told while it runs: called in other threads, printed in this one

    def hear(self, _: Event | LinkNews, effects: Sequence[Effect]) -> None:
        """Take what the gateway does."""
        for effect in effects:
            for sentence in self._sentences(effect):
                self.say(effect.at, sentence)

    def say_incident(self, sentence: str) -> None:
        """Take what happens to the plant."""
        self.say(self.clock.wall(), f"-- {sentence}")

    def say(self, at: int, sentence: str) -> None:
        """Have a sentence printed."""
        self.lines.put(f"{shown(at, self.zone)[11:-2]}  {sentence}")

    def _sentences(self, effect: Effect) -> Iterator[str]:
        match effect:
            case Value():
                self.levels[effect.tank] = effect
                yield from self._every_two_minutes(effect.at)
            case SensorChange() if effect.reason is not None:
                yield f"sensor {effect.sensor} is not usable: {effect.reason}"
            case SensorChange():
                yield f"sensor {effect.sensor} is {effect.status}"
            case RuleChange():
                moved = "comes into" if effect.in_force else "leaves"
                yield f"rule '{effect.rule}' {moved} force ({self._level(effect.rule.partition('.')[0])})"
            case Command() if not effect.again:
                self.commands += 1
                yield f"{effect.actuator} → {effect.state.upper()}: {effect.reason}"
            case _:
                return

    def _level(self, tank: str) -> str:
        value = self.levels.get(tank)
        if value is None or value.level is None:
            return "level unknown"
        return f"level {value.level:.3f} m" if isinstance(value.level, float) else f"level {range_of(value.level)}"

    def _every_two_minutes(self, at: int) -> Iterator[str]:
        minute = at // 120_000_000_000
        if minute != self.minute and len(self.levels) == len(self.plan.tanks):
            self.minute = minute
            yield "   ".join(_gauge(self.levels[tank.name]) for tank in self.plan.tanks)

    def _tell_until(self, end: float) -> None:
        while (left := end - time.monotonic()) > 0:
            try:
                typer.echo(self.lines.get(timeout=min(left, 0.2)))
            except queue.Empty:
                continue

    # ---- afterwards

    def _sum_up(self, simulated: SimulatedSite) -> None:
        typer.echo(f"\n{simulated.sent} readings sent, {self.commands} commands given.")
        for name, basin in simulated.water.basins.items():
            spilled = f"{basin.spilled * 1000:.1f} l spilled" if basin.spilled else "nothing spilled"
            typer.echo(f"  {name}: between {basin.lowest:.2f} m and {basin.highest:.2f} m, {spilled}")

    def _ask_why(self) -> None:
        reader = Reader(self.site.journal_path)
        stopped = [
            row
            for row in reader.effects(subjects=(ASKED,), kinds=("command",))
            if row.data["state"] == "stopped" and row.data["rule"] is not None
        ]
        at = stopped[0].at if stopped else Span().end
        clock = shown(at, self.zone)[11:19] if stopped else "now"
        typer.echo(f"\n$ brimward why hill-dairy cooling-unit --at {clock}")
        found = recall_at(reader, self.site, at)
        if found is None:
            typer.echo("The journal is still empty; let the demo run for longer.")
            return
        plant, _ = found
        facts = why_actuator(reader, plant, ASKED, at)
        for line in actuator_sentences(facts, lambda moment: shown(moment, self.zone), plant.offset, verbose=False):
            typer.echo(line)
        reader.close()


def _gauge(value: Value) -> str:
    if value.share is None:
        return f"{value.tank} ?"
    filled = min(8, max(0, round(value.share * 8)))
    return f"{value.tank} {'█' * filled}{'░' * (8 - filled)} {value.share * 100:.0f} %"


def _quiet_log() -> logging.Logger:
    log = logging.getLogger("brimward.demo")
    log.setLevel(logging.CRITICAL)  # the demo has a voice of its own
    return log
