"""Makes connections, in a thread of its own, since looking up names, connecting and shaking hands may all wait.

Every attempt gets a fresh client object of the library, so nothing that was queued for an earlier connection can ever
be sent on this one. What comes out is a `Dialed` that the broker has already taken in (its CONNACK is read), or a
`Refused` with the reason in words. The thread ends with it.

With protocol `auto`, what a broker without MQTT 5 does to a CONNECT in 5 is one of: refuse the version, close, or say
nothing at all. Each leads to another attempt in 3.1.1. `Memory` keeps what was learnt; once 5 has worked, closing and
silence are trouble and no sign of age.
"""

import select
import threading
import time
from collections.abc import Callable
from dataclasses import dataclass
from ssl import SSLCertVerificationError, SSLError

import paho.mqtt.client as paho
from paho.mqtt.enums import CallbackAPIVersion, MQTTProtocolVersion
from paho.mqtt.packettypes import PacketTypes
from paho.mqtt.properties import Properties
from paho.mqtt.reasoncodes import ReasonCode

from gateway.link.options import SECOND, LinkOptions, Protocol, Transport
from gateway.link.stream import Stream, wrapping

VERSION_REFUSED = 0x84
"""The reason "unsupported protocol version" (MQTT 5.0, 3.2.2.2); the library gives it for code 1 of 3.1.1 too."""

