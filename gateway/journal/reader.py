"""Reading the journal: each call is short, and reads what is committed at that moment. Any thread, its own reader."""

import json
import sqlite3
import zlib
from collections.abc import Iterator
from pathlib import Path
from typing import Any, NamedTuple

from gateway.errors import JournalError
from gateway.journal.records import EffectRow, EventRow, SnapshotRow, event_of
from gateway.journal.store import KINDS, open_to_read

CHUNK = 2_000  # rows fetched at a time, so that no read transaction stays open for long


class Span(NamedTuple):
    """A stretch of wall time in ns: from `begin` up to and with `end`."""

    begin: int = 0
    end: int = 2**63 - 1


ALWAYS = Span()


class Reader:
    """A read-only view of one journal file. Raises JournalError when it cannot be opened."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._connection = open_to_read(path)

    def close(self) -> None:
        """Close the file."""
        self._connection.close()

    def _all(self, query: str, given: tuple[Any, ...] = ()) -> list[Any]:
        try:
            return self._connection.execute(query, given).fetchall()
        except sqlite3.Error as problem:
            raise JournalError(f"{self._path}: the journal cannot be read: {problem}") from None

    def _one(self, query: str, given: tuple[Any, ...] = ()) -> Any:
        rows = self._all(query, given)
        return rows[0] if rows else None

    def last_seq(self) -> int:
        """Return the number of the newest input, 0 when there is none."""
        return int(self._one("SELECT coalesce(max(seq), 0) FROM event")[0])

    def seq_at(self, at: int) -> int:
        """Return the number of the newest input up to the wall time `at`, 0 when there is none."""
        first, after = 0, self.last_seq() + 1  # the answer is in [first, after): inputs are numbered without gaps
        while after - first > 1:
            middle = (first + after) // 2
            query = "SELECT at FROM event WHERE seq >= ? ORDER BY seq LIMIT 1"
            if self._one(query, (middle,))[0] <= at:
                first = middle
            else:
                after = middle
        return first

    def last_snapshot(self, upto: int | None = None) -> SnapshotRow | None:
        """Return the newest snapshot, after no input later than the one numbered `upto`."""
        query = "SELECT seq, at, digest, state FROM snapshot WHERE seq <= ? ORDER BY seq DESC LIMIT 1"
        row = self._one(query, (2**63 - 1 if upto is None else upto,))
        if row is None:
            return None
        seq, at, digest, state = row
        return SnapshotRow(seq, at, digest, json.loads(zlib.decompress(state)))

    def settings(self, digest: str) -> dict[str, str] | None:
        """Return the texts of the settings with this digest."""
        row = self._one("SELECT texts FROM settings WHERE digest = ?", (digest,))
        return None if row is None else json.loads(row[0])

    def newest_settings(self) -> str | None:
        """Return the digest of the settings that came into force last."""
        row = self._one("SELECT digest FROM settings ORDER BY at DESC, id DESC LIMIT 1")
        return None if row is None else str(row[0])

    def events(self, after: int = 0, upto: int | None = None) -> Iterator[EventRow]:
        """Yield inputs in order: numbered above `after`, up to and with `upto`."""
        last = self.last_seq() if upto is None else upto
        query = (
            "SELECT e.seq, e.t, e.at, e.kind, topic.name, e.payload, e.flags, e.data FROM event e"
            " LEFT JOIN topic ON topic.id = e.topic WHERE e.seq > ? AND e.seq <= ? ORDER BY e.seq LIMIT ?"
        )
        while after < last:
            rows = self._all(query, (after, last, CHUNK))
            for seq, t, at, kind, topic, payload, flags, data in rows:
                yield EventRow(seq, at, event_of(t, KINDS[kind], topic, payload, flags, data))
            if not rows:
                return
            after = rows[-1][0]

    def notable(self, span: Span = ALWAYS, newest: int = -1) -> list[EventRow]:
        """Return the inputs that are neither messages nor wake-ups, oldest first: the `newest` ones (-1: all)."""
        query = (
            "SELECT seq, t, at, kind, data FROM event INDEXED BY event_of_note"
            " WHERE kind NOT IN (0, 5) AND at BETWEEN ? AND ? ORDER BY at DESC, seq DESC LIMIT ?"
        )
        rows = self._all(query, (*span, newest))
        return [
            EventRow(seq, at, event_of(t, KINDS[kind], None, None, 0, data))
            for seq, t, at, kind, data in reversed(rows)
        ]

    def messages(self, topics: tuple[str, ...], span: Span = ALWAYS, newest: int = -1) -> list[EventRow]:
        """Return the messages on some topics within a span, oldest first: the `newest` ones (-1: all)."""
        first, last = self.seq_at(span.begin - 1), self.seq_at(span.end)
        query = (
            "SELECT e.seq, e.t, e.at, topic.name, e.payload, e.flags FROM event e JOIN topic ON topic.id = e.topic"  # noqa: S608 - only placeholders are put in
            f" WHERE e.seq > ? AND e.seq <= ? AND e.kind = 0 AND topic.name IN ({', '.join('?' * len(topics))})"
            " ORDER BY e.seq DESC LIMIT ?"
        )
        rows = self._all(query, (first, last, *topics, newest))
        return [
            EventRow(seq, at, event_of(t, "message", topic, payload, flags, None))
            for seq, t, at, topic, payload, flags in reversed(rows)
        ]

    def effects(
        self,
        *,
        subjects: tuple[str, ...] | None = None,
        kinds: tuple[str, ...] = (),
        span: Span = ALWAYS,
        newest: int = -1,
    ) -> list[EffectRow]:
        """Return effects, oldest first: the `newest` ones (-1: all) of some subjects and kinds, within a span."""
        where, given = ["at BETWEEN ? AND ?"], [*span]
        values: list[Any] = list(given)
        if subjects is not None:
            where.append(f"subject IN ({', '.join('?' * len(subjects))})")
            values.extend(subjects)
        if kinds:
            where.append(f"kind IN ({', '.join('?' * len(kinds))})")
            values.extend(kinds)
        query = (
            "SELECT seq, t, at, kind, subject, data FROM effect WHERE "  # noqa: S608 - only placeholders are put in
            + " AND ".join(where)
            + " ORDER BY id DESC LIMIT ?"
        )
        rows = self._all(query, (*values, newest))
        return [
            EffectRow(seq, t, at, kind, about, json.loads(data)) for seq, t, at, kind, about, data in reversed(rows)
        ]


def read_or_none(path: Path) -> Reader | None:
    """Return a reader, or None when there is no journal yet."""
    return Reader(path) if path.exists() else None
