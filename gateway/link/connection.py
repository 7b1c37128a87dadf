"""One open connection: a client object of the library, its stream, and what has been told to and by the broker.

It is used by one thread, waits for nothing, and is thrown away when it ends. Callbacks of the library only collect,
and nothing they do can raise. Messages come from the stream; acknowledgements go straight to it.
"""

from collections import deque
from collections.abc import Iterable, Sequence
from typing import NamedTuple

import paho.mqtt.client as paho
from paho.mqtt.enums import MQTTErrorCode
from paho.mqtt.packettypes import PacketTypes
from paho.mqtt.properties import Properties
from paho.mqtt.reasoncodes import ReasonCode

from gateway.link.dialer import Dialed, properties_of
from gateway.link.options import Protocol
from gateway.link.packets import Published, puback

TOPICS_A_PACKET = 100
"""Topics in one SUBSCRIBE: small enough for any broker's limit on packets, large enough for a thousand tanks."""

WAITING_MOST = 10_000
"""Messages that may wait for the broker to finish earlier ones; more would be nonsense by the time they are sent."""

FAREWELL_S = 1.0
"""How long leaving in order may take: the broker is near, and the service manager is not patient."""


class Outgoing(NamedTuple):
    """A message to publish."""

    topic: str
    payload: bytes
    qos: int
    retain: bool
    expiry_s: int | None


class Complaint(NamedTuple):
    """The broker did not do as asked: `topic` was not passed on, or not subscribed to, for `reason`."""

    topic: str
    reason: str


