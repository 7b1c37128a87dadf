"""The socket that the client library is given: it collects in large pieces what would go in small ones.

The library lets its user bring the TLS context (`Client.tls_set_context`) and uses whatever the context's
`wrap_socket` returns. `Wrapping` is a context that returns a `Stream`, over an encrypted or a plain socket alike. So
the stream stands between the library and the network, and no private part of either is touched.

- Arriving bytes are read in one system call. Messages are cut out (see `packets`) and kept in `inbox`; the library
  sees the rest, whole packets only.
- Leaving bytes are collected, whole packets only, and sent in one system call by `flush`.

Once made non-blocking, nothing here waits. One thread at a time.
"""

import contextlib
import select
import socket
import ssl
import struct
import time
from collections.abc import Mapping
from typing import Any

from gateway.link.options import Tls
from gateway.link.packets import BreachError, Published, Splitter

READ_SIZE = 1 << 16
"""Bytes asked of the socket at once: some 800 small messages, about two milliseconds of work."""

UNSENT_MOST = 1 << 20
"""Bytes that may wait to be sent. Above it the library is told to wait, as by a full socket."""


class Stream:
    """A socket for the library (`recv`, `send`, `close`, …) and a mailbox for us."""

    def __init__(self, sock: socket.socket, splitter: Splitter) -> None:
        self._sock = sock
        self._splitter = splitter
        self._unsent = bytearray()
        self.ended = ""  # why nothing more will come; empty while it may
        self.linger_s = 0.0  # how long `close` may wait for the last bytes to leave

    # ---- for us

    @property
    def inbox(self) -> list[Published]:
        """Messages that have arrived. The reader takes them off the front."""
        return self._splitter.published

    @property
    def waiting(self) -> bool:
        """Whether whole packets wait for the library to read."""
        return bool(self._splitter.rest)

    @property
    def unsent(self) -> bool:
        """Whether bytes wait for the socket to take them."""
        return bool(self._unsent)

    def buffered(self) -> bool:
        """Whether the encryption layer holds bytes that `select` cannot see."""
        return isinstance(self._sock, ssl.SSLSocket) and self._sock.pending() > 0

    def fill(self) -> bool:
        """Read once what has arrived. True: something has."""
        try:
            chunk = self._sock.recv(READ_SIZE)
            self._splitter.feed(chunk)
        except (BlockingIOError, ssl.SSLWantReadError, ssl.SSLWantWriteError):
            return False
        except OSError as error:
            self.ended = f"the connection broke: {error.strerror or error}"
            return False
        except BreachError as breach:
            self.ended = f"the broker sent what is not MQTT: {breach}"
            return False
        if not chunk:
            self.ended = "the broker closed the connection"
        return bool(chunk)

    def put(self, packets: bytes) -> None:
        """Add whole packets to what is to be sent."""
        self._unsent += packets

    def flush(self) -> None:
        """Send what the socket takes at once."""
        if not self._unsent:
            return
        try:
            sent = self._sock.send(self._unsent)
            del self._unsent[:sent]
        except (BlockingIOError, ssl.SSLWantReadError, ssl.SSLWantWriteError):
            pass
        except OSError as error:
            self.ended = f"the connection broke: {error.strerror or error}"

    # ---- for the library

    def recv(self, size: int) -> bytes:
        """Give the library of what waits for it; what there is of messages it never sees."""
        rest = self._splitter.rest
        if not rest:
            raise BlockingIOError
        piece = bytes(rest[:size])
        del rest[:size]
        return piece

    def send(self, packet: bytes) -> int:
        """Take a packet from the library whole, or not at all when too much is waiting."""
        if len(self._unsent) > UNSENT_MOST:
            raise BlockingIOError
        self._unsent += packet
        return len(packet)

    def fileno(self) -> int:
        """Descriptor to wait on."""
        return self._sock.fileno()

    def setblocking(self, flag: bool) -> None:  # noqa: FBT001 - the library calls it like a socket's
        """As a socket's."""
        self._sock.setblocking(flag)

    def settimeout(self, value: float | None) -> None:
        """As a socket's."""
        self._sock.settimeout(value)

    def do_handshake(self) -> None:
        """As an encrypted socket's; a plain one has none to do."""
        if isinstance(self._sock, ssl.SSLSocket):
            self._sock.do_handshake()

    def close(self) -> None:
        """Close; with `linger_s`, first let the last bytes arrive at the other side, but no longer than that."""
        if self.linger_s and self._sock.fileno() >= 0:
            self._linger(time.monotonic() + self.linger_s)
        self._sock.close()

    def abort(self) -> None:
        """Close by a reset: what the other side has not read yet shall not be acted on later."""
        with contextlib.suppress(OSError):  # closed already, or a kind of socket that knows no reset
            self._sock.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, struct.pack("ii", 1, 0))
        self._sock.close()

    def _linger(self, until: float) -> None:
        """Send what is unsent, say that no more will come, and read until the other side has closed too.

        Closing with unread input makes the kernel reset the connection, which can destroy what was sent last.
        """
        while self._unsent and not self.ended and _ready(self._sock, select.POLLOUT, until):
            self.flush()
        if not isinstance(self._sock, ssl.SSLSocket):
            with contextlib.suppress(OSError):  # the other side was faster
                self._sock.shutdown(socket.SHUT_WR)
        while not self.ended and _ready(self._sock, select.POLLIN, until):
            self._splitter.published.clear()
            self.fill()


def _ready(sock: socket.socket, what: int, until: float) -> bool:
    """Wait until the socket is ready; False: time is up."""
    poll = select.poll()
    poll.register(sock, what)
    return bool(poll.poll(max(0.0, until - time.monotonic()) * 1000))


class Wrapping(ssl.SSLContext):
    """A context whose sockets are streams: encrypted as `tls` says, or plain when it is None.

    Make one with `wrapping`. `stream` is the last one that was made.
    """

    encrypt: bool
    splitter: Splitter
    stream: Stream | None

    def wrap_socket(self, sock: socket.socket, *args: Any, **kwargs: Any) -> Stream:  # type: ignore[override]
        # (the library asks of it what `Stream` offers, and no more)
        """Make the stream. Raises ssl.SSLError when encryption cannot be set up."""
        if sock.family != socket.AF_UNIX:
            sock.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)  # a command must not wait for company
        inner = super().wrap_socket(sock, *args, **kwargs) if self.encrypt else sock
        self.stream = Stream(inner, self.splitter)
        return self.stream


def wrapping(tls: Tls | None, *, v5: bool, topics: Mapping[bytes, str]) -> Wrapping:
    """Make a context for one connection. Raises OSError when a file of `tls` cannot be read or used."""
    context = Wrapping(ssl.PROTOCOL_TLS_CLIENT)  # checks the certificate and its host name
    context.encrypt = tls is not None
    context.splitter = Splitter(v5=v5, topics=topics)
    context.stream = None
    if tls is None:
        return context
    if tls.ca:
        context.load_verify_locations(tls.ca)
    else:
        context.load_default_certs()
    if tls.certificate:
        context.load_cert_chain(tls.certificate, tls.key)
    return context
