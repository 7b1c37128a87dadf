"""Making connections: which protocol is spoken with whom, and in which words a refusal is told.

What a broker without MQTT 5 may do to a CONNECT in 5 follows MQTT 3.1.1 section 3.1.2.2 (code 1, or close), MQTT 5.0
section 4.13 (reason 0x84), and what was seen of small devices: nothing at all.
"""

import contextlib
import socket
from pathlib import Path

import pytest
import trustme

from gateway.link.dialer import Dialed, Memory, Outcome, Refused, dial
from gateway.link.options import LinkOptions, Patience, Protocol, Tls, Transport
from gateway.testing import Mosquitto, MuteServer, RudeServer, Server, free_port

SOON = 300_000_000  # ns; what a peer that says nothing is given
QUICK = Patience(connect_within=5_000_000_000, connack_within=SOON)
TAKEN_IN = b"\x20\x02\x00\x00"
MANNERS = {
    "says code 1": b"\x20\x02\x00\x01",
    "says reason 0x84": b"\x20\x03\x00\x84\x00",
    "closes": b"",
    "is mute": None,
}


class OldBroker(Server):
    """Takes in whoever speaks 3.1.1; to version 5 it gives `answer` and closes, or with None says nothing."""

    def __init__(self, answer: bytes | None) -> None:
        self._answer = answer
        self.levels: list[int] = []
        super().__init__()

    def meet(self, sock: socket.socket) -> None:
        """Read the CONNECT; its seventh byte after the length is the protocol's level (MQTT 3.1.1, 3.1.2.2)."""
        with contextlib.suppress(OSError):
            level = sock.recv(4096)[8]
            self.levels.append(level)
            if level == 4:
                sock.sendall(TAKEN_IN)
            elif self._answer is not None:
                sock.sendall(self._answer)
                sock.shutdown(socket.SHUT_RDWR)


def options(port: int, **more: object) -> LinkOptions:
    """Return options for a peer on this machine."""
    given: dict[str, object] = {
        "host": "127.0.0.1",
        "port": port,
        "client_id": "trial",
        "subscriptions": ("a/b",),
        "echo_topic": "own/echo",
        "status_topic": "own/gateway",
        "patience": QUICK,
    }
    return LinkOptions(**(given | more))  # type: ignore[arg-type]  # one dict of fields of many types


def dialed(outcome: Outcome) -> Dialed:
    """Return the connection, closed again."""
    assert isinstance(outcome, Dialed), outcome
    outcome.stream.close()
    return outcome


def refusal(outcome: Outcome) -> str:
    """Return in which words it was refused."""
    assert isinstance(outcome, Refused)
    return outcome.reason


@pytest.mark.parametrize("manner", MANNERS)
def test_auto_goes_on_in_3_1_1_when_a_broker_does_not_take_5(manner: str) -> None:
    """And remembers it: the next connection begins with 3.1.1."""
    with OldBroker(MANNERS[manner]) as broker:
        memory = Memory()
        assert dialed(dial(options(broker.port), memory, clean=False)).protocol is Protocol.V311
        assert memory.worked is Protocol.V311
        dialed(dial(options(broker.port), memory, clean=False))
        assert broker.levels == [5, 4, 4]


@pytest.mark.parametrize("manner", MANNERS)
def test_a_fixed_protocol_is_kept(manner: str) -> None:
    """Whoever asks for 5 is not given less."""
    with OldBroker(MANNERS[manner]) as broker:
        refusal(dial(options(broker.port, protocol=Protocol.V5), Memory(), clean=False))
        assert broker.levels == [5]


@pytest.mark.parametrize("manner", ["closes", "is mute"])
def test_once_5_has_worked_closing_and_silence_are_trouble_and_no_sign_of_age(manner: str) -> None:
    """A broker that is being started anew closes connections too."""
    with OldBroker(MANNERS[manner]) as broker:
        refusal(dial(options(broker.port), Memory(worked=Protocol.V5), clean=False))
        assert broker.levels == [5]


def test_a_server_that_says_nothing_at_all_is_told(tmp_path: Path) -> None:
    """In either protocol."""
    del tmp_path
    with MuteServer() as server:
        assert "says nothing to our CONNECT" in refusal(dial(options(server.port), Memory(), clean=False))
        assert server.accepted == 2


