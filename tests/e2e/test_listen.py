"""`brimward listen` on a real broker: raw and converted, what is no news, and what matches nothing."""

import json
import subprocess
import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from driver import Ear, site_on

from gateway.testing import Mosquitto

pytestmark = pytest.mark.mosquitto


def test_each_message_is_shown_with_what_it_comes_to(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """One line a message: the level, a bound, a reading that has come before, a topic that nobody listens to."""
    site = site_on(mosquitto.port, tmp_path, "nutrient-reservoir")
    said = [
        ("greenhouse/reservoir/air", json.dumps({"celsius": 20.5, "ts": 1_777_629_600})),
        ("greenhouse/reservoir/air", json.dumps({"celsius": 99.0, "ts": 1_777_629_600})),
        ("greenhouse/reservoir/echo", '{"us": 4000}'),
        ("greenhouse/reservoir/echo", '{"us": 100}'),
        ("greenhouse/elsewhere", "1"),
    ]
    command = [
        sys.executable,
        "-c",
        "from gateway.cli import main; main()",
        "listen",
        str(site),
        "--json",
        "--for",
        "60",
    ]
    with Ear(mosquitto.port) as ear, subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        with _knocking(ear):
            assert json.loads(child.stdout.readline())["topic"] == "greenhouse/ready"
        for topic, payload in said:
            ear.say(topic, payload).wait_for_publish(20)
        lines = [json.loads(child.stdout.readline()) for _ in said]
        child.terminate()
    assert lines[0]["value"] == pytest.approx(293.65)
    assert lines[0]["clock_s"] is not None
    assert lines[1]["note"] == "it has come before"
    assert lines[2]["value"] == pytest.approx(0.7636, abs=1e-4)
    assert (lines[3]["status"], lines[3]["value"]) == ("failure", None)
    assert "blanking" in str(lines[3]["reason"])
    assert lines[4]["note"] == "matches nothing"


@contextmanager
def _knocking(ear: Ear) -> Iterator[None]:
    """Publish on a topic that nobody listens to, again and again; it is told once."""
    done = threading.Event()

    def knock() -> None:
        while not done.wait(0.05):
            ear.say("greenhouse/ready", "?")

    thread = threading.Thread(target=knock)
    thread.start()
    try:
        yield
    finally:
        done.set()
        thread.join()
