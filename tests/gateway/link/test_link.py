"""The link on a real broker: what survives a connection, what does not, and what is never sent."""

import logging
import select
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

import paho.mqtt.client as paho
import pytest
from paho.mqtt.enums import CallbackAPIVersion, MQTTProtocolVersion

from gateway.clock import steady
from gateway.link.link import Link
from gateway.link.messages import Happening, Incoming, LinkNews
from gateway.link.options import LinkOptions, Patience, Protocol
from gateway.testing import Mosquitto, Proxy, eventually

pytestmark = pytest.mark.mosquitto

MS = 1_000_000
BRISK = Patience(
    echo_every=100 * MS,
    echo_within=400 * MS,
    live_within=500 * MS,
    down_after=600 * MS,
    retry_first=50 * MS,
    retry_most=200 * MS,
)


class Driven:
    """A link that this test's own thread drives, remembering all that came and all that happened."""

    def __init__(self, port: int, **more: object) -> None:
        given: dict[str, object] = {
            "host": "127.0.0.1",
            "port": port,
            "client_id": "trial",
            "subscriptions": ("in/a",),
            "echo_topic": "own/echo",
            "status_topic": "own/gateway",
            "patience": BRISK,
        }
        options = LinkOptions(**(given | more))  # type: ignore[arg-type]  # one dict of fields of many types
        self.link = Link(options, steady, lambda: None, logging.getLogger("trial"))
        self.came: list[Incoming] = []
        self.news: list[LinkNews] = []
        self.link.start()

    def turn(self) -> None:
        """Go round once."""
        to_read, to_write, pending = self.link.sockets()
        readable, writable, _ = select.select(to_read, to_write, [], 0 if pending else 0.01)
        self.came += self.link.service(readable=bool(readable), writable=bool(writable))
        self.news += self.link.events()

    def until(self, true: Callable[[], object]) -> bool:
        """Drive until `true()` is."""

        def turned() -> object:
            self.turn()
            return true()

        return eventually(turned, every_s=0)

    def happened(self, what: Happening) -> int:
        """Return how often it has happened."""
        return sum(one.happening is what for one in self.news)

    def payloads(self) -> list[bytes]:
        """Return what has come."""
        return [one.payload for one in self.came]


@contextmanager
def driven(port: int, **more: object) -> Iterator[Driven]:
    """Drive a link until it is proven; close it at the end."""
    one = Driven(port, **more)
    try:
        assert one.until(lambda: one.link.proven)
        yield one
    finally:
        one.link.close(None)


@contextmanager
def peer(port: int, *topics: str, client_id: str = "") -> Iterator[tuple[paho.Client, list[Any]]]:
    """Run a client in MQTT 5 that hears some topics; yield it and what it has heard."""
    client = paho.Client(CallbackAPIVersion.VERSION2, client_id, protocol=MQTTProtocolVersion.MQTTv5)
    heard: list[Any] = []
    ready: list[bool] = []
    client.on_message = lambda _, __, message: heard.append(message)

    def on_connect(*_: object) -> None:
        if topics:
            client.subscribe([(topic, 1) for topic in topics])
        else:
            ready.append(True)

    client.on_connect = on_connect
    client.on_subscribe = lambda *_: ready.append(True)
    client.connect("127.0.0.1", port)
    client.loop_start()
    try:
        assert eventually(lambda: ready)
        yield client, heard
    finally:
        client.disconnect()
        client.loop_stop()


def test_a_command_carries_its_expiry_in_5_and_none_in_3_1_1(mosquitto: Mosquitto) -> None:
    """Message Expiry Interval: MQTT 5.0 section 3.3.2.3.3; the broker counts down what it has been kept."""
    with peer(mosquitto.port, "out/pump") as (_, heard):
        for protocol in (Protocol.V5, Protocol.V311):
            with driven(mosquitto.port, protocol=protocol) as one:
                assert one.link.publish("out/pump", protocol.encode(), expiry_s=10)
                assert one.until(lambda: heard and heard[-1].payload == protocol.encode())  # noqa: B023 - used at once
    expiries = [getattr(message.properties, "MessageExpiryInterval", None) for message in heard]
    assert expiries[0] in {9, 10}
    assert expiries[1] is None


def test_nothing_is_commanded_before_the_first_echo_is_back(mosquitto: Mosquitto) -> None:
    """Being connected proves nothing."""
    with peer(mosquitto.port, "out/pump") as (_, heard):
        one = Driven(mosquitto.port)
        while not one.link.proven:
            assert not one.link.publish("out/pump", b"early")
            one.turn()
        assert one.link.publish("out/pump", b"proven")
        assert one.until(lambda: heard)
        one.link.close(None)
        assert [message.payload for message in heard] == [b"proven"]


