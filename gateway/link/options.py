"""What the link is told: where the broker is, who we are there, what to hear, and how patient to be.

Plain values and nothing of the settings' files, so that tests and commands can make a link without a site. Times are
whole nanoseconds.
"""

from dataclasses import dataclass, field
from enum import StrEnum
from pathlib import Path

SECOND = 1_000_000_000


class Transport(StrEnum):
    """How the bytes travel."""

    TCP = "tcp"
    UNIX = "unix"


class Protocol(StrEnum):
    """Which MQTT to speak. `auto` is 5 first, then 3.1.1 when the broker does not answer in 5."""

    AUTO = "auto"
    V5 = "5"
    V311 = "3.1.1"


@dataclass(frozen=True, slots=True, kw_only=True)
class Tls:
    """Encryption. `ca` None: the machine's own list of authorities. `certificate` and `key` prove who we are."""

    ca: Path | None = None
    certificate: Path | None = None
    key: Path | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Patience:
    """How long the link waits for what. The echo is our own token, published and expected back.

    A token goes out every `echo_every` and is overdue after `echo_within`; an undated message may be as old as
    `live_within` (their sum) and still be live. With nothing heard for `down_after` the connection is dropped; with
    `give_up_after` spent in catching up, the backlog is.
    """

    echo_every: int = 3 * SECOND
    echo_within: int = 5 * SECOND
    live_within: int = 8 * SECOND
    down_after: int = 5 * SECOND
    give_up_after: int = 60 * SECOND
    connect_within: int = 5 * SECOND  # each of TCP connection and TLS handshake
    connack_within: int = 5 * SECOND
    stall_after: int = SECOND  # our own loop coming round this late makes everything unread of unknown age
    retry_first: int = SECOND
    retry_most: int = 10 * SECOND


@dataclass(frozen=True, slots=True, kw_only=True)
class LinkOptions:
    """Everything a link needs. `host` is a name, an address, or the path of a Unix socket.

    `subscriptions` are the topics to hear at QoS 1, without the echo's own. `will` is published, retained, on
    `status_topic` by the broker when we are gone.
    """

    host: str
    port: int = 1883
    transport: Transport = Transport.TCP
    tls: Tls | None = None
    protocol: Protocol = Protocol.AUTO
    username: str | None = None
    password: str | None = field(default=None, repr=False)
    client_id: str
    keepalive_s: int = 10
    session_expiry_s: int = 7 * 86_400  # MQTT 5: how long the broker keeps our session, and its queue, without us
    subscriptions: tuple[str, ...]
    echo_topic: str
    status_topic: str
    will: bytes = b'{"running": false}'
    will_delay_s: int = 5  # MQTT 5: a reconnection within it shows nobody that we were away
    patience: Patience = Patience()