def test_a_server_that_speaks_something_else_is_told() -> None:
    """A web server on the port, say."""
    with RudeServer(b"HTTP/1.1 400 Bad Request\r\n\r\n") as server:
        assert refusal(dial(options(server.port), Memory(), clean=False))


def test_no_broker_and_no_such_name_are_told_with_the_place() -> None:
    """So that a slip in the address is seen."""
    port = free_port()
    assert f"127.0.0.1:{port}" in refusal(dial(options(port), Memory(), clean=False))
    assert "nobody.invalid" in refusal(dial(options(1, host="nobody.invalid"), Memory(), clean=False))


@pytest.mark.mosquitto
def test_a_real_broker_is_spoken_to_in_5_and_gives_its_limits(mosquitto: Mosquitto) -> None:
    """A second connection finds its session again; a clean one does not."""
    memory = Memory()
    first = dialed(dial(options(mosquitto.port), memory, clean=False))
    assert (first.protocol, first.session_present) == (Protocol.V5, False)
    assert dialed(dial(options(mosquitto.port), memory, clean=False)).session_present
    assert not dialed(dial(options(mosquitto.port), memory, clean=True)).session_present


@pytest.mark.mosquitto
def test_in_3_1_1_too_a_clean_start_keeps_the_session_that_it_begins(mosquitto: Mosquitto) -> None:
    """One connection clears it, the next one has it."""
    old = options(mosquitto.port, protocol=Protocol.V311)
    dialed(dial(old, Memory(), clean=False))
    assert not dialed(dial(old, Memory(), clean=True)).session_present
    assert dialed(dial(old, Memory(), clean=False)).session_present


@pytest.mark.mosquitto
@pytest.mark.parametrize("protocol", [Protocol.V5, Protocol.V311])
def test_wrong_credentials_are_refused_in_words(protocol: Protocol, tmp_path: Path) -> None:
    """And are no reason to try another protocol."""
    passwords = tmp_path / "passwords"
    passwords.write_text("gateway:\n", "utf-8")
    with Mosquitto({"allow_anonymous": "false", "password_file": str(passwords)}) as broker:
        asked = options(broker.port, protocol=protocol, username="gateway", password="wrong")  # noqa: S106 - none
        assert "the broker refuses us: " in refusal(dial(asked, Memory(), clean=False))


@pytest.mark.mosquitto
def test_a_unix_socket_will_do(tmp_path: Path) -> None:
    """A broker on the same machine needs no port."""
    path = tmp_path / "broker.sock"
    with Mosquitto({"listener 0": str(path)}) as broker:
        del broker
        dialed(dial(options(0, host=str(path), transport=Transport.UNIX), Memory(), clean=False))


@pytest.mark.mosquitto
def test_encryption_is_taken_from_the_right_authority_and_for_the_right_name_only(tmp_path: Path) -> None:
    """Anything else is refused, and the words say that it is the certificate."""
    authority, certificates = trustme.CA(), tmp_path
    authority.cert_pem.write_to_path(certificates / "ca.pem")
    trustme.CA().cert_pem.write_to_path(certificates / "other.pem")
    issued = authority.issue_cert("localhost")
    issued.cert_chain_pems[0].write_to_path(certificates / "pem")
    issued.private_key_pem.write_to_path(certificates / "key")
    files = {
        key: str(certificates / file) for key, file in (("cafile", "ca.pem"), ("certfile", "pem"), ("keyfile", "key"))
    }
    with Mosquitto(files) as broker:
        right, wrong = Tls(ca=certificates / "ca.pem"), Tls(ca=certificates / "other.pem")
        dialed(dial(options(broker.port, host="localhost", tls=right), Memory(), clean=False))
        for host, tls in (("localhost", wrong), ("127.0.0.1", right)):
            refused = refusal(dial(options(broker.port, host=host, tls=tls), Memory(), clean=False))
            assert "certificate" in refused
        lost = dial(options(broker.port, tls=Tls(ca=certificates / "nothing.pem")), Memory(), clean=False)
        assert "the files for encryption cannot be used" in refusal(lost)
