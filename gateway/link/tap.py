"""Listening in: a plain connection for commands that only watch. It leaves nothing behind on the broker.

It speaks MQTT 3.1.1, which every broker does, and is no part of the running gateway.
"""

import contextlib
import queue
import ssl
from collections.abc import Iterator, Sequence
from typing import NamedTuple

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion, MQTTProtocolVersion
from paho.mqtt.reasoncodes import ReasonCode

from gateway.errors import BrokerError
from gateway.link.options import LinkOptions, Transport

ANSWER_WITHIN_S = 10.0
MOST_WAITING = 100_000  # messages; a command that falls further behind drops the newest, which it counts


class Heard(NamedTuple):
    """A message that went by."""

    topic: str
    payload: bytes
    retained: bool


class Tap:
    """A connection that hears `topics` until it is closed. Raises BrokerError when the broker cannot be reached."""

    def __init__(self, options: LinkOptions, topics: Sequence[str]) -> None:
        self.missed = 0
        self._topics = [(topic, 0) for topic in topics]
        self._heard: queue.Queue[Heard] = queue.Queue(MOST_WAITING)
        self._answer: queue.Queue[str] = queue.Queue()
        self._client = _client(options)
        self._client.on_connect = self._on_connect
        self._client.on_message = self._on_message
        where = f"{options.host}:{options.port}" if options.transport is Transport.TCP else options.host
        try:
            self._client.connect(options.host, options.port or 1)
        except (OSError, ValueError) as problem:
            raise BrokerError(f"the broker at {where} cannot be reached: {problem}") from None
        self._client.loop_start()
        with contextlib.suppress(queue.Empty):
            refusal = self._answer.get(timeout=ANSWER_WITHIN_S)
            if not refusal:
                return
            self.close()
            raise BrokerError(f"the broker at {where} refuses: {refusal}")
        self.close()
        raise BrokerError(f"the broker at {where} does not answer")

    def heard(self, within_s: float) -> Iterator[Heard]:
        """Yield messages until none has come for `within_s`."""
        with contextlib.suppress(queue.Empty):
            while True:
                yield self._heard.get(timeout=within_s)

    def close(self) -> None:
        """End the connection."""
        self._client.disconnect()
        self._client.loop_stop()

    def _on_connect(self, client: paho.Client, _: object, __: object, reason: ReasonCode, ___: object) -> None:
        if not reason.is_failure:
            client.subscribe(self._topics)
        self._answer.put(str(reason).lower() if reason.is_failure else "")

    def _on_message(self, _: paho.Client, __: object, message: paho.MQTTMessage) -> None:
        try:
            self._heard.put_nowait(Heard(message.topic, bytes(message.payload), bool(message.retain)))
        except (queue.Full, UnicodeDecodeError):
            self.missed += 1


def _client(options: LinkOptions) -> paho.Client:
    client = paho.Client(
        CallbackAPIVersion.VERSION2,
        client_id="",
        protocol=MQTTProtocolVersion.MQTTv311,
        transport="unix" if options.transport is Transport.UNIX else "tcp",
    )
    if options.username is not None:
        client.username_pw_set(options.username, options.password)
    if options.tls is not None:
        context = ssl.create_default_context(cafile=options.tls.ca)
        if options.tls.certificate is not None:
            context.load_cert_chain(options.tls.certificate, options.tls.key)
        client.tls_set_context(context)
    return client