def test_what_was_refused_while_the_connection_was_swallowed_is_never_sent(mosquitto: Mosquitto) -> None:
    """A command is sent now or not at all."""
    with peer(mosquitto.port, "out/pump") as (_, heard), Proxy(mosquitto.port) as proxy, driven(proxy.port) as one:
        proxy.stall()
        assert one.until(lambda: not one.link.proven)
        assert not one.link.publish("out/pump", b"stale")
        proxy.drop()
        proxy.flow()
        assert one.until(lambda: one.link.proven)
        assert one.link.publish("out/pump", b"fresh")
        assert one.until(lambda: heard)
        assert [message.payload for message in heard] == [b"fresh"]


def test_what_came_while_we_were_away_is_waiting_and_is_late(mosquitto: Mosquitto) -> None:
    """The session is persistent; its queue comes before the first echo of the new connection."""
    with peer(mosquitto.port) as (client, _):
        with driven(mosquitto.port) as one:
            client.publish("in/a", b"live", qos=1)
            assert one.until(lambda: one.came)
            one.link.acknowledge([incoming.receipt for incoming in one.came])
            one.turn()
        client.publish("in/a", b"queued", qos=1).wait_for_publish(20)
        with driven(mosquitto.port) as two:
            assert two.until(lambda: two.came)
            assert [(incoming.payload, incoming.late) for incoming in two.came] == [(b"queued", True)]
        assert [incoming.late for incoming in one.came] == [False]


def test_a_receipt_is_good_for_its_own_connection_only(mosquitto: Mosquitto) -> None:
    """What was not acknowledged before the connection ended comes again, whatever old receipts are handed in."""
    with peer(mosquitto.port) as (client, _), Proxy(mosquitto.port) as proxy, driven(proxy.port) as one:
        client.publish("in/a", b"first", qos=1)
        assert one.until(lambda: one.came)
        old = [incoming.receipt for incoming in one.came]
        proxy.drop()
        assert one.until(lambda: one.happened(Happening.CONNECTED) == 2)
        one.link.acknowledge(old)
        assert one.until(lambda: one.payloads() == [b"first", b"first"])
        assert one.came[1].receipt.epoch != old[0].epoch


def test_a_session_that_the_broker_has_lost_is_begun_anew() -> None:
    """A broker that keeps nothing is started again: everything is subscribed to once more."""
    with Mosquitto() as broker:
        one = Driven(broker.port)
        assert one.until(lambda: one.link.proven)
        broker.stop()
        assert one.until(lambda: one.happened(Happening.DISCONNECTED))
        broker.start()
        assert one.until(lambda: one.link.proven)
        assert [news.session_present for news in one.news if news.happening is Happening.CONNECTED] == [False, False]
        with peer(broker.port) as (client, _):
            client.publish("in/a", b"live again", qos=1)
            assert one.until(lambda: one.payloads() == [b"live again"])
        one.link.close(None)


def test_a_taken_over_session_is_told_and_taken_back_with_pauses(mosquitto: Mosquitto) -> None:
    """MQTT 5.0 section 4.13: the broker ends the older connection with reason 0x8E."""
    with driven(mosquitto.port) as one:
        with peer(mosquitto.port, client_id="trial"):
            assert one.until(lambda: one.happened(Happening.DISCONNECTED))
        assert one.until(lambda: one.link.proven)


def test_an_unwanted_subscription_of_an_earlier_run_is_ended(mosquitto: Mosquitto) -> None:
    """Settings have changed; what nobody listens to any more is acknowledged, and comes no more."""
    with driven(mosquitto.port, subscriptions=("in/a", "in/old")):
        pass
    with peer(mosquitto.port) as (client, _), driven(mosquitto.port) as one:
        client.publish("in/old", b"1", qos=1).wait_for_publish(20)
        client.publish("in/a", b"2", qos=1).wait_for_publish(20)
        assert one.until(lambda: one.came)
        assert one.payloads() == [b"2"]


def test_another_gateway_on_the_same_topics_is_noticed_once(mosquitto: Mosquitto) -> None:
    """Two of them would command against each other."""
    with driven(mosquitto.port) as one, driven(mosquitto.port, client_id="other") as two:
        for _ in range(100):
            two.turn()
            one.turn()
        assert one.happened(Happening.FOREIGN) == two.happened(Happening.FOREIGN) == 1
