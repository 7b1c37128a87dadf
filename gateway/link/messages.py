"""What the link hands to the control thread: messages that came, and news of the link itself."""

from enum import StrEnum
from typing import NamedTuple


class Receipt(NamedTuple):
    """What to acknowledge a message with. It is good for the connection (`epoch`) that the message came on only."""

    epoch: int
    mid: int
    qos: int


class Incoming(NamedTuple):
    """A message on a topic that was subscribed to.

    `late`: it may have waited somewhere for longer than a live reading can; it is history and may move nothing.
    """

    topic: str
    payload: bytes
    retained: bool
    late: bool
    receipt: Receipt


class Happening(StrEnum):
    """What can happen to a link."""

    CONNECTED = "connected"  # the broker has taken us in; nothing is proven yet
    PROVEN = "proven"  # the echo came back in time: commands may go out, readings are live
    LOST = "lost"  # was proven and is not any more
    DISCONNECTED = "disconnected"  # the connection has ended
    FAILED = "failed"  # no connection could be made; told once for each new reason
    STALLED = "stalled"  # our own loop came round late; the age of what is unread is unknown
    GIVEN_UP = "backlog given up"  # catching up took too long; reconnecting without the queue
    FOREIGN = "foreign"  # another gateway uses our echo topic; told once for each
    REFUSED = "refused"  # the broker did not pass on what we published; `topic` says which
    UNHEARD = "unheard"  # the broker does not let us subscribe; `topic` says to which


class LinkNews(NamedTuple):
    """Something happened to the link at `t`. `reason` is a sentence for people, without a full stop."""

    t: int
    happening: Happening
    reason: str = ""
    topic: str = ""
    session_present: bool = False
    protocol: str = ""
