"""The main job, as a user sees it: readings go in over a real broker, the appliance stops, and `why` knows."""

import json
import threading
import time
from pathlib import Path

import pytest
from driver import Ear, brimward, running, site_on

from gateway.testing import Mosquitto, eventually

pytestmark = pytest.mark.mosquitto

PROBE = "dairy/condensate-drum/probe"
FLOAT = "dairy/condensate-drum/float"
COOLER = "dairy/cooling-unit/do"


class Drum:
    """The condensate drum's two sensors, speaking twice a second."""

    def __init__(self, ear: Ear) -> None:
        self.hertz = 20_000.0
        self._ear = ear
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._run)
        self._thread.start()

    def _run(self) -> None:
        while not self._done.wait(0.5):
            self._ear.say(PROBE, json.dumps({"hz": self.hertz}))
            self._ear.say(FLOAT, "0")

    def stop(self) -> None:
        """Fall silent."""
        self._done.set()
        self._thread.join()


def test_an_overflow_stops_the_appliance_and_why_says_on_what_grounds(mosquitto: Mosquitto, tmp_path: Path) -> None:
    """Debounce, dead band and answer are as `config_examples/hill-dairy` says; a recorded trace replays to the same."""
    site = site_on(mosquitto.port, tmp_path)
    trace = tmp_path / "trace.jsonl"
    with Ear(mosquitto.port) as ear, running(site):
        recorder = threading.Thread(target=brimward, args=("record", site, "-o", trace, "--for", "22 s"))
        recorder.start()
        time.sleep(2)
        drum = Drum(ear)
        try:
            _run_the_story(ear, drum)
        finally:
            drum.stop()
            recorder.join()
        told = brimward("why", site, "cooling-unit")
        stopped = brimward("journal", "list", site, "--actuator", "cooling-unit", "--json")

    assert told.returncode == 0, told.stderr
    assert told.stdout.startswith("condensate-drum.cooling-unit is running since ")
    _why_then_names_everything(site, [json.loads(line) for line in stopped.stdout.splitlines()])

    lines = brimward("replay", site, "--messages", trace).stdout.splitlines()
    replayed = [record for record in map(json.loads, lines) if record["record"] == "command"]
    of_the_drum = [one["payload"] for one in replayed if one["actuator"] == "condensate-drum.cooling-unit"]
    assert of_the_drum == ear.on(COOLER) == ["running", "stopped", "running"]


def _run_the_story(ear: Ear, drum: Drum) -> None:
    assert eventually(lambda: ear.on(COOLER) == ["running"]), ear.heard
    drum.hertz = 2_900  # 0.80 m, above the brim less 10 cm, and not for long
    time.sleep(3)
    drum.hertz = 3_600  # 0.64 m
    time.sleep(1)
    assert ear.on(COOLER) == ["running"], "a wave that is over within the eight seconds is no overflow"
    drum.hertz = 2_900
    assert eventually(lambda: ear.on(COOLER) == ["running", "stopped"], within_s=30), ear.heard
    drum.hertz = 3_600  # in the dead band
    time.sleep(1.5)
    assert ear.on(COOLER) == ["running", "stopped"], "in the dead band the trip stays"
    drum.hertz = 9_000  # 0.23 m
    assert eventually(lambda: ear.on(COOLER) == ["running", "stopped", "running"]), ear.heard


def _why_then_names_everything(site: Path, records: list[dict[str, object]]) -> None:
    stop = next(one for one in records if one["record"] == "command" and one["state"] == "stopped")
    told = brimward("why", site, "cooling-unit", "--at", str(stop["at"]).replace("Z", "+00:00"))
    assert told.returncode == 0, told.stderr
    for part in (
        "condensate-drum.cooling-unit is stopped since ",
        "Trip rule 'condensate-drum.overflow shutoff' is in force",
        "(condensate-drum.level above (condensate-drum.brim - 10 cm)) for 8 s — true",
        "condensate-drum.level: 0.8 m",
        "2900 Hz",
        'payload `{"hz": 2900}` on dairy/condensate-drum/probe',
        "`stopped` on dairy/cooling-unit/do",
    ):
        assert part in told.stdout, told.stdout
