"""The one writer of the journal: a thread that takes all that waits, in one transaction, and then says so.

`submit` never waits. Nothing is reported committed that is not safely on disk. When the disk is full or fails, the
writer keeps what it can, up to a bound, tries again with a pause, and counts what it had to let go.
"""

import json
import sqlite3
import threading
import zlib
from collections import deque
from collections.abc import Callable, Iterator
from pathlib import Path

from gateway.errors import JournalError
from gateway.events import Message
from gateway.journal.records import Batch, EffectRow, EventRow, SnapshotRow, flags_of, told
from gateway.journal.store import KINDS, open_to_write

PAUSE_S = 1.0  # between tries while the disk fails
MOST_WAITING = 200_000  # inputs kept in memory while the disk fails: about 100 MB of small readings

_KIND = {name: number for number, name in enumerate(KINDS)}
_INSERT_EVENT = "INSERT OR IGNORE INTO event VALUES (?, ?, ?, ?, ?, ?, ?, ?)"
_INSERT_EFFECT = "INSERT INTO effect (seq, t, at, kind, subject, data) VALUES (?, ?, ?, ?, ?, ?)"
_INSERT_SNAPSHOT = "INSERT OR REPLACE INTO snapshot VALUES (?, ?, ?, ?)"

_EventTuple = tuple[int, int, int, int, int | None, bytes | None, int, str | None]


