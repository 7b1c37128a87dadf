"""The link to the broker, as the control thread sees it: it proves itself, and it never makes anybody wait.

The control loop waits on `sockets`, calls `service` when one is ready, when woken and at `next_due`, and gets what has
come. Dialing happens in a thread of its own (see `dialer`); everything here is non-blocking.

The standing of the link is decided by its echo (see `echo`). Only a proven link takes commands. What is published is
sent at once or refused; nothing is kept for a later connection, and a receipt is good for its own connection only.
"""

import logging
import random
import secrets
from collections.abc import Callable, Sequence
from typing import Final

from gateway.link.backoff import Backoff
from gateway.link.connection import Connection, Outgoing
from gateway.link.dialer import Dial, Dialed, Memory
from gateway.link.echo import Echo, Returned, Standing
from gateway.link.messages import Happening, Incoming, LinkNews, Receipt
from gateway.link.options import SECOND, LinkOptions, Protocol

TURN: Final = SECOND
"""The longest time between two calls of `service`: the library's keepalive needs about that."""

ECHO_EXPIRY_S: Final = 60
"""MQTT 5: a token that could not be delivered within this is of no use, so the broker may drop it."""


class Link:
    """Used by the control thread only; `wake` alone is called from another thread, to have `service` called soon.

    `clock` gives nanoseconds that never jump (best: the machine's boot-time clock). `share` gives random numbers
    in [0, 1) for the pauses between attempts.
    """

    def __init__(
        self,
        options: LinkOptions,
        clock: Callable[[], int],
        wake: Callable[[], None],
        log: logging.Logger,
        share: Callable[[], float] = random.random,
    ) -> None:
        self._options = options
        self._patience = options.patience
        self._clock = clock
        self._wake = wake
        self._log = log
        self._instance = secrets.token_hex(8)
        self._wanted = frozenset(options.subscriptions)
        self._exact = not any("+" in topic or "#" in topic for topic in options.subscriptions)
        self._memory = Memory()
        self._backoff = Backoff(self._patience.retry_first, self._patience.retry_most, share)
        self._dial: Dial | None = None
        self._dial_at: int | None = None
        self._clean = False  # whether the next connection begins with an empty session
        self._connection: Connection | None = None
        self._echo: Echo | None = None
        self._epoch = 0
        self._tend_at = 0
        self._news: list[LinkNews] = []
        self._last_failure = ""
        self._foreign: set[bytes] = set()
        self._unasked: set[str] = set()
        self.proven = False
        self.next_due = 0

    # ---- what the control loop asks

    def sockets(self) -> tuple[list[int], list[int], bool]:
        """File descriptors to wait for: readable, writable; and whether there is input that waiting would not show."""
        connection = self._connection
        if connection is None:
            return [], [], False
        number = connection.fileno()
        return [number], [number] if connection.unsent else [], connection.pending

    def events(self) -> list[LinkNews]:
        """Hand over what has happened since last asked, oldest first."""
        news, self._news = self._news, []
        return news

    def transit_bound(self, t: int) -> int | None:
        """How old an undated message that is read at `t` can be, in ns; None: unknown."""
        return self._echo.bound(t) if self._echo else None

    # ---- what the control loop does

    def start(self) -> None:
        """Begin to dial."""
        self._dial_at = self._clock()
        self._start_dial()
        self.next_due = self._dial_at + TURN

    def close(self, farewell: bytes | None) -> None:
        """Leave in order, publishing `farewell`, retained, on the status topic first. Takes a second at most."""
        self._dial_at = None
        if self._dial:
            self._dial.cancel()
            self._dial = None
        if self._connection and not self._connection.lost:
            self._connection.forget_waiting()
            if farewell is not None:
                self._connection.publish(Outgoing(self._options.status_topic, farewell, 1, True, None))
            self._connection.leave()
        self._connection = self._echo = None
        self.proven = False

    def service(self, *, readable: bool, writable: bool, limit: int = 500) -> list[Incoming]:
        """Do what is due and return what has come, `limit` messages at most. Never waits."""
        t = self._clock()
        self._watch_for_stall(t)
        self._follow_dial(t)
        came: list[Incoming] = []
        connection, echo = self._connection, self._echo
        if connection is not None and echo is not None:
            if readable or connection.pending:
                came = self._take(connection, echo, t, limit)
            if writable:
                connection.write()
            self._keep(connection, echo, t)
        self.next_due = self._due(t)
        return came

    def publish(
        self,
        topic: str,
        payload: bytes,
        *,
        qos: int = 1,
        retain: bool = False,
        expiry_s: int | None = None,
        even_unproven: bool = False,
    ) -> bool:
        """Send now or never; `even_unproven` is for values and status, which do no harm when they are late.

        False: it was not and will not be sent.
        """
        if self._connection is None or self._connection.lost or not (self._may_command() or even_unproven):
            return False
        return self._connection.publish(Outgoing(topic, payload, qos, retain, expiry_s))

    def acknowledge(self, receipts: Sequence[Receipt]) -> None:
        """Tell the broker that these messages are safely kept. Receipts of an earlier connection are dropped."""
        if self._connection is None or self._connection.lost:
            return
        epoch = self._epoch
        mids = [mid for of, mid, qos in receipts if of == epoch and qos]
        if mids:
            self._connection.acknowledge(mids)

    # ---- reading

    def _take(self, connection: Connection, echo: Echo, t: int, limit: int) -> list[Incoming]:
        """Read, follow the echo, and mark each message with whether it is live."""
        messages, arrived = connection.read(limit)
        if arrived:
            echo.heard(t)
        echo_topic, epoch, late = self._options.echo_topic, self._epoch, echo.late(t)
        wanted, exact = self._wanted, self._exact
        came: list[Incoming] = []
        settled: list[int] = []
        for topic, payload, retained, mid in messages:
            if topic == echo_topic:
                self._take_token(echo, payload, t)
                late = echo.late(t)
            elif topic in wanted or not exact:
                came.append(Incoming(topic, payload, retained, late, Receipt(epoch, mid, 1 if mid else 0)))
                continue
            else:
                self._disown(connection, topic)
            if mid:
                settled.append(mid)
        if settled:
            connection.acknowledge(settled)
        return came

    def _take_token(self, echo: Echo, payload: bytes, t: int) -> None:
        """Follow our own token; tell of another's, once, and only when it cannot be left over from an earlier run."""
        if echo.returned(payload) is not Returned.FOREIGN or not self.proven:
            return
        other = payload.split(b" ", 1)[0]
        if other not in self._foreign and len(self._foreign) < 100:  # a bound, should somebody play tricks
            self._foreign.add(other)
            self._tell(t, Happening.FOREIGN, f"another gateway publishes on {self._options.echo_topic}")

    def _disown(self, connection: Connection, topic: str) -> None:
        """End a subscription that an earlier run with other settings has left in our session."""
        if topic not in self._unasked and len(self._unasked) < 10_000:  # a bound, should a broker play tricks
            self._unasked.add(topic)
            connection.unsubscribe(topic)

    # ---- keeping

    def _watch_for_stall(self, t: int) -> None:
        """Our own loop is late (busy, stopped, or the machine slept): the age of what is unread is unknown."""
        behind = t - self.next_due
        if self._echo is None or behind <= self._patience.stall_after:
            return
        self._echo.stalled(t)
        self._tell(t, Happening.STALLED, f"the gateway itself stood still for {behind / SECOND:.1f} s")

    def _keep(self, connection: Connection, echo: Echo, t: int) -> None:
        """Send the token that is due, keep the connection alive, and judge how the link stands."""
        if t >= self._tend_at and not connection.lost:
            self._tend_at = t + TURN
            connection.tend()
        if t >= echo.next_send and not connection.joining and connection.has_room and not connection.lost:
            token = Outgoing(self._options.echo_topic, echo.token(t), 1, False, ECHO_EXPIRY_S)
            connection.publish(token)
        elif connection.unsent:
            connection.write()
        self._pass_on_complaints(connection, t)
        if connection.lost:
            self._drop(connection.lost, t)
        else:
            self._judge(connection, echo.standing(t), t)

    def _judge(self, connection: Connection, standing: Standing, t: int) -> None:
        """Act on how the link stands."""
        match standing:
            case Standing.PROVEN:
                self._prove(t)
            case Standing.CATCHING_UP:
                connection.forget_waiting()
                self._unprove("messages arrive, but our echo is overdue: catching up", t)
            case Standing.GIVE_UP:
                seconds = self._patience.give_up_after / SECOND
                self._clean = True
                self._tell(t, Happening.GIVEN_UP, f"our echo has not come back for {seconds:g} s")
                self._drop("the backlog is given up", t)
            case Standing.DOWN:
                self._drop(f"nothing has arrived for {self._patience.down_after / SECOND:g} s", t)

    def _prove(self, t: int) -> None:
        if not self.proven:
            self.proven = True
            self._backoff.reset()
            self._tell(t, Happening.PROVEN)

    def _unprove(self, reason: str, t: int) -> None:
        if self.proven:
            self.proven = False
            self._tell(t, Happening.LOST, reason)

    def _may_command(self) -> bool:
        """Whether the link is proven at this very moment, not merely when last serviced."""
        return self.proven and self._echo is not None and self._echo.standing(self._clock()) is Standing.PROVEN

    def _pass_on_complaints(self, connection: Connection, t: int) -> None:
        for complaint in connection.refused:
            self._tell(t, Happening.REFUSED, complaint.reason, complaint.topic)
        for complaint in connection.unheard:
            self._tell(t, Happening.UNHEARD, complaint.reason, complaint.topic)
        connection.refused.clear()
        connection.unheard.clear()

    def _drop(self, reason: str, t: int) -> None:
        """End the connection and plan the next."""
        self._unprove(reason, t)
        if self._connection:
            self._connection.close()
        self._connection = self._echo = None
        self._tell(t, Happening.DISCONNECTED, reason)
        self._dial_at = t + self._backoff.wait()

    # ---- dialing

    def _follow_dial(self, t: int) -> None:
        """Start to dial when it is time, and take what has come of it."""
        if self._dial is None:
            if self._connection is None and self._dial_at is not None and t >= self._dial_at:
                self._start_dial()
            return
        outcome = self._dial.outcome
        if outcome is None:
            return
        self._dial = None
        if isinstance(outcome, Dialed):
            self._welcome(outcome, t)
            return
        self._dial_at = t + self._backoff.wait()
        if outcome.reason != self._last_failure:
            self._last_failure = outcome.reason
            self._tell(t, Happening.FAILED, outcome.reason)

    def _start_dial(self) -> None:
        self._dial = Dial(self._options, self._memory, self._wake, clean=self._clean)

    def _welcome(self, dialed: Dialed, t: int) -> None:
        """Begin a connection: subscribe; the first token follows the last answer to that."""
        self._epoch += 1
        self._clean = False
        self._last_failure = ""
        self._unasked.clear()
        self._connection = Connection(dialed)
        self._echo = Echo(self._patience, self._instance, secrets.token_hex(8), t)
        self._tend_at = t + TURN
        self._tell(
            t, Happening.CONNECTED, session_present=dialed.session_present, protocol=_PROTOCOL_NAMES[dialed.protocol]
        )
        self._connection.subscribe((*self._options.subscriptions, self._options.echo_topic))

    # ---- the rest

    def _due(self, t: int) -> int:
        """When `service` must be called again at the latest."""
        due = t + TURN
        if self._connection is None:
            if self._dial is None and self._dial_at is not None:
                due = min(due, self._dial_at)
        elif self._echo and not self._connection.joining and self._connection.has_room:
            due = min(due, self._echo.next_send)
        return due

    def _tell(
        self,
        t: int,
        happening: Happening,
        reason: str = "",
        topic: str = "",
        *,
        session_present: bool = False,
        protocol: str = "",
    ) -> None:
        self._news.append(LinkNews(t, happening, reason, topic, session_present, protocol))
        self._log.info("%s", " ".join(filter(None, ("link", happening.value, protocol, topic, reason))))


_PROTOCOL_NAMES = {Protocol.V5: "MQTT 5", Protocol.V311: "MQTT 3.1.1"}
