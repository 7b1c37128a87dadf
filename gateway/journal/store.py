"""The journal's file: SQLite in WAL mode. Opening it, its tables, and telling whether it can be used.

`synchronous=FULL`: what a transaction has committed survives the loss of power. One thread writes; any may read.
"""

import sqlite3
from pathlib import Path

from gateway.errors import JournalError

VERSION = 1

_SCHEMA = """
CREATE TABLE settings (id INTEGER PRIMARY KEY, digest TEXT NOT NULL UNIQUE, at INTEGER NOT NULL, texts TEXT NOT NULL);
CREATE TABLE topic (id INTEGER PRIMARY KEY, name TEXT NOT NULL UNIQUE);
CREATE TABLE event (
    seq INTEGER PRIMARY KEY, t INTEGER NOT NULL, at INTEGER NOT NULL, kind INTEGER NOT NULL,
    topic INTEGER, payload BLOB, flags INTEGER NOT NULL, data TEXT);
CREATE INDEX event_of_note ON event (at) WHERE kind NOT IN (0, 5); -- all but messages and wake-ups
CREATE TABLE kind (id INTEGER PRIMARY KEY, name TEXT NOT NULL UNIQUE);
CREATE TABLE effect (
    id INTEGER PRIMARY KEY, seq INTEGER NOT NULL, t INTEGER NOT NULL, at INTEGER NOT NULL,
    kind TEXT NOT NULL, subject TEXT NOT NULL, data TEXT NOT NULL);
CREATE INDEX effect_of_subject ON effect (subject, id);
CREATE TABLE snapshot (seq INTEGER PRIMARY KEY, at INTEGER NOT NULL, digest TEXT NOT NULL, state BLOB NOT NULL);
"""

KINDS = ("message", "start", "link up", "link down", "clock set", "wake", "stop")


def open_to_write(path: Path) -> sqlite3.Connection:
    """Return a connection for the one writer, with the tables made; raise JournalError when the file cannot be used."""
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        connection = sqlite3.connect(path, isolation_level=None, check_same_thread=False)
        _prepare(connection)
    except (sqlite3.Error, OSError) as problem:
        raise JournalError(f"{path}: the journal cannot be used: {problem}") from None
    return connection


def open_to_read(path: Path) -> sqlite3.Connection:
    """Return a read-only connection; raise JournalError when there is no journal or it cannot be read."""
    if not path.exists():
        raise JournalError(f"{path}: there is no journal yet; `brimward run` begins one")
    try:
        connection = sqlite3.connect(f"{path.absolute().as_uri()}?mode=ro", uri=True, isolation_level=None)
        _check_version(connection)
    except sqlite3.Error as problem:
        raise JournalError(f"{path}: the journal cannot be read: {problem}") from None
    return connection


def _prepare(connection: sqlite3.Connection) -> None:
    connection.execute("PRAGMA auto_vacuum = INCREMENTAL")
    connection.execute("PRAGMA journal_mode = WAL")
    connection.execute("PRAGMA synchronous = FULL")
    connection.execute("PRAGMA cache_size = -16000")  # 16 MB: a checkpoint's worth of pages
    connection.execute("PRAGMA wal_autocheckpoint = 4000")  # pages; fewer, longer checkpoints cost less in all
    found = connection.execute("PRAGMA quick_check(1)").fetchone()[0]
    if found != "ok":
        raise sqlite3.DatabaseError(f"it is damaged: {found}")
    if connection.execute("PRAGMA user_version").fetchone()[0] == 0:
        kinds = ", ".join(f"({number}, '{name}')" for number, name in enumerate(KINDS))
        made = f"{_SCHEMA}INSERT INTO kind VALUES {kinds};\nPRAGMA user_version = {VERSION};\n"  # noqa: S608 - all ours
        connection.executescript(f"BEGIN IMMEDIATE;\n{made}COMMIT;")
    _check_version(connection)


def _check_version(connection: sqlite3.Connection) -> None:
    version = connection.execute("PRAGMA user_version").fetchone()[0]
    if version != VERSION:
        raise sqlite3.DatabaseError(f"its format has the number {version}; this program knows number {VERSION}")