class Writer:
    """The writer thread. `committed` and `trouble` are called in it.

    `committed(token)` tells that a batch is on disk, `trouble(text)` that writing fails, `trouble(None)` that it works
    again. Raises JournalError when the file cannot be used at all.
    """

    def __init__(
        self,
        path: Path,
        committed: Callable[[object], None],
        trouble: Callable[[str | None], None] = lambda _: None,
        *,
        most_waiting: int = MOST_WAITING,
        pause_s: float = PAUSE_S,
    ) -> None:
        self.dropped = 0  # inputs that had to be let go
        self._path = path
        self._connection = open_to_write(path)
        self._committed, self._trouble = committed, trouble
        self._most_waiting, self._pause_s = most_waiting, pause_s
        self._topics = dict(self._connection.execute("SELECT name, id FROM topic").fetchall())
        self._waiting: deque[Batch] = deque()
        self._inputs = 0  # inputs in what waits
        self._ready = threading.Condition()
        self._closing = False
        self._failing = False
        self._thread = threading.Thread(target=self._run, name="journal", daemon=True)
        self._thread.start()

    def submit(self, batch: Batch) -> None:
        """Hand over a batch; it is not to be changed any more."""
        with self._ready:
            self._waiting.append(batch)
            self._inputs += len(batch.events)
            self._ready.notify()

    def keep_settings(self, digest: str, at: int, texts: dict[str, str]) -> None:
        """Keep the whole text of the settings, before anything is decided by them. Waits for the disk.

        Raises JournalError when they cannot be kept.
        """
        query = "INSERT OR IGNORE INTO settings (digest, at, texts) VALUES (?, ?, ?)"
        try:
            self._connection.execute(query, (digest, at, json.dumps(texts)))
        except sqlite3.Error as problem:
            raise JournalError(f"{self._path}: the settings cannot be kept: {problem}") from None

    def close(self, timeout_s: float = 10.0) -> bool:
        """Write what waits and end; return whether all of it is on disk."""
        with self._ready:
            self._closing = True
            self._ready.notify()
        self._thread.join(timeout_s)
        if self._thread.is_alive():
            return False
        self._connection.close()
        return not self._waiting

    # ---- the thread -----------------------------------------------------------------------------------------------

    def _run(self) -> None:
        while (batches := self._next()) is not None:
            if left := self._keep(batches):
                self._put_back(left)
                if self._closing:
                    return
                with self._ready:
                    self._ready.wait(self._pause_s)

    def _next(self) -> list[Batch] | None:
        """Wait for batches and take them all; None when there are none and no more will come."""
        with self._ready:
            while not self._waiting and not self._closing:
                self._ready.wait()
            batches = list(self._waiting)
            self._waiting.clear()
            self._inputs = 0
        return batches or None

    def _keep(self, batches: list[Batch]) -> list[Batch]:
        """Write all in one transaction; return what is not on disk and is to be tried again."""
        try:
            self._write(batches)
        except sqlite3.Error as problem:
            self._fail(f"the journal cannot be written: {problem}")
            return batches
        except Exception as problem:  # noqa: BLE001 - a row that no journal can hold must not keep out all others
            self._fail(f"the journal cannot hold what the gateway tells it; what can be kept is kept: {problem!r}")
            return self._keep_each(batches)
        if self._failing:
            self._failing = False
            self._trouble(None)
        for batch in batches:
            self._committed(batch.token)
        return []

    def _keep_each(self, batches: list[Batch]) -> list[Batch]:
        """Write each batch by itself; of one that cannot be written, the inputs: all else follows from them."""
        if len(batches) == 1:
            return self._keep_inputs(batches[0])
        for index, batch in enumerate(batches):
            if self._keep([batch]):
                return batches[index:]
        return []

    def _keep_inputs(self, batch: Batch) -> list[Batch]:
        if batch.effects or batch.snapshots:
            return self._keep([Batch(batch.events, token=batch.token)])
        self.dropped += len(batch.events)
        self._committed(batch.token)  # or the broker would send it again for ever
        return []

    def _fail(self, trouble: str) -> None:
        self._undo()
        self._failing = True
        self._trouble(trouble)

    def _write(self, batches: list[Batch]) -> None:
        execute = self._connection.execute
        execute("BEGIN IMMEDIATE")
        many = self._connection.executemany
        many(_INSERT_EVENT, [self._event(row) for batch in batches for row in batch.events])
        many(_INSERT_EFFECT, _effects(batches))
        many(_INSERT_SNAPSHOT, [_snapshot(row) for batch in batches for row in batch.snapshots])
        execute("COMMIT")

    def _undo(self) -> None:
        """Take back a transaction that failed; the topics it may have added are looked up anew."""
        try:
            if self._connection.in_transaction:
                self._connection.execute("ROLLBACK")
            self._topics = dict(self._connection.execute("SELECT name, id FROM topic").fetchall())
        except sqlite3.Error:
            self._topics = {}  # the disk fails even to be read; the next try finds them again

    def _put_back(self, batches: list[Batch]) -> None:
        """Keep what failed, oldest first, and let go of the newest inputs beyond the bound."""
        with self._ready:
            self._waiting.extendleft(reversed(batches))
            self._inputs += sum(len(batch.events) for batch in batches)
            while self._inputs > self._most_waiting and self._waiting:
                dropped = self._waiting.pop()
                self._inputs -= len(dropped.events)
                self.dropped += len(dropped.events)

    # ---- rows -----------------------------------------------------------------------------------------------------

    def _event(self, row: EventRow) -> _EventTuple:
        seq, at, event = row
        if isinstance(event, Message):
            topic = self._topics.get(event.topic) or self._topic(event.topic)
            return (seq, event.t, at, 0, topic, event.payload, flags_of(event), None)
        kind, data = told(event)
        return (seq, event.t, at, _KIND[kind], None, None, 0, data)

    def _topic(self, name: str) -> int:
        execute = self._connection.execute
        execute("INSERT OR IGNORE INTO topic (name) VALUES (?)", (name,))
        number = int(execute("SELECT id FROM topic WHERE name = ?", (name,)).fetchone()[0])
        self._topics[name] = number
        return number


def _effects(batches: list[Batch]) -> Iterator[tuple[int, int, int, str, str, str]]:
    for batch in batches:
        for row in batch.effects:
            yield _effect(row)


def _effect(row: EffectRow) -> tuple[int, int, int, str, str, str]:
    data = json.dumps(row.data, sort_keys=True, allow_nan=False, ensure_ascii=False)
    return (row.seq, row.t, row.at, row.kind, row.subject, data)


def _snapshot(row: SnapshotRow) -> tuple[int, int, str, bytes]:
    state = json.dumps(row.state, sort_keys=True, allow_nan=False).encode()
    return (row.seq, row.at, row.digest, zlib.compress(state, 1))
