"""A broker inside this process, for trials and the demo: no installation, live data only.

It speaks MQTT 3.1.1, keeps nothing when it ends, and its sessions do not survive a lost connection; a real plant
needs a real broker. The library behind it comes with the extra `demo` and is imported only when a broker is started.
"""

import asyncio
import logging
import socket
import threading
from typing import Any

from gateway.errors import BrokerError

START_WITHIN_S = 10.0
"""Longer than any start that is going to succeed: it takes some 0.2 s on a small machine."""

STOP_WITHIN_S = 5.0
"""Longer than closing a few local connections takes."""


class EmbeddedBroker:
    """A broker on 127.0.0.1, in a daemon thread. `port` is valid once `start` has returned."""

    def __init__(self) -> None:
        self.port = 0
        self._ready = threading.Event()
        self._failure = ""
        self._loop: asyncio.AbstractEventLoop | None = None
        self._stop: asyncio.Event | None = None
        self._thread = threading.Thread(target=self._run, name="embedded broker", daemon=True)

    def start(self) -> int:
        """Start, and return the port. Raises BrokerError, with what to do."""
        self._thread.start()
        if not self._ready.wait(START_WITHIN_S):
            raise BrokerError(f"the embedded broker has not started within {START_WITHIN_S:g} s")
        if self._failure:
            raise BrokerError(self._failure)
        return self.port

    def stop(self) -> None:
        """Close all connections and end the thread."""
        if self._loop and self._stop and self._loop.is_running():
            self._loop.call_soon_threadsafe(self._stop.set)
        self._thread.join(STOP_WITHIN_S)

    def _run(self) -> None:
        try:
            asyncio.run(self._serve())
        except ImportError as error:
            self._failure = f"the embedded broker needs the extra 'demo': pip install 'brimward[demo]' ({error})"
        except Exception as error:  # noqa: BLE001 - whatever it is, the one who waits for the start must hear of it
            self._failure = f"the embedded broker has failed: {type(error).__name__}: {error}"
        finally:
            self._ready.set()

    async def _serve(self) -> None:
        for name in ("amqtt", "transitions"):  # they tell every step of every session, and tracebacks of port probes
            logging.getLogger(name).setLevel(logging.ERROR)
        from amqtt.broker import Broker  # noqa: PLC0415 - see the top: only when asked for

        self._loop = asyncio.get_running_loop()
        self._stop = asyncio.Event()
        self.port = _free_port()
        broker = Broker(_configuration(self.port))
        await broker.start()
        self._ready.set()
        await self._stop.wait()
        await broker.shutdown()


def _free_port() -> int:
    """Find a port that is free now. The library does not tell which one it got when asked for any."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def _configuration(port: int) -> dict[str, Any]:
    """One listener, no password, and none of the plugins that log packets or publish statistics."""
    return {
        "listeners": {"default": {"type": "tcp", "bind": f"127.0.0.1:{port}", "max_connections": 200}},
        "plugins": {"amqtt.plugins.authentication.AnonymousAuthPlugin": {"allow_anonymous": True}},
    }
