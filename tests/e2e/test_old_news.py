"""Old news moves nothing: backlog, retained readings, a broker that was frozen, a connection that was swallowed."""

import json
import threading
import time
from pathlib import Path
from typing import Self

import pytest
from driver import Ear, GatewayProcess, brimward, running, site_on

from gateway.events import Message
from gateway.journal.reader import Reader
from gateway.settings.load import load
from gateway.testing import Mosquitto, Proxy, eventually

pytestmark = pytest.mark.mosquitto

PROBE = "dairy/condensate-drum/probe"
FLOAT = "dairy/condensate-drum/float"
COOLER = "dairy/cooling-unit/do"
CALM, FULL = '{"hz": 20000}', '{"hz": 2900}'


class Calm:
    """The drum's sensors, saying all is well a few times a second until told otherwise."""

    def __init__(self, ear: Ear) -> None:
        self.payload = CALM
        self._ear = ear
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._run, daemon=True)

    def __enter__(self) -> Self:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._done.set()
        self._thread.join()

    def _run(self) -> None:
        while not self._done.wait(0.3):
            self._ear.say(PROBE, self.payload)
            self._ear.say(FLOAT, "0")


def messages(site: Path) -> list[Message]:
    """Return every message that the journal holds."""
    return [row.event for row in Reader(load(site).journal_path).events() if isinstance(row.event, Message)]


def test_a_backlog_of_five_thousand_readings_is_journaled_as_late_and_moves_nothing(
    mosquitto: Mosquitto, tmp_path: Path
) -> None:
    """Every one of them says that the drum is full; none of them is news."""
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear:
        with running(site), Calm(ear):
            assert eventually(lambda: ear.on(COOLER) == ["running"])
        sent = [ear.say(PROBE, json.dumps({"hz": 2_900, "n": n})) for n in range(5_000)]
        for one in sent:
            one.wait_for_publish(60)
        with running(site):
            assert eventually(lambda: len(messages(site)) >= 5_000, within_s=60)
            time.sleep(3)  # longer than it takes to act on live readings
            assert ear.on(COOLER) == ["running"]
    late = [one for one in messages(site) if one.late and b'"n"' in one.payload]
    assert len({one.payload for one in late}) == 5_000
    assert not [one for one in messages(site) if not one.late and b'"n"' in one.payload]


def test_a_retained_reading_is_never_live(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """It has no age: it may be of last year."""
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear:
        ear.say(PROBE, CALM, retain=True).wait_for_publish(20)
        ear.say(FLOAT, "0", retain=True).wait_for_publish(20)
        with running(site):
            assert eventually(lambda: len(messages(site)) >= 2)
            time.sleep(1)
            assert ear.on(COOLER) == []


def test_after_a_frozen_broker_no_stale_command_is_sent(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """What the broker had in its queues when it froze is late when it thaws; live readings count again at once."""
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear, running(site) as gateway, Calm(ear) as calm:
        assert eventually(lambda: ear.on(COOLER) == ["running"])
        before = gateway.times_proven()
        mosquitto.freeze()
        calm.payload = FULL
        time.sleep(12)  # longer than a message can be live
        calm.payload = CALM
        mosquitto.thaw()
        assert eventually(lambda: gateway.times_proven() > before, within_s=40), gateway.log
        time.sleep(2)
        assert set(ear.on(COOLER)) == {"running"}, "twelve seconds of old readings must not stop the unit"
        calm.payload = FULL
        assert eventually(lambda: ear.on(COOLER)[-1] == "stopped", within_s=40), gateway.log


def test_after_a_swallowed_connection_the_newest_state_is_told_and_no_older_one(
    mosquitto: Mosquitto, tmp_path: Path
) -> None:
    """A connection that passes nothing on is noticed, given up, and what was sent into it is gone."""
    with Proxy(mosquitto.port) as proxy:
        site = site_on(proxy.port, tmp_path)
        with Ear(mosquitto.port) as ear, running(site) as gateway, Calm(ear) as calm:
            assert eventually(lambda: ear.on(COOLER) == ["running"])
            before = gateway.times_proven()
            proxy.stall()
            calm.payload = FULL
            assert eventually(lambda: "link lost" in gateway.log or "disconnected" in gateway.log, within_s=30)
            calm.payload = CALM
            time.sleep(1)
            proxy.flow()
            assert eventually(lambda: gateway.times_proven() > before, within_s=40), gateway.log
            time.sleep(2)
            assert set(ear.on(COOLER)) == {"running"}


def test_a_broker_that_is_stopped_and_started_again_is_found_again(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """And the state is told again, from knowledge."""
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear, running(site) as gateway, Calm(ear):
        assert eventually(lambda: ear.on(COOLER) == ["running"])
        before = gateway.times_proven()
        mosquitto.stop()
        time.sleep(1)
        mosquitto.start()
        assert eventually(lambda: gateway.times_proven() > before, within_s=40), gateway.log
        told = Reader(load(site).journal_path)
        assert eventually(
            lambda: len(told.effects(subjects=("condensate-drum.cooling-unit",), kinds=("command",))) >= 2
        )
        commands = told.effects(subjects=("condensate-drum.cooling-unit",), kinds=("command",))
        assert [(one.data["state"], one.data["again"]) for one in commands] == [("running", False), ("running", True)]
        assert gateway.alive


def test_hostile_payloads_move_nothing_and_end_nothing(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """Two thousand of them over the broker, between readings that say that all is well."""
    hostile = [
        b"",
        b"\xff\xfe",
        b"NaN",
        b'{"hz": NaN}',
        b'{"hz": 1e999}',
        b"[" * 30_000,
        b"9" * 5_000,
        b'{"hz": "2900"}',
    ]
    site = site_on(mosquitto.port, tmp_path)
    with Ear(mosquitto.port) as ear, running(site) as gateway, Calm(ear):
        assert eventually(lambda: ear.on(COOLER) == ["running"])
        for n in range(2_000):
            ear.say(PROBE, hostile[n % len(hostile)]).wait_for_publish(20)
            ear.say(PROBE, CALM)
        assert eventually(lambda: len(messages(site)) >= 4_000, within_s=60)
        assert ear.on(COOLER) == ["running"]
        assert gateway.alive


def test_two_gateways_cannot_run_one_site(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """The second says who runs it, and ends with status 2."""
    site = site_on(mosquitto.port, tmp_path)
    gateway = GatewayProcess(site)
    try:
        gateway.start_and_prove()
        second = brimward("run", site)
    finally:
        gateway.end()
    assert second.returncode == 2
    assert "another gateway" in second.stderr
    assert "Traceback" not in second.stderr
