"""What the link knows of itself by its own echo. Pure: no clock, no I/O; times are given, in nanoseconds.

The gateway publishes a token to a topic of its own and gets it back, as every other message, through the broker's one
queue for this connection. The newest token that has come back bounds the age of everything that comes after it: the
*transit bound* B(t) = t - its sending time. This rests on the broker delivering one session's queue in order, as
brokers do; the standard promises order only for messages of one publisher at one quality of service.

A connection begins with nothing returned: whatever comes first may have waited in the session for days.

| B(t)                         | heard within `down_after` | catching up for less than `give_up_after` | standing    |
|------------------------------|---------------------------|-------------------------------------------|-------------|
| known, at most `live_within`,| yes                       | any                                       | proven      |
| and no token overdue         |                           |                                           |             |
| else                         | yes                       | yes                                       | catching up |
| else                         | yes                       | no                                        | give up     |
| any                          | no                        | any                                       | down        |
"""

from collections import deque
from enum import Enum

from gateway.link.options import Patience

BLANK = b" "


class Standing(Enum):
    """How the link stands."""

    PROVEN = "proven"
    CATCHING_UP = "catching up"
    GIVE_UP = "give up"
    DOWN = "down"


class Returned(Enum):
    """Whose token came back."""

    OURS = "ours"  # of this connection
    EARLIER = "earlier"  # ours, of an earlier connection or sent before a stall, or garbage: says nothing
    FOREIGN = "foreign"


class Echo:
    """Book-keeping of tokens for one connection that was made at `t`.

    `instance` names this running gateway, `connection` this connection: random words without blanks.
    """

    def __init__(self, patience: Patience, instance: str, connection: str, t: int) -> None:
        self._patience = patience
        self._mine = instance.encode()
        self._prefix = BLANK.join((self._mine, connection.encode(), b""))
        self._count = 0
        self._out: deque[tuple[int, int]] = deque()  # (count, sending time) of tokens not yet back, oldest first
        self._newest: int | None = None  # sending time of the newest token that is back
        self._heard = t
        self._behind_since: int | None = t
        self.next_send = t

    def token(self, t: int) -> bytes:
        """Make the token to publish at `t`, at once."""
        self._count += 1
        self._out.append((self._count, t))
        self.next_send = t + self._patience.echo_every
        return self._prefix + str(self._count).encode()

    def heard(self, t: int) -> None:
        """Something, anything, has arrived."""
        self._heard = t

    def returned(self, payload: bytes) -> Returned:
        """Take a message from the echo's topic. A token that comes back clears all that were sent before it."""
        if not payload.startswith(self._prefix):
            ours = payload.split(BLANK, 1)[0] == self._mine or payload.count(BLANK) != 2
            return Returned.EARLIER if ours else Returned.FOREIGN
        for position, (count, sent) in enumerate(self._out):
            if payload == self._prefix + str(count).encode():
                for _ in range(position + 1):
                    self._out.popleft()
                self._newest = sent
                return Returned.OURS
        return Returned.EARLIER

    def stalled(self, t: int) -> None:
        """Forget all tokens: nobody has read for a while, so what is unread may be as old as that."""
        self._out.clear()
        self._newest = None
        self._heard = t
        self.next_send = t

    def bound(self, t: int) -> int | None:
        """B(t); None: no token of this connection has come back yet."""
        return None if self._newest is None else t - self._newest

    def late(self, t: int) -> bool:
        """Whether an undated message that is read at `t` may be too old to be live."""
        return self._newest is None or t - self._newest > self._patience.live_within

    def standing(self, t: int) -> Standing:
        """How the link stands at `t`: the table above."""
        patience = self._patience
        proven = not self.late(t) and not (self._out and t - self._out[0][1] > patience.echo_within)
        if proven:
            self._behind_since = None
        elif self._behind_since is None:
            self._behind_since = t
        if t - self._heard > patience.down_after:
            return Standing.DOWN
        if self._behind_since is None:
            return Standing.PROVEN
        return Standing.CATCHING_UP if t - self._behind_since <= patience.give_up_after else Standing.GIVE_UP
