"""The running gateway: one control loop that owns the plant and the link, with the journal's thread beside it.

The loop waits on the link's socket, on a pipe that other threads poke, and on the next deadline; it steps the plant,
sends commands at once, hands what happened to the journal, and acknowledges to the broker what the journal has
committed. It never waits for disk, name lookup, encryption or a client of ours.
"""

import contextlib
import gc
import logging
import os
import select
import sys
import threading
from collections import deque
from collections.abc import Callable, Sequence

from gateway.clock import Clock, steady
from gateway.effects import Command, Effect, Note, Reason, Value
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Stop, Wake
from gateway.journal.effects import effect_row
from gateway.journal.reader import read_or_none
from gateway.journal.records import Batch, EventRow, SnapshotRow
from gateway.journal.writer import Writer
from gateway.link.link import Link
from gateway.link.messages import Happening, Incoming, LinkNews, Receipt
from gateway.link.options import LinkOptions
from gateway.plant import Plant
from gateway.recall import recall
from gateway.settings.assemble import plant_plan
from gateway.settings.models import Site
from gateway.topics import Topics, actuator_told, compact, moment, tank_told

SECOND = 1_000_000_000
FLUSH = SECOND  # real ns between publications of values; a display needs no more, and the broker has other work
SNAPSHOT_EVENTS = 20_000  # inputs after which the state is saved: half a second of replay at a restart
SNAPSHOT_EVERY = 60 * SECOND  # or real ns, if anything has come since
CLOCK_APART = SECOND // 10  # ns that the wall clock may drift from the steady one before that is an input
SWITCH_S = 0.0005  # how long the journal's thread may keep the interpreter from the control thread
LONGEST_WAIT_S = 1.0  # so that the wall clock is looked at once a second

Listener = Callable[[Event | LinkNews, Sequence[Effect]], None]


