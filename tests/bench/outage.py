"""How late the core's timers are while the broker is away: stopped, frozen, swallowed, mute.

The gateway runs in this process. Twice a second a deadline of a rule passes, and the lateness of what follows is
taken: from the deadline to the moment at which its effect is there. Prints the worst of each kind, and of quiet
running, in ms.
Run: `python tests/bench/outage.py [SECONDS]`.
"""

import logging
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from gateway.clock import Clock
from gateway.connect import link_options
from gateway.effects import Effect, RuleChange
from gateway.plant import Plant
from gateway.service import Service
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts
from gateway.testing import Mosquitto, MuteServer, Proxy, eventually

# A rule that comes and goes twice a second without any message: it cannot be decided, and acts in a rhythm.
TANK = """
tank: clock
actuators:
  tick: {command: {topic: bench/tick}, safe: off}
sensors:
  contact: {topic: bench/contact, senses: contact, expect_every: 1 h}
rules:
  blink:
    rank: interlock
    demand: tick on
    from: contact is wet
    if_unknown: act for 500 ms every 1 s
"""


class Lateness:
    """Takes, for every change of the blinking rule, how late it came."""

    def __init__(self, clock: Clock) -> None:
        self._clock = clock
        self.worst = 0
        self.count = 0

    def __call__(self, _: object, effects: Sequence[Effect]) -> None:
        """Take what has happened."""
        now = self._clock.now()
        for effect in effects:
            if isinstance(effect, RuleChange) and effect.rule == "clock.blink":
                self.worst = max(self.worst, now - effect.t)
                self.count += 1

    def start_over(self) -> None:
        """Forget what was."""
        self.worst = self.count = 0


@contextmanager
def gateway(port: int) -> Iterator[Lateness]:
    """Run a gateway against `port`."""
    with tempfile.TemporaryDirectory() as folder:
        head = f"site: bench\nstartup_grace: 0 s\nbroker: {{url: 'mqtt://127.0.0.1:{port}', link_tolerance: 1 h}}\n"
        site = load_texts({"site.yaml": head, "tanks/clock.yaml": TANK}, Path(folder))
        clock = Clock()
        lateness = Lateness(clock)
        options = link_options(site, Plant(plant_plan(site)).topics)
        service = Service(site, options, clock, logging.getLogger("bench"), lateness)
        control = threading.Thread(target=service.run)
        control.start()
        try:
            yield lateness
        finally:
            service.stop()
            control.join()


def _watched(lateness: Lateness, seconds: float, trouble: Callable[[], object]) -> tuple[float, int]:
    eventually(lambda: lateness.count > 3)
    lateness.start_over()
    trouble()
    time.sleep(seconds)
    return lateness.worst / 1e6, lateness.count


def main() -> None:
    """Run through the kinds of trouble."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else 20.0
    results: dict[str, tuple[float, int]] = {}
    with Mosquitto() as broker:
        for name, trouble in (("quiet", lambda: None), ("frozen", broker.freeze), ("stopped", broker.kill)):
            with gateway(broker.port) as lateness:
                results[name] = _watched(lateness, seconds, trouble)
            broker.thaw()
        broker.start()
        with Proxy(broker.port) as proxy, gateway(proxy.port) as lateness:
            results["swallowed"] = _watched(lateness, seconds, proxy.stall)
            proxy.flow()
    with MuteServer() as mute, gateway(mute.port) as lateness:
        results["mute"] = _watched(lateness, seconds, lambda: None)
    for name, (worst, count) in results.items():
        print(f"{name:10} worst {worst:6.2f} ms of {count} deadlines")


if __name__ == "__main__":
    main()
