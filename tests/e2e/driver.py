"""What the end-to-end tests share: an example site on a broker, the gateway as a child, an ear on everything."""

import contextlib
import os
import shutil
import signal
import socket
import subprocess
import sys
import threading
from collections.abc import Iterator
from pathlib import Path
from types import TracebackType
from typing import Any, NamedTuple, Self

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion

from gateway.testing import eventually

EXAMPLES = Path(__file__).parents[2] / "config_examples"


def site_on(port: int, folder: Path, example: str = "hill-dairy") -> Path:
    """Copy an example into `folder`, for a broker on `port`."""
    site = folder / example
    shutil.copytree(EXAMPLES / example, site, ignore=shutil.ignore_patterns("var"))
    file = site / "site.yaml"
    file.write_text(file.read_text("utf-8").replace(":1883", f":{port}"), "utf-8")
    return site


def brimward(*words: str | Path) -> subprocess.CompletedProcess[str]:
    """Run a command as a user would, and return what it printed."""
    return subprocess.run(_command(*words), capture_output=True, text=True, timeout=120, check=False)


def _command(*words: str | Path) -> list[str]:
    return [sys.executable, "-c", "from gateway.cli import main; main()", *(str(word) for word in words)]


class Heard(NamedTuple):
    """A message that the ear heard."""

    topic: str
    payload: str
    retained: bool


def _hurry(_: paho.Client, __: object, sock: Any) -> None:
    """Have small packets leave at once."""
    sock.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)


class Ear:
    """A client that hears everything and can publish; QoS 1 both ways."""

    def __init__(self, port: int) -> None:
        self.heard: list[Heard] = []
        self._ready = threading.Event()
        self._client = paho.Client(CallbackAPIVersion.VERSION2)
        self._client.max_inflight_messages_set(1000)
        self._client.on_socket_open = _hurry
        self._client.on_connect = lambda one, *_: one.subscribe("#", 1)
        self._client.on_subscribe = lambda *_: self._ready.set()
        self._client.on_message = self._on_message
        self._client.connect("127.0.0.1", port)
        self._client.loop_start()

    def __enter__(self) -> Self:
        assert self._ready.wait(20)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._client.disconnect()
        self._client.loop_stop()

    def _on_message(self, _: paho.Client, __: object, message: paho.MQTTMessage) -> None:
        self.heard.append(Heard(message.topic, message.payload.decode("utf-8", "replace"), bool(message.retain)))

    def say(self, topic: str, payload: str | bytes, *, retain: bool = False) -> paho.MQTTMessageInfo:
        """Publish at QoS 1."""
        return self._client.publish(topic, payload, qos=1, retain=retain)

    def on(self, topic: str) -> list[str]:
        """Return the payloads heard on a topic, oldest first."""
        return [one.payload for one in list(self.heard) if one.topic == topic]


class GatewayProcess:
    """`brimward run` as a child. Its log is in the site's folder."""

    def __init__(self, site: Path) -> None:
        self.site = site
        self._process: subprocess.Popen[bytes] | None = None

    def start(self) -> None:
        """Start, without waiting for anything."""
        with (self.site / "log").open("ab") as log:
            self._process = subprocess.Popen(_command("run", self.site, "-v"), stdout=log, stderr=log)

    @property
    def alive(self) -> bool:
        """Whether it still runs."""
        return self._process is not None and self._process.poll() is None

    @property
    def log(self) -> str:
        """What it has said so far."""
        return (self.site / "log").read_text("utf-8", "replace")

    def times_proven(self) -> int:
        """Return how often the link has proved itself, over all starts."""
        return self.log.count("link proven")

    def start_and_prove(self) -> None:
        """Start, and wait until the link is proven."""
        before = self.times_proven() if (self.site / "log").exists() else 0
        self.start()
        assert eventually(lambda: self.times_proven() > before, within_s=30), self.log

    def end(self, number: signal.Signals = signal.SIGTERM) -> None:
        """End it and wait."""
        if self._process is not None:
            with contextlib.suppress(ProcessLookupError):
                os.kill(self._process.pid, number)
            self._process.wait(30)
            self._process = None


@contextlib.contextmanager
def running(site: Path) -> Iterator[GatewayProcess]:
    """Run the gateway for the length of a block, its link proven."""
    gateway = GatewayProcess(site)
    try:
        gateway.start_and_prove()
        yield gateway
    finally:
        gateway.end()
