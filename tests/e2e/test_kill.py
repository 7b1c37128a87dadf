"""kill -9 under load: nothing that was acknowledged is missing, and the state goes on as if nothing had happened.

25 kills in a normal run; BRIMWARD_KILLS sets another number.
"""

import json
import os
import random
import signal
import threading
import time
from pathlib import Path

import pytest
from driver import Ear, GatewayProcess, site_on

from gateway.events import Message
from gateway.journal.reader import Reader
from gateway.plant import Plant
from gateway.recall import recall
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load
from gateway.settings.models import Site
from gateway.testing import Mosquitto, eventually

pytestmark = [pytest.mark.mosquitto, pytest.mark.timeout(3600)]

KILLS = int(os.environ.get("BRIMWARD_KILLS", "25"))
TOPICS = ("dairy/condensate-drum/probe", "dairy/wash-sump/ma", "dairy/header-tank/pf", "dairy/cistern/mm")
# Where every rule is decided by the level alone: outside all dead bands.
SETTLED = dict(zip(TOPICS, (0.5, 0.0, 0.0, 0.5), strict=True))
RATE = 400  # readings a second, over all topics


def reading(topic: str, number: int, swing: float) -> str:
    """Return a payload that holds its number, and a level that swings between nearly empty and nearly full."""
    match topic:
        case "dairy/condensate-drum/probe":
            return json.dumps({"hz": round(3_000 + 9_000 * swing, 1), "n": number})
        case "dairy/wash-sump/ma":
            return json.dumps({"current": {"ma": round(5.0 + 12.0 * swing, 3)}, "n": number})
        case "dairy/header-tank/pf":
            return f"{300 + 1_900 * swing:.3f}{number % 100_000:05}"  # digits far below what matters
        case _:
            return f"{500 + 1_100 * swing:.3f}{number % 100_000:05}"


class Load:
    """Readings at a steady rate, all of them remembered once the broker has taken them."""

    def __init__(self, ear: Ear) -> None:
        self.ear = ear
        self.sent: list[tuple[str, bytes]] = []
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._run)

    def start(self) -> None:
        """Begin."""
        self._thread.start()

    def stop(self) -> None:
        """End, and wait until the broker has taken the last."""
        self._done.set()
        self._thread.join()

    def say(self, topic: str, swing: float) -> None:
        """Publish one reading."""
        payload = reading(topic, len(self.sent), swing)
        self.sent.append((topic, payload.encode()))
        self.ear.say(topic, payload).wait_for_publish(20)

    def _run(self) -> None:
        began, count = time.perf_counter(), 0
        while not self._done.is_set():
            swing = abs((count / 600) % 2 - 1)
            self.say(TOPICS[count % len(TOPICS)], swing)
            count += 1
            time.sleep(max(0.0, began + count / RATE - time.perf_counter()))


def test_nothing_acknowledged_is_lost_and_no_state_differs(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """However often the process is killed, and at whatever instant."""
    seed = random.randrange(2**32)
    rng = random.Random(seed)
    folder = site_on(mosquitto.port, tmp_path)
    gateway = GatewayProcess(folder)
    with Ear(mosquitto.port) as ear:
        traffic = Load(ear)
        gateway.start_and_prove()
        traffic.start()
        try:
            for _ in range(KILLS):
                time.sleep(rng.uniform(0.0, 2.5))
                gateway.end(signal.SIGKILL)
                gateway.start()
        finally:
            traffic.stop()
        assert eventually(lambda: gateway.times_proven() > 0 and gateway.alive)
        _settle(traffic, ear, gateway)
        gateway.end()

    site = load(folder)
    reader = Reader(site.journal_path)
    journaled = {(row.event.topic, row.event.payload) for row in reader.events() if isinstance(row.event, Message)}
    missing = [one for one in traffic.sent if one not in journaled]
    assert not missing, f"seed {seed}: {len(missing)} of {len(traffic.sent)} are missing, the first: {missing[:3]}"
    _recalled_is_replayed(reader, site)
    _as_without_interruption(reader, site, traffic)
    _last_commands_are_those_of_the_state(reader, site, ear)


def _settle(traffic: Load, ear: Ear, gateway: GatewayProcess) -> None:
    """Keep every tank for a while at a level at which its rules do not depend on the way there."""
    ear.say("dairy/condensate-drum/float", "0", retain=False)
    ear.say("dairy/wash-sump/alive", "1", retain=True)
    ear.say("dairy/wash-sump/float", "0", retain=True)
    before = gateway.times_proven()
    assert before > 0
    for _ in range(40):
        for topic in TOPICS:
            traffic.say(topic, SETTLED[topic])
        ear.say("dairy/condensate-drum/float", "0")
        time.sleep(0.5)


def _recalled_is_replayed(reader: Reader, site: Site) -> None:
    """Assert that the state from the last snapshot is the state from the very first input on."""
    recalled = recall(reader, site)
    assert recalled is not None
    whole = Plant(plant_plan(site))
    for row in reader.events():
        whole.step(row.event)
    assert recalled[0].save() == whole.save()


def _as_without_interruption(reader: Reader, site: Site, traffic: Load) -> None:
    """Assert that no rule's state differs from that of a gateway that was never interrupted."""
    recalled = recall(reader, site)
    assert recalled is not None
    never = Plant(plant_plan(site))
    started = False
    for row in reader.events():
        if not isinstance(row.event, Message):
            if not started or type(row.event).__name__ not in {"Start", "LinkDown", "Stop"}:
                never.step(row.event)
            started = True
        else:
            never.step(row.event._replace(late=False))
    assert traffic.sent
    assert _rules(recalled[0]) == _rules(never)


def _rules(plant: Plant) -> dict[str, tuple[bool, bool]]:
    return {
        rule["rule"]: (rule["in_force"], rule["latched"])
        for actuator in plant.plan.commands
        for rule in plant.explain(actuator)["rules"]
    }


def _last_commands_are_those_of_the_state(reader: Reader, site: Site, ear: Ear) -> None:
    """Assert that what each device was told last is what the gateway wants of it."""
    recalled = recall(reader, site)
    assert recalled is not None
    for actuator, command in recalled[0].plan.commands.items():
        state = recalled[0].explain(actuator)["state"]
        told = ear.on(command.topic)
        assert told, f"{actuator} was never told anything"
        assert told[-1] == command.payloads[state], actuator