class Connection:
    """A connection that the broker has taken in. `lost` says why it has ended; empty while it has not."""

    def __init__(self, dialed: Dialed) -> None:
        self._client = dialed.client
        self._stream = dialed.stream
        self._v5 = dialed.protocol is Protocol.V5
        self._room = dialed.receive_most  # how many more messages at quality of service 1 the broker takes now
        self._waiting: deque[Outgoing] = deque()
        self._open: dict[int, str] = {}  # topics of what we published and the broker has not acknowledged
        self._asked: dict[int, tuple[str, ...]] = {}  # topics of SUBSCRIBE packets not yet answered
        self.refused: list[Complaint] = []
        self.unheard: list[Complaint] = []
        self.lost = ""
        self._client.on_publish = self._on_publish
        self._client.on_subscribe = self._on_subscribe
        self._client.on_disconnect = self._on_disconnect
        self._client.on_message = self._on_message

    # ---- what the control loop waits for

    def fileno(self) -> int:
        """Descriptor of the socket; -1 when it is closed."""
        return self._stream.fileno()

    @property
    def pending(self) -> bool:
        """Whether there is input that waiting on the socket would not show."""
        return bool(self._stream.inbox) or self._stream.buffered()

    @property
    def unsent(self) -> bool:
        """Whether to wait for the socket to take more."""
        return self._stream.unsent or self._client.want_write()

    @property
    def joining(self) -> bool:
        """Whether a SUBSCRIBE has not been answered yet."""
        return bool(self._asked)

    # ---- in

    def read(self, limit: int) -> tuple[list[Published], bool]:
        """Take up to `limit` messages, reading at most once from the socket; and whether anything has arrived."""
        arrived = False
        inbox = self._stream.inbox
        if len(inbox) < limit and not self.lost:
            arrived = self._stream.fill()
            if self._stream.waiting:
                self._serve_library()
            if self._stream.ended and not self.lost:
                self.lost = self._stream.ended
        taken = inbox[:limit]
        del inbox[:limit]
        return taken, arrived

    def _serve_library(self) -> None:
        """Let the library read what is its. Anything it cannot read ends the connection."""
        try:
            while self._stream.waiting and not self.lost and self._client.socket() is not None:
                self._client.loop_read()
        except Exception as error:  # noqa: BLE001 - the library raises what it likes on a broken packet
            self.lost = f"the broker sent what cannot be read: {type(error).__name__}: {error}"
        if self._client.socket() is None and not self.lost:
            self.lost = "the broker sent what is not MQTT"

    # ---- out

    def write(self) -> None:
        """Send what is queued, as far as the socket takes it at once."""
        while self._waiting and self._room > 0:
            self._hand_over(self._waiting.popleft())
        if self._client.want_write():
            self._client.loop_write()
        self._stream.flush()
        if self._stream.ended and not self.lost:
            self.lost = self._stream.ended

    def subscribe(self, topics: Iterable[str]) -> None:
        """Ask for these topics at quality of service 1."""
        rest = tuple(dict.fromkeys(topics))
        while rest:
            some, rest = rest[:TOPICS_A_PACKET], rest[TOPICS_A_PACKET:]
            result, mid = self._client.subscribe([(topic, 1) for topic in some])
            if result is MQTTErrorCode.MQTT_ERR_SUCCESS and mid is not None:
                self._asked[mid] = some
        self.write()

    def unsubscribe(self, topic: str) -> None:
        """Ask for no more of a topic that an earlier run of ours subscribed to."""
        if topic:
            self._client.unsubscribe(topic)

    def publish(self, message: Outgoing) -> bool:
        """Send, or let wait until the broker has finished earlier messages. False: too many wait already."""
        if message.qos and (self._room <= 0 or self._waiting):
            if len(self._waiting) >= WAITING_MOST:
                return False
            self._waiting.append(message)
        else:
            self._hand_over(message)
        self.write()
        return not self.lost

    @property
    def has_room(self) -> bool:
        """Whether a message at quality of service 1 would be sent at once."""
        return self._room > 0 and not self._waiting and not self._client.want_write()

    def forget_waiting(self) -> None:
        """Drop what has not been sent yet."""
        self._waiting.clear()

    def _hand_over(self, message: Outgoing) -> None:
        properties = None
        if self._v5 and message.expiry_s is not None:
            properties = properties_of(PacketTypes.PUBLISH, MessageExpiryInterval=message.expiry_s)
        info = self._client.publish(message.topic, message.payload, message.qos, message.retain, properties)
        if message.qos:
            self._room -= 1
            self._open[info.mid] = message.topic

    def acknowledge(self, mids: Sequence[int]) -> None:
        """Tell the broker that it need not keep these messages for us."""
        self._stream.put(puback(mids))
        self._stream.flush()

    def tend(self) -> None:
        """Let the library keep the connection alive. Call about once a second."""
        self._client.loop_misc()
        self.write()

    def close(self) -> None:
        """Drop the connection at once, and what is still on its way with it; the broker will publish our will."""
        self._stream.abort()
        self.lost = self.lost or "closed by us"

    def leave(self) -> None:
        """Say that we go, so that the broker publishes no will; takes `FAREWELL_S` at most."""
        self.lost = self.lost or "closed by us"
        self._stream.linger_s = FAREWELL_S
        self._client.disconnect()
        self._client.loop_write()
        self._stream.close()

    # ---- called by the library

    def _on_publish(self, _: paho.Client, __: object, mid: int, reason: ReasonCode, ___: Properties) -> None:
        topic = self._open.pop(mid, None)
        if topic is None:
            return  # quality of service 0: it has merely been written
        self._room += 1
        if reason.value != 0:  # 0x10, no matching subscribers, is no failure by the standard but one for a command
            self.refused.append(Complaint(topic, str(reason).lower()))

    def _on_subscribe(self, _: paho.Client, __: object, mid: int, reasons: list[ReasonCode], ___: Properties) -> None:
        for topic, reason in zip(self._asked.pop(mid, ()), reasons, strict=False):
            if reason.is_failure:
                self.unheard.append(Complaint(topic, str(reason).lower()))

    def _on_disconnect(
        self, _: paho.Client, __: object, flags: paho.DisconnectFlags, reason: ReasonCode, ___: Properties | None
    ) -> None:
        if not self.lost:
            who = "the broker ends the connection" if flags.is_disconnect_packet_from_server else "the connection ended"
            self.lost = f"{who}: {str(reason).lower()}"

    def _on_message(self, _: paho.Client, __: object, message: paho.MQTTMessage) -> None:
        """Take what the stream left to the library: quality of service 2, never asked for, but a session may hold it.

        The library has settled it with the broker already; there is nothing to acknowledge.
        """
        topic = message.topic if _readable(message) else ""
        self._stream.inbox.append((topic, bytes(message.payload), bool(message.retain), 0))


def _readable(message: paho.MQTTMessage) -> bool:
    """Whether the topic is UTF-8; the library raises when asked for one that is not."""
    try:
        return bool(message.topic)
    except UnicodeDecodeError:
        return False
