"""The stream between the client library and the network: nothing waits, nothing is torn, nothing is left unseen."""

import socket
import ssl
import threading
from collections.abc import Iterator
from pathlib import Path

import pytest

from gateway.link.options import Tls
from gateway.link.packets import Splitter
from gateway.link.stream import UNSENT_MOST, Stream, wrapping
from gateway.testing import eventually

trustme = pytest.importorskip("trustme", reason="makes the certificates of this test")

ONE = b"\x32\x06\x00\x01a\x00\x05x"  # PUBLISH to `a`, identifier 5, payload `x`
PINGRESP = b"\xd0\x00"


@pytest.fixture
def pair() -> Iterator[tuple[Stream, socket.socket]]:
    """Make a non-blocking stream, and the socket at its other side."""
    ours, theirs = socket.socketpair()
    ours.setblocking(False)
    with ours, theirs:
        yield Stream(ours, Splitter(v5=False, topics={})), theirs


def send_until_refused(stream: Stream, packet: bytes) -> int:
    """Send packets until one is refused; returns how many bytes were taken."""
    for count in range(10_000):
        try:
            stream.send(packet)
        except BlockingIOError:
            return count * len(packet)
        stream.flush()
    raise AssertionError("it never refuses")


def test_messages_go_to_the_inbox_and_the_rest_to_the_library(pair: tuple[Stream, socket.socket]) -> None:
    """The library never sees a message, and never half a packet."""
    stream, other = pair
    other.sendall(ONE + PINGRESP + ONE + PINGRESP[:1])
    assert stream.fill()
    assert stream.inbox == [("a", b"x", False, 5)] * 2
    assert stream.recv(1) + stream.recv(9) == PINGRESP
    assert not stream.waiting
    with pytest.raises(BlockingIOError):
        stream.recv(1)


def test_nothing_there_is_no_end(pair: tuple[Stream, socket.socket]) -> None:
    """Reading when nothing has come says so and changes nothing."""
    stream, _ = pair
    assert not stream.fill()
    assert not stream.ended


def test_the_end_and_a_breach_say_why(pair: tuple[Stream, socket.socket]) -> None:
    """What came before a breach is kept; the reason is in words."""
    stream, other = pair
    other.sendall(ONE + b"\x30\x00")
    stream.fill()
    assert stream.inbox == [("a", b"x", False, 5)]
    assert "not MQTT" in stream.ended


def test_a_closed_peer_is_told(pair: tuple[Stream, socket.socket]) -> None:
    """The end of the stream is an end with its reason."""
    stream, other = pair
    other.close()
    assert not stream.fill()
    assert stream.ended == "the broker closed the connection"


def test_a_peer_that_reads_nothing_makes_nobody_wait(pair: tuple[Stream, socket.socket]) -> None:
    """Packets are taken whole up to a bound, then refused whole as by a full socket; none is torn."""
    stream, other = pair
    packet = b"p" * 10_000
    taken = send_until_refused(stream, packet)
    assert stream.unsent
    assert taken > UNSENT_MOST
    assert taken % len(packet) == 0
    got = bytearray()
    while len(got) < taken:
        got += other.recv(65_536)
        stream.flush()
    assert got == b"p" * taken
    assert stream.send(packet) == len(packet)


def test_leaving_in_order_delivers_the_last_words_despite_unread_input(pair: tuple[Stream, socket.socket]) -> None:
    """Input that nobody will read does not destroy what was sent last."""
    stream, other = pair
    other.sendall(ONE * 100)
    stream.put(b"farewell")
    stream.linger_s = 5.0
    heard: list[bytes] = []

    def listen() -> None:
        while piece := other.recv(100):
            heard.append(piece)
        other.close()

    listener = threading.Thread(target=listen)
    listener.start()
    stream.close()
    listener.join()
    assert b"".join(heard) == b"farewell"
    stream.close()  # again: nothing happens


def test_messages_in_one_encrypted_record_are_all_seen(tmp_path: Path) -> None:
    """Thirty messages in one TLS record, of which select shows nothing more after the first read, all arrive."""
    authority = trustme.CA()
    authority.cert_pem.write_to_path(tmp_path / "ca.pem")
    context = ssl.SSLContext(ssl.PROTOCOL_TLS_SERVER)
    authority.issue_cert("localhost").configure_cert(context)
    ours, theirs = socket.socketpair()

    def serve() -> None:
        with context.wrap_socket(theirs, server_side=True) as peer:
            peer.sendall(ONE * 30 + PINGRESP)
            peer.sendall(ONE * 3000)  # several records
            peer.recv(1)

    server = threading.Thread(target=serve)
    server.start()
    wrap = wrapping(Tls(ca=tmp_path / "ca.pem"), v5=False, topics={})
    with wrap.wrap_socket(ours, server_hostname="localhost", do_handshake_on_connect=False)._sock as sock:
        stream = wrap.stream
        assert stream is not None
        stream.do_handshake()
        stream.setblocking(False)
        assert eventually(stream.fill)
        while stream.buffered():
            stream.fill()
        assert len(stream.inbox) >= 30
        assert stream.waiting
        assert eventually(lambda: stream.fill() or len(stream.inbox) == 3030)
        assert eventually(lambda: not stream.fill() and len(stream.inbox) == 3030)
        stream.send(b"!")
        stream.flush()
        server.join()
        assert sock.fileno() >= 0


def test_a_missing_authority_is_an_error_of_the_files(tmp_path: Path) -> None:
    """A file that is not there is reported as such, before anything is dialed."""
    with pytest.raises(OSError, match="No such file"):
        wrapping(Tls(ca=tmp_path / "none.pem"), v5=False, topics={})
