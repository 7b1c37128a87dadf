"""Fakes and peers for tests: brokers that can be frozen, connections that can be swallowed, servers that say nothing.

Everything listens on 127.0.0.1, on a free port, and ends with its `with` block.
"""

import contextlib
import os
import shutil
import signal
import socket
import subprocess
import tempfile
import threading
import time
from collections.abc import Callable, Mapping
from pathlib import Path
from types import TracebackType
from typing import Self

LOCAL = "127.0.0.1"


def free_port() -> int:
    """Find a TCP port that is free now."""
    with socket.socket() as probe:
        probe.bind((LOCAL, 0))
        return int(probe.getsockname()[1])


def eventually(true: Callable[[], object], within_s: float = 20.0, every_s: float = 0.01) -> bool:
    """Wait until `true()` is; False when it has not become so in time. Never judge anything by the time it took."""
    until = time.monotonic() + within_s
    while not true():
        if time.monotonic() > until:
            return False
        time.sleep(every_s)
    return True


def mosquitto_here() -> bool:
    """Whether the broker mosquitto is on this machine."""
    return shutil.which("mosquitto") is not None


class Mosquitto:
    """A mosquitto of our own, with unlimited queues. It can be frozen, killed, and started again on the same port.

    `settings` are further lines of its configuration, by key. With `keep` sessions survive a restart.
    """

    def __init__(
        self, settings: Mapping[str, object] | None = None, *, port: int | None = None, keep: bool = False
    ) -> None:
        self.port = port or free_port()
        self._settings = dict(settings or {})
        self._keep = keep
        self._folder = tempfile.TemporaryDirectory(prefix="broker-", ignore_cleanup_errors=True)
        self._process: subprocess.Popen[bytes] | None = None

    def __enter__(self) -> Self:
        self.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.stop()
        self._folder.cleanup()

    @property
    def log(self) -> str:
        """What it has said so far."""
        return (Path(self._folder.name) / "log").read_text("utf-8", "replace")

    def start(self) -> None:
        """Start, and wait until it answers. Raises TimeoutError with its log."""
        folder = Path(self._folder.name)
        configuration = folder / "broker.conf"
        configuration.write_text(self._configuration(), "utf-8")
        with (folder / "log").open("ab") as log:
            self._process = subprocess.Popen(
                ["mosquitto", "-c", str(configuration)],  # noqa: S607 - whichever is first on PATH
                stdout=log,
                stderr=log,
            )
        if not eventually(self._answers):
            self.kill()
            raise TimeoutError(f"mosquitto has not started:\n{self.log}")

    def stop(self) -> None:
        """End it in order; what it keeps is on disk then."""
        self._end(signal.SIGTERM)

    def kill(self) -> None:
        """End it as a power cut does."""
        self._end(signal.SIGKILL)

    def freeze(self) -> None:
        """Stop it in its tracks; its sockets stay open."""
        self._signal(signal.SIGSTOP)

    def thaw(self) -> None:
        """Let it go on."""
        self._signal(signal.SIGCONT)

    def _configuration(self) -> str:
        lines = {
            "listener": f"{self.port} {LOCAL}",
            "allow_anonymous": "true",
            "max_inflight_messages": 0,
            "max_queued_messages": 0,
            "set_tcp_nodelay": "true",
            "persistence": "true" if self._keep else "false",
            "persistence_location": f"{self._folder.name}/",
        }
        if os.geteuid() == 0:
            lines["user"] = "root"  # or it changes to a user that may not write into our folder
        lines |= {key: value for key, value in self._settings.items() if isinstance(value, (str, int))}
        first = f"listener {lines.pop('listener')}\n"  # what follows belongs to it
        return first + "".join(f"{key} {value}\n" for key, value in lines.items())

    def _answers(self) -> bool:
        if self._process and self._process.poll() is not None:
            raise TimeoutError(f"mosquitto has ended at once:\n{self.log}")
        with contextlib.suppress(OSError), socket.create_connection((LOCAL, self.port), timeout=1):
            return True
        return False

    def _signal(self, number: signal.Signals) -> None:
        if self._process and self._process.poll() is None:
            self._process.send_signal(number)

    def _end(self, number: signal.Signals) -> None:
        if self._process:
            self.thaw()
            self._signal(number)
            self._process.wait(timeout=10)
            self._process = None


class Server:
    """Accepts connections in a daemon thread and hands each to `meet`."""

    def __init__(self) -> None:
        self._listener = socket.create_server((LOCAL, 0))
        self.port = int(self._listener.getsockname()[1])
        self.accepted = 0
        self._open: list[socket.socket] = []
        threading.Thread(target=self._accept, daemon=True).start()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        with contextlib.suppress(OSError):
            self._listener.shutdown(socket.SHUT_RDWR)  # wakes the thread that accepts
        self._listener.close()
        self.drop()

    def drop(self) -> None:
        """Close all connections."""
        for sock in self._open:
            with contextlib.suppress(OSError):
                sock.shutdown(socket.SHUT_RDWR)  # wakes threads that read from it
            sock.close()
        self._open.clear()

    def meet(self, sock: socket.socket) -> None:
        """Deal with a new connection."""
        raise NotImplementedError

    def _accept(self) -> None:
        while True:
            try:
                sock, _ = self._listener.accept()
            except OSError:
                return
            self.accepted += 1
            self._open.append(sock)
            threading.Thread(target=self.meet, args=(sock,), daemon=True).start()


class MuteServer(Server):
    """Accepts, and never says a word."""

    def meet(self, sock: socket.socket) -> None:
        """Leave it open."""


class RudeServer(Server):
    """Waits for the first words, says `answer`, and closes."""

    def __init__(self, answer: bytes = b"") -> None:
        self._answer = answer
        super().__init__()

    def meet(self, sock: socket.socket) -> None:
        """Answer the first words and close."""
        with contextlib.suppress(OSError):
            sock.recv(4096)
            sock.sendall(self._answer)
            sock.shutdown(socket.SHUT_RDWR)


class Proxy(Server):
    """Passes bytes on to `port`, both ways, until told to `stall`: then it swallows nothing and passes nothing on."""

    def __init__(self, port: int) -> None:
        self._target = port
        self._flowing = threading.Event()
        self._flowing.set()
        super().__init__()

    def stall(self) -> None:
        """Pass nothing on; the connections stay open."""
        self._flowing.clear()

    def flow(self) -> None:
        """Pass on again, first of all what has waited."""
        self._flowing.set()

    def meet(self, sock: socket.socket) -> None:
        """Connect the two sides."""
        try:
            other = socket.create_connection((LOCAL, self._target), timeout=10)
        except OSError:
            sock.close()
            return
        other.settimeout(None)
        self._open.append(other)
        threading.Thread(target=self._pass_on, args=(other, sock), daemon=True).start()
        self._pass_on(sock, other)

    def _pass_on(self, source: socket.socket, sink: socket.socket) -> None:
        try:
            while piece := source.recv(65_536):
                self._flowing.wait()
                sink.sendall(piece)
        except OSError:
            pass
        with contextlib.suppress(OSError):
            sink.shutdown(socket.SHUT_RDWR)
