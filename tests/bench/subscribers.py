"""What the gateway is measured against: a bare subscriber that only counts, and the script that people write by hand.

Run as a program: `subscribers.py bare|script PORT COUNT`. Prints the seconds from the first message to the last that is
dealt with.
"""

import json
import sqlite3
import sys
import tempfile
import threading
import time
from pathlib import Path

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion


class _Timed:
    """Counts messages and takes the time between the first and the last."""

    def __init__(self, count: int) -> None:
        self.count = count
        self.seen = 0
        self.began = self.ended = 0.0
        self.done = threading.Event()

    def one(self) -> None:
        if self.seen == 0:
            self.began = time.perf_counter()
        self.seen += 1
        if self.seen == self.count:
            self.ended = time.perf_counter()
            self.done.set()


def _listen(port: int, timed: _Timed, on_message: paho.CallbackOnMessage) -> None:
    client = paho.Client(CallbackAPIVersion.VERSION2, client_id="bench")
    client.on_connect = lambda one, *_: one.subscribe("bench/#", 1)
    client.on_subscribe = lambda *_: print("ready", flush=True)
    client.on_message = on_message
    client.connect("127.0.0.1", port)
    client.loop_start()
    timed.done.wait(120)
    client.disconnect()
    client.loop_stop()
    print(timed.ended - timed.began if timed.done.is_set() else f"only {timed.seen} came", flush=True)


def bare(port: int, count: int) -> None:
    """Count, on the library's own thread, and nothing else."""
    timed = _Timed(count)
    _listen(port, timed, lambda *_: timed.one())


def script(port: int, count: int) -> None:
    """Decode, compare with a threshold, insert into SQLite, each reading in a transaction of its own."""
    timed = _Timed(count)
    with tempfile.TemporaryDirectory() as folder:
        database = sqlite3.connect(Path(folder) / "readings.db", isolation_level=None, check_same_thread=False)
        database.execute("PRAGMA journal_mode = WAL")
        database.execute("PRAGMA synchronous = FULL")
        database.execute("CREATE TABLE reading (at REAL, topic TEXT, hz REAL)")
        pump = [False]

        def on_message(_: paho.Client, __: object, message: paho.MQTTMessage) -> None:
            hertz = json.loads(message.payload)["hz"]
            pump[0] = hertz < 3_000
            database.execute("INSERT INTO reading VALUES (?, ?, ?)", (time.time(), message.topic, hertz))
            timed.one()

        _listen(port, timed, on_message)
        database.close()


if __name__ == "__main__":
    {"bare": bare, "script": script}[sys.argv[1]](int(sys.argv[2]), int(sys.argv[3]))
