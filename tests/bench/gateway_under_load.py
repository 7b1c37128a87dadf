"""The whole gateway as one measured process: `gateway_under_load.py PORT COUNT TANKS`.

Prints `ready`, then the seconds from the first message to the moment when the last is durable and acknowledged.
"""

import logging
import sys
import tempfile
import threading
import time
from collections.abc import Sequence
from pathlib import Path

from gateway.clock import Clock
from gateway.connect import link_options
from gateway.link.messages import Happening, Incoming, Receipt
from gateway.plant import Plant
from gateway.service import Service
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts
from gateway.settings.models import Site

TANK = """
tank: tank-{n}
shape: {{form: vertical cylinder, diameter: 1 m, height: 2 m}}
brim: 1.8 m
sensors:
  probe:
    topic: bench/tank-{n}
    field: /hz
    senses: frequency
    calibration: {{points: [[80.6 kHz, 0 m], [2.9 kHz, 1.8 m]]}}
    expect_every: 60 s
    range: [1 kHz, 100 kHz]
level: probe
actuators:
  pump: {{command: {{topic: do/tank-{n}}}, safe: off}}
rules:
  pump down: {{demand: pump on, from: level above 1.4 m for 10 s, until: level below 0.6 m}}
  overflow shutoff:
    rank: trip
    demand: pump off
    from: level above brim - 10 cm for 5 s
    until: level below 1.2 m
    if_unknown: hold
"""


def site_of(tanks: int, port: int, folder: Path) -> Site:
    """Return a site of so many alike tanks."""
    texts = {"site.yaml": f"site: bench\nbroker: {{url: 'mqtt://127.0.0.1:{port}'}}\n"}
    texts |= {f"tanks/{n:05}.yaml": TANK.format(n=n) for n in range(tanks)}
    return load_texts(texts, folder)


class Measured(Service):
    """A gateway that takes the time between its first message and the last that it has acknowledged."""

    def expect(self, count: int) -> None:
        """Begin to count."""
        self.count, self.acknowledged = count, 0
        self.began = self.ended = 0.0
        self.done = threading.Event()
        acknowledge = self._link.acknowledge

        def counted(receipts: Sequence[Receipt]) -> None:
            acknowledge(receipts)
            self.acknowledged += len(receipts)
            if self.acknowledged >= self.count:
                self.ended = time.perf_counter()
                self.done.set()

        self._link.acknowledge = counted  # type: ignore[method-assign]  # this is a measuring device

    def _take(self, now: int, came: Sequence[Incoming]) -> None:
        if not self.began:
            self.began = time.perf_counter()
        super()._take(now, came)


def main() -> None:
    """Run until all has come and is durable."""
    port, count, tanks = (int(word) for word in sys.argv[1:4])
    with tempfile.TemporaryDirectory() as folder:
        site = site_of(tanks, port, Path(folder))
        options = link_options(site, Plant(plant_plan(site)).topics)
        service = Measured(site, options, Clock(), logging.getLogger("bench"), _say_ready)
        service.expect(count)
        control = threading.Thread(target=service.run)
        control.start()
        service.done.wait(120)
        took = service.ended - service.began
        print(took if service.done.is_set() else f"only {service.acknowledged} came", flush=True)
        service.stop()
        control.join()


def _say_ready(event: object, _: object) -> None:
    if getattr(event, "happening", None) is Happening.PROVEN:
        print("ready", flush=True)


if __name__ == "__main__":
    main()