class Service:
    """One gateway. `listener` is shown all that happens, in the control thread; it must not wait."""

    def __init__(
        self, site: Site, options: LinkOptions, clock: Clock, log: logging.Logger, listener: Listener | None = None
    ) -> None:
        self.site = site
        self.clock = clock
        self.log = log
        self.topics = Topics(site.publish_under)
        self._listener = listener
        self._wake_read, self._wake_write = os.pipe2(os.O_NONBLOCK | os.O_CLOEXEC)
        self._stopping = threading.Event()
        self._committed: deque[list[Receipt]] = deque()
        self._trouble: deque[str | None] = deque()
        self._journal_fails = False
        self._writer = Writer(site.journal_path, self._on_committed, self._on_trouble)
        self._link = Link(options, steady, self.wake, log)
        self.plant = Plant(plant_plan(site))
        self._seq = 0
        self._batch = Batch()
        self._receipts: list[Receipt] = []
        self._proven = False  # as the plant has been told
        self._unsendable = False
        self._up_not_before = 0
        self._unsent: dict[str, bytes] = {}  # retained topics of ours that have news
        self._told: dict[str, bytes] = {}  # all of them as they stand
        self._values: dict[str, Value] = {}  # the newest of each tank that has not been told yet
        self._status: dict[str, tuple[str, int]] = {}  # of each tank's level, and since when
        self._states: dict[str, tuple[str, int]] = {}  # of each actuator, and since when
        self._flush_at = self._snapshot_at = 0
        self._snapshot_seq = 0

    # ---- from other threads ---------------------------------------------------------------------------------------

    def wake(self) -> None:
        """Have the control loop come round soon. Any thread, also a signal's handler."""
        with contextlib.suppress(OSError):  # full: it is woken already; closed: it has ended
            os.write(self._wake_write, b"!")

    def stop(self) -> None:
        """Have the gateway end in order. Any thread, also a signal's handler."""
        self._stopping.set()
        self.wake()

    def _on_committed(self, token: object) -> None:
        if isinstance(token, list):  # the receipts of a batch: what `_submit` gives
            self._committed.append(token)
        self.wake()

    def _on_trouble(self, text: str | None) -> None:
        self._trouble.append(text)
        self.wake()

    # ---- life -----------------------------------------------------------------------------------------------------

    def run(self) -> None:
        """Run until `stop`; raise JournalError when the journal cannot be used at all."""
        sys.setswitchinterval(SWITCH_S)
        self._begin()
        gc.collect()
        gc.freeze()  # what the site is made of stays for good; looking through it again and again would delay commands
        try:
            while not self._stopping.is_set():
                self._turn()
            self._end()
        finally:
            self._writer.close()
            os.close(self._wake_read)
            os.close(self._wake_write)

    def _begin(self) -> None:
        """Take up where the journal ends, and start."""
        self._take_up()
        now, wall = self.clock.now(), self.clock.wall()
        self._writer.keep_settings(self.site.digest, wall, self.site.texts)
        self._snapshot()  # what the start begins from, under the settings that are in force now
        self._step(Start(now, wall - now))
        self._submit()
        self._link.start()

    def _take_up(self) -> None:
        """Take up the state that the journal ends with.

        A state that cannot be taken up, whatever the reason, is no reason not to protect what there is: it is said
        loudly, and the gateway starts with nothing known.
        """
        reader = read_or_none(self.site.journal_path)
        if reader is None:
            return
        self._seq = reader.last_seq()
        try:
            before = recall(reader, self.site)
        except Exception as problem:  # noqa: BLE001 - see above
            self._note(self.clock.now(), f"the state from before is lost, latches with it: {problem!r}")
            return
        finally:
            reader.close()
        if before is not None:
            self._take_over(*before)

    def _take_over(self, before: Plant, digest: str) -> None:
        """Take over the state from before; where settings have changed since, what has the same name and meaning."""
        if digest == self.site.digest:
            self.plant = before
            return
        for lost in self.plant.adopt(before):
            self._note(before.t, lost)

    def _end(self) -> None:
        self._step(Stop(self.clock.now()))
        self._snapshot()
        self._submit()
        self._flush()
        self._link.close(compact({"running": False}))

    # ---- the loop -------------------------------------------------------------------------------------------------

    def _turn(self) -> None:
        readable, writable = self._wait()
        came = self._link.service(readable=readable, writable=writable)
        self._follow_journal()
        now = self.clock.now()
        self._watch_clock(now)
        if came:
            self._take(now, came)
        self._follow_link(now)
        wake_at = self.plant.wake_at
        if wake_at is not None and wake_at < now:
            self._step(Wake(now))
        self._submit()
        if steady() >= self._flush_at:
            self._flush()

    def _wait(self) -> tuple[bool, bool]:
        """Wait for input, for the pipe, or for the next deadline; return what the link's socket is ready for."""
        to_read, to_write, pending = self._link.sockets()
        timeout = 0.0 if pending else self._timeout()
        readable, writable, _ = select.select([self._wake_read, *to_read], to_write, [], timeout)
        if self._wake_read in readable:
            os.read(self._wake_read, 4096)
        return any(number in readable for number in to_read), bool(writable)

    def _timeout(self) -> float:
        due = [LONGEST_WAIT_S, max(0.0, (self._link.next_due - steady()) / 1e9)]
        if self.plant.wake_at is not None:
            due.append(self.clock.seconds_until(self.plant.wake_at))
        if self._unsent or self._values:
            due.append(max(0.0, (self._flush_at - steady()) / 1e9))
        return min(due)

    def _take(self, now: int, came: Sequence[Incoming]) -> None:
        for topic, payload, retained, late, receipt in came:
            self._step(Message(now, topic, payload, retained, late))
            self._receipts.append(receipt)

    def _follow_link(self, now: int) -> None:
        """Tell the plant how the link stands."""
        for news in self._link.events():
            if self._listener:
                self._listener(news, ())
            if news.happening is Happening.PROVEN:
                self._go_up(now)
            elif news.happening in {Happening.LOST, Happening.DISCONNECTED}:
                self._go_down(now, news.reason)
            elif news.happening in {Happening.FOREIGN, Happening.REFUSED, Happening.UNHEARD, Happening.GIVEN_UP}:
                self._note(now, f"{news.topic}: {news.reason}" if news.topic else news.reason)
        if self._link.proven and not self._proven:
            self._go_up(now)

    def _go_up(self, now: int) -> None:
        if not self._proven and self._link.proven and steady() >= self._up_not_before:
            self._proven = True
            self._unsent = dict(self._told)
            self._tell(self.topics.gateway, compact({"running": True, "since": moment(self.clock.wall())}))
            self._step(LinkUp(now))

    def _go_down(self, now: int, reason: str) -> None:
        if self._proven:
            self._proven = False
            self._step(LinkDown(now, reason))

    def _watch_clock(self, now: int) -> None:
        """Make it an input when the wall clock and the steady clock part."""
        offset = self.clock.wall() - now
        if abs(offset - self.plant.offset) > CLOCK_APART * max(1.0, self.clock.speed):
            self._step(ClockSet(now, offset))

    def _follow_journal(self) -> None:
        """Acknowledge what is committed; say so when the journal fails or works again."""
        receipts: list[Receipt] = []
        while self._committed:
            receipts += self._committed.popleft()
        if receipts:
            self._link.acknowledge(receipts)
        while self._trouble:
            text = self._trouble.popleft()
            self._journal_fails = text is not None
            self.log.error("%s", text or f"the journal works again; {self._writer.dropped} inputs were lost")

    # ---- steps ----------------------------------------------------------------------------------------------------

    def _step(self, event: Event) -> None:
        """Let an event happen to the plant, do what it wants done, and remember both for the journal."""
        effects = self.plant.step(event)
        if effects or not isinstance(event, Wake):
            self._seq += 1
            self._batch.events.append(EventRow(self._seq, event.t + self.plant.offset, event))
        for effect in effects:  # commands first: everything else can wait for a tenth of a millisecond
            if isinstance(effect, Command):
                self._command(effect)
        for effect in effects:
            self._do(effect)
        if self._listener and effects:
            self._listener(event, effects)
        if self._unsendable:
            # The link did not take a command, so it is not proven: once it is again, every state is sent anew.
            self._unsendable = False
            self._up_not_before = steady() + SECOND
            self._go_down(event.t, "a command could not be sent")

    def _do(self, effect: Effect) -> None:
        match effect:
            case Value():
                self._values[effect.tank] = effect
                if effect.status != self._status.get(effect.tank, (None, 0))[0]:
                    self._status[effect.tank] = (effect.status, effect.at)
                return
            case Command() | Reason():
                self._tell_actuator(effect)
            case Note():
                self.log.warning("%s: %s", effect.about, effect.text)
            case _:
                pass
        row = effect_row(self._seq, effect)
        if row is not None:
            self._batch.effects.append(row)

    def _command(self, command: Command) -> None:
        """Send a command now or never. If the link does not take it, it is not proven: that is news for the plant."""
        sent = self._link.publish(
            command.topic,
            command.payload.encode(),
            qos=command.qos,
            retain=command.retain,
            expiry_s=command.expiry_s,
        )
        self._unsendable = self._unsendable or not sent

    def _tell_actuator(self, effect: Command | Reason) -> None:
        name = effect.actuator
        if self._states.get(name, (None, 0))[0] != effect.state:
            self._states[name] = (effect.state, effect.at)
        self._tell(self.topics.actuator(name), compact(actuator_told(effect, self._states[name][1])))

    def _note(self, now: int, text: str) -> None:
        """Keep something in the journal that is news of the link, not of the plant."""
        self.log.warning("%s", text)
        effect = Note(now, now + self.plant.offset, "link", text)
        row = effect_row(self._seq, effect)
        if row is not None:
            self._batch.effects.append(row)

    # ---- out ------------------------------------------------------------------------------------------------------

    def _tell(self, topic: str, payload: bytes) -> None:
        self._told[topic] = self._unsent[topic] = payload

    def _flush(self) -> None:
        """Publish what has news, newest only; it harms nobody when it is late."""
        self._flush_at = steady() + FLUSH
        for name, value in self._values.items():
            self._tell(self.topics.tank(name), compact(tank_told(value, self._status[name][1])))
        self._values.clear()
        for topic, payload in list(self._unsent.items()):
            if not self._link.publish(topic, payload, qos=0, retain=True, even_unproven=True):
                return
            del self._unsent[topic]

    def _submit(self) -> None:
        """Hand what has happened to the journal."""
        batch, receipts = self._batch, self._receipts
        if not (batch.events or batch.effects or batch.snapshots):
            return
        self._save_now_and_then()
        if self._journal_fails:
            # Control comes before history: without acknowledgements the broker would soon send nothing more at all.
            self._link.acknowledge(receipts)
            receipts = []
        batch.token = receipts
        self._batch, self._receipts = Batch(), []
        self._writer.submit(batch)

    def _save_now_and_then(self) -> None:
        """Save the plant's state, so that a restart need not replay all that ever was."""
        due = self._seq - self._snapshot_seq >= SNAPSHOT_EVENTS or steady() >= self._snapshot_at
        if due and self._seq > self._snapshot_seq:
            self._snapshot()

    def _snapshot(self) -> None:
        self._snapshot_seq, self._snapshot_at = self._seq, steady() + SNAPSHOT_EVERY
        row = SnapshotRow(self._seq, self.plant.t + self.plant.offset, self.site.digest, self.plant.save())
        self._batch.snapshots.append(row)