MANY = 65_535
"""Receive Maximum where the broker names none (MQTT 5.0, 3.2.2.3.3)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Dialed:
    """An open connection: the broker has answered the CONNECT and taken us in."""

    client: paho.Client
    stream: Stream
    protocol: Protocol
    session_present: bool
    receive_most: int  # messages at quality of service 1 that the broker lets us have open at once


@dataclass(frozen=True, slots=True, kw_only=True)
class Refused:
    """No connection, and why. `outdated`: as a broker behaves that does not know this version of MQTT."""

    reason: str
    version: bool = False  # the version was refused in so many words
    outdated: bool = False


Outcome = Dialed | Refused


@dataclass(slots=True)
class Memory:
    """Which protocol has worked with this broker, for as long as the process lives."""

    worked: Protocol | None = None


class Dial:
    """One attempt under way. Poll `outcome`; `cancel` when it is not wanted any more."""

    def __init__(self, options: LinkOptions, memory: Memory, wake: Callable[[], None], *, clean: bool) -> None:
        self._options = options
        self._memory = memory
        self._wake = wake
        self._clean = clean
        self._lock = threading.Lock()
        self._cancelled = False
        self._outcome: Outcome | None = None
        threading.Thread(target=self._run, name="dialer", daemon=True).start()

    @property
    def outcome(self) -> Outcome | None:
        """What has come of it; None: still dialing."""
        return self._outcome

    def cancel(self) -> None:
        """Drop the connection if there is or will be one. Returns at once."""
        with self._lock:
            self._cancelled = True
            if isinstance(self._outcome, Dialed):
                self._outcome.stream.close()

    def _run(self) -> None:
        try:
            outcome = dial(self._options, self._memory, clean=self._clean)
        except Exception as error:  # noqa: BLE001 - a bug here must not leave the link waiting for ever
            outcome = Refused(reason=f"dialing failed: {type(error).__name__}: {error}")
        with self._lock:
            if self._cancelled and isinstance(outcome, Dialed):
                outcome.stream.close()
            self._outcome = outcome
        self._wake()


def dial(options: LinkOptions, memory: Memory, *, clean: bool) -> Outcome:
    """Connect in the protocol that is asked for, remembered or else tried. Blocks."""
    if options.protocol is not Protocol.AUTO:
        return _enter(options, options.protocol, clean=clean)
    if memory.worked is Protocol.V311:
        return _enter(options, Protocol.V311, clean=clean)
    outcome = _enter(options, Protocol.V5, clean=clean)
    if isinstance(outcome, Refused) and (outcome.version or (outcome.outdated and memory.worked is None)):
        second = _enter(options, Protocol.V311, clean=clean)
        outcome = second if isinstance(second, Dialed) or outcome.version else outcome
    if isinstance(outcome, Dialed):
        memory.worked = outcome.protocol
    return outcome


def _enter(options: LinkOptions, protocol: Protocol, *, clean: bool) -> Outcome:
    """Connect in this protocol. Where it cannot both clear the session and keep the new one, do one after the other."""
    if clean and protocol is Protocol.V311:
        cleared = _attempt(options, protocol, clean=True)
        if isinstance(cleared, Refused):
            return cleared
        cleared.client.disconnect()
        cleared.client.loop_write()
        clean = False
    return _attempt(options, protocol, clean=clean)


def _attempt(options: LinkOptions, protocol: Protocol, *, clean: bool) -> Outcome:
    """Make one connection with one fresh client; whatever does not become a `Dialed` is closed."""
    v5 = protocol is Protocol.V5
    names = (*options.subscriptions, options.echo_topic)
    try:
        context = wrapping(options.tls, v5=v5, topics={name.encode(): name for name in names})
    except OSError as error:
        return Refused(reason=f"the files for encryption cannot be used: {error}")
    client = _client(options, v5=v5, clean=clean)
    client.tls_set_context(context)
    answer = _Answer(client)
    try:
        _connect(client, options, v5=v5, clean=clean)
    except OSError as error:
        if context.stream:
            context.stream.close()
        return Refused(reason=_why(error, options))
    stream = context.stream
    if stream is None:
        raise TypeError("the library has made a connection without asking for its socket")
    outcome = _await_answer(client, stream, answer, options, protocol)
    if isinstance(outcome, Refused):
        stream.close()
    return outcome


def _client(options: LinkOptions, *, v5: bool, clean: bool) -> paho.Client:
    """Make a client object, wholly set up and not connected."""
    client = paho.Client(
        CallbackAPIVersion.VERSION2,
        client_id=options.client_id,
        clean_session=None if v5 else clean,
        protocol=MQTTProtocolVersion.MQTTv5 if v5 else MQTTProtocolVersion.MQTTv311,
        transport="unix" if options.transport is Transport.UNIX else "tcp",
        reconnect_on_failure=False,  # it would go down to 3.1 by itself
    )
    client.connect_timeout = options.patience.connect_within / SECOND
    client.max_inflight_messages = 0  # we keep to the broker's limit ourselves; the library must queue nothing
    client.on_socket_register_write = _only_queue
    if options.username is not None:
        client.username_pw_set(options.username, options.password)
    will = properties_of(PacketTypes.WILLMESSAGE, WillDelayInterval=options.will_delay_s) if v5 else None
    client.will_set(options.status_topic, options.will, qos=1, retain=True, properties=will)
    return client


def properties_of(packet: int, **values: int) -> Properties:
    """Properties of MQTT 5 for a kind of packet, with the names that the library gives them."""
    properties = Properties(packet)  # type: ignore[no-untyped-call] # the library has no types here
    for name, value in values.items():
        setattr(properties, name, value)
    return properties


def _only_queue(*_: object) -> None:
    """Do nothing: with this callback set the library only queues, and we write when it suits us."""


def _connect(client: paho.Client, options: LinkOptions, *, v5: bool, clean: bool) -> None:
    """Open the socket and queue the CONNECT. Raises OSError."""
    port = options.port or 1  # of no meaning for a Unix socket, but the library insists
    if not v5:
        client.connect(options.host, port, options.keepalive_s)
        return
    properties = properties_of(PacketTypes.CONNECT, SessionExpiryInterval=options.session_expiry_s)
    client.connect(options.host, port, options.keepalive_s, clean_start=clean, properties=properties)


class _Answer:
    """What the broker said to the CONNECT. Its method is called by the library and only collects."""

    def __init__(self, client: paho.Client) -> None:
        self.reason: ReasonCode | None = None
        self.session_present = False
        self.receive_most = MANY
        client.on_connect = self._collect

    def _collect(
        self, _: paho.Client, __: object, flags: paho.ConnectFlags, reason: ReasonCode, properties: Properties | None
    ) -> None:
        self.reason = reason
        self.session_present = flags.session_present
        self.receive_most = getattr(properties, "ReceiveMaximum", MANY)


def _await_answer(
    client: paho.Client, stream: Stream, answer: _Answer, options: LinkOptions, protocol: Protocol
) -> Outcome:
    """Send the CONNECT and wait for the CONNACK, no longer than `connack_within`."""
    within = options.patience.connack_within / SECOND
    until = time.monotonic() + within
    client.loop_write()
    while answer.reason is None and not stream.ended:
        stream.flush()
        left = until - time.monotonic()
        if left <= 0:
            return Refused(reason=f"the broker says nothing to our CONNECT for {within:g} s", outdated=True)
        if not stream.buffered():
            _wait(stream, left)
        stream.fill()
        while stream.waiting and answer.reason is None and client.socket() is not None:
            client.loop_read()
        if client.socket() is None and answer.reason is None:
            return _unanswered(protocol)
    if answer.reason is None:
        return Refused(reason=f"{stream.ended} without an answer to our CONNECT", outdated=True)
    if answer.reason.is_failure:
        refused = answer.reason.value == VERSION_REFUSED
        return Refused(reason=f"the broker refuses us: {str(answer.reason).lower()}", version=refused)
    return Dialed(
        client=client,
        stream=stream,
        protocol=protocol,
        session_present=answer.session_present,
        receive_most=answer.receive_most,
    )


def _unanswered(protocol: Protocol) -> Refused:
    """Say what it means that the library has dropped the connection by itself."""
    if protocol is Protocol.V311:  # it does so without a callback when the version is refused
        return Refused(reason="the broker refuses MQTT 3.1.1, or does not speak MQTT", version=True)
    return Refused(reason="the broker's answer to our CONNECT is not MQTT 5", outdated=True)


def _wait(stream: Stream, seconds: float) -> None:
    poll = select.poll()
    poll.register(stream.fileno(), select.POLLIN | (select.POLLOUT if stream.unsent else 0))
    poll.poll(seconds * 1000)


def _why(error: OSError, options: LinkOptions) -> str:
    """Say in words why there is no connection."""
    where = options.host if options.transport is Transport.UNIX else f"{options.host}:{options.port}"
    if isinstance(error, SSLCertVerificationError):
        return f"the certificate of the broker at {where} is not accepted: {error.verify_message}"
    if isinstance(error, SSLError):
        return f"no encrypted connection to the broker at {where}: {error.reason or error}"
    if isinstance(error, TimeoutError):
        return f"no answer from the broker at {where} in time"
    return f"no connection to the broker at {where}: {error.strerror or error}"
