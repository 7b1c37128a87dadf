"""A simulated site on a real broker: its water, its devices and their connection, in a thread of its own."""

import threading
from collections.abc import Callable
from typing import Final

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion

from gateway.clock import Clock
from gateway.plan import PlantPlan
from gateway.settings.models import Site
from gateway.settings.names import full, parts
from gateway.simulate.dairy import FLOWS, INCIDENTS, START_LEVELS
from gateway.simulate.devices import Device, Relays
from gateway.simulate.water import Basin, Water

STEP_S: Final = 1.0  # of plant time: well below the shortest delay of the rules


class SimulatedSite:
    """The hill dairy. `tell` is called with a sentence for each incident, in the simulation's thread."""

    def __init__(self, site: Site, plan: PlantPlan, port: int, clock: Clock, tell: Callable[[str], None]) -> None:
        self.clock = clock
        self.relays = Relays(plan)
        self.sent = 0
        self._tell = tell
        self._devices = _devices(site, plan)
        self.water = Water(_basins(plan), FLOWS)
        self._stopping = threading.Event()
        self._client = paho.Client(CallbackAPIVersion.VERSION2, client_id="devices")
        self._client.on_connect = self._on_connect
        self._client.on_message = self._on_message
        self._client.connect("127.0.0.1", port)
        self._thread = threading.Thread(target=self._run, name="simulation", daemon=True)

    def start(self) -> None:
        """Let the water flow."""
        self._client.loop_start()
        self._thread.start()

    def stop(self) -> None:
        """Stop the water and end the connection."""
        self._stopping.set()
        self._thread.join()
        self._client.disconnect()
        self._client.loop_stop()

    def _on_connect(self, client: paho.Client, *_: object) -> None:
        client.subscribe([(topic, 1) for topic in self.relays.topics])

    def _on_message(self, _: paho.Client, __: object, message: paho.MQTTMessage) -> None:
        self.relays.obey(message.topic, message.payload.decode("utf-8", "replace"))

    def _run(self) -> None:
        began = self.clock.now()
        incidents = list(INCIDENTS)
        step = 0
        while not self._stopping.wait(self.clock.seconds_until(began + round(step * STEP_S * 1e9))):
            t = step * STEP_S
            while incidents and incidents[0].t <= t:
                incident = incidents.pop(0)
                incident.happen(self._devices)
                self._tell(incident.sentence)
            self.water.step(t, STEP_S, self.relays.states)
            self._speak(t)
            step += 1

    def _speak(self, t: float) -> None:
        for name, device in self._devices.items():
            level = self.water.basins[name.partition(".")[0]].level
            for topic, payload, retain in device.speak(t, level):
                self._client.publish(topic, payload, qos=1, retain=retain)
                self.sent += 1


def _devices(site: Site, plan: PlantPlan) -> dict[str, Device]:
    declared = {full(tank, name): sensor for tank, part in parts(site) for name, sensor in part.sensors.items()}
    return {
        one.name: Device(one, (declared[one.name].expect_every or 0) / 1e9, declared[one.name].mounted_at or 0.0)
        for one in plan.sensors
    }


def _basins(plan: PlantPlan) -> dict[str, Basin]:
    return {
        tank.name: Basin(tank.shape, tank.brim, START_LEVELS[tank.name])
        for tank in plan.tanks
        if tank.shape is not None and tank.brim is not None
    }
