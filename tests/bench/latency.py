"""From a reading's publication to its command's arrival, at 500 readings a second: the gateway against a bare echo.

The echo client answers from the library's own callback, as fast as anything written with that library can. Every tenth
reading crosses a threshold and so causes a command, or an answer. Ratios of the 99th percentile, several rounds in one
run. Run: `python tests/bench/latency.py [READINGS] [ROUNDS]`; with `echo PORT` or `gateway PORT` it is one side.
"""

import logging
import math
import socket
import statistics
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path
from typing import Any

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion

from gateway.clock import Clock
from gateway.connect import link_options
from gateway.link.messages import Happening
from gateway.plant import Plant
from gateway.service import Service
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts
from gateway.testing import Mosquitto

RATE = 500.0  # readings a second
BLOCK = 10  # readings on one side of the threshold before the next cross it

TANK = """
tank: tank
sensors:
  probe: {topic: bench/level, field: /m, senses: level, unit: m, expect_every: 5 s}
level: probe
actuators:
  pump: {command: {topic: bench/answer}, safe: off}
rules:
  pump down: {demand: pump on, from: level above 1 m, until: level below 1 m}
"""


def hurried() -> paho.Client:
    """Return a client whose small packets leave at once."""
    client = paho.Client(CallbackAPIVersion.VERSION2)

    def hurry(_: paho.Client, __: object, sock: Any) -> None:
        sock.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)

    client.on_socket_open = hurry
    return client


def echo(port: int) -> None:
    """Answer whenever the level crosses a metre."""
    above = [False]

    def on_message(client: paho.Client, _: object, message: paho.MQTTMessage) -> None:
        now = float(message.payload[6:-1]) > 1
        if now != above[0]:
            above[0] = now
            client.publish("bench/answer", b"on" if now else b"off", qos=1)

    client = hurried()
    client.on_connect = lambda one, *_: one.subscribe("bench/level", 1)
    client.on_subscribe = lambda *_: print("ready", flush=True)
    client.on_message = on_message
    client.connect("127.0.0.1", port)
    client.loop_start()
    sys.stdin.read()


def gateway(port: int) -> None:
    """Be the gateway."""
    with tempfile.TemporaryDirectory() as folder:
        texts = {"site.yaml": f"site: bench\nbroker: {{url: 'mqtt://127.0.0.1:{port}'}}\n", "tanks/tank.yaml": TANK}
        site = load_texts(texts, Path(folder))

        def listener(event: object, _: object) -> None:
            if getattr(event, "happening", None) is Happening.PROVEN:
                print("ready", flush=True)

        options = link_options(site, Plant(plant_plan(site)).topics)
        service = Service(site, options, Clock(), logging.getLogger("bench"), listener)
        control = threading.Thread(target=service.run)
        control.start()
        sys.stdin.read()
        service.stop()
        control.join()


def percentile(values: list[float], share: float) -> float:
    """Return the value below which `share` of the values lie (nearest rank)."""
    return sorted(values)[max(0, math.ceil(share * len(values)) - 1)]


def answers(port: int, readings: int) -> list[float]:
    """Publish readings at the rate and return the seconds from each crossing to its answer."""
    sent: list[float] = []
    arrived: list[float] = []
    ready = threading.Event()
    client = hurried()
    client.on_connect = lambda one, *_: one.subscribe("bench/answer", 1)
    client.on_subscribe = lambda *_: ready.set()
    client.on_message = lambda *_: arrived.append(time.perf_counter())
    client.connect("127.0.0.1", port)
    client.loop_start()
    ready.wait(10)
    client.publish("bench/level", b'{"m": 0.5}', qos=1)
    time.sleep(0.5)  # the gateway says `off` once, knowing the level for the first time
    arrived.clear()
    began = time.perf_counter()
    for number in range(readings):
        time.sleep(max(0.0, began + number / RATE - time.perf_counter()))
        above = number // BLOCK % 2 == 0
        if number % BLOCK == 0:
            sent.append(time.perf_counter())
        client.publish("bench/level", b'{"m": 1.%d}' % (1 + number % 9) if above else b'{"m": 0.5}', qos=1)
    time.sleep(1)
    client.disconnect()
    client.loop_stop()
    if len(arrived) != len(sent):
        raise SystemExit(f"{len(sent)} crossings, {len(arrived)} answers")
    return [answer - question for question, answer in zip(sent, arrived, strict=True)]


def measured(side: str, readings: int) -> list[float]:
    """Return the answer times of one side, on a broker of its own."""
    with Mosquitto() as broker:
        command = [sys.executable, __file__, side, str(broker.port)]
        with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as child:
            assert child.stdout is not None
            assert child.stdout.readline().strip() == "ready"
            took = answers(broker.port, readings)
            child.communicate("")
            return took


def main() -> None:
    """Measure in turn and print."""
    readings = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    times = int(sys.argv[2]) if len(sys.argv) > 2 else 3
    rounds = [(measured("echo", readings), measured("gateway", readings)) for _ in range(times)]
    for name, side in (("echo", 0), ("gateway", 1)):
        middle = statistics.median(statistics.median(one[side]) for one in rounds)
        high = statistics.median(percentile(one[side], 0.99) for one in rounds)
        print(f"{name:8} median {middle * 1e3:.2f} ms, 99th percentile {high * 1e3:.2f} ms")
    ratios = [percentile(ours, 0.99) / percentile(bare, 0.99) for bare, ours in rounds]
    print(f"99th percentile, gateway against echo: {statistics.median(ratios):.2f}")


if __name__ == "__main__":
    if sys.argv[1:2] in (["echo"], ["gateway"]):
        {"echo": echo, "gateway": gateway}[sys.argv[1]](int(sys.argv[2]))
    else:
        main()
