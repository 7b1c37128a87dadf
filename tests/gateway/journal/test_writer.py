"""The one writer: nothing is reported committed that is not on disk, whatever happens to process and disk."""

import random
import resource
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import ceaseless
import pytest

from gateway.errors import InputError, JournalError
from gateway.events import Message, Wake
from gateway.journal.lock import Lock
from gateway.journal.reader import Reader
from gateway.journal.records import Batch, EffectRow, EventRow
from gateway.journal.writer import Writer
from gateway.testing import eventually


def is_whole(path: Path) -> int:
    """Check that a journal consists of whole batches in a row, and return the number of its last input."""
    reader = Reader(path)
    rows = list(reader.events())
    assert [row.seq for row in rows] == list(range(1, len(rows) + 1))
    told = [(row.data["first"], row.data["size"]) for row in reader.effects(kinds=("note",))]
    first = 1
    for begin, size in told:
        assert begin == first
        first += size
    assert first == len(rows) + 1
    for row in rows:
        assert row.event == Message(row.seq, f"topic/{row.seq % 7}", str(row.seq).encode() * (row.seq % 50))
    snapshot = reader.last_snapshot()
    assert snapshot is None or snapshot.state == {"last": len(rows)} == {"last": snapshot.seq}
    reader.close()
    return len(rows)


def killed_after(path: Path, seed: int, pause_s: float) -> int:
    """Run a program that writes without end, kill it after a pause; return the last input that it was told of."""
    command = [sys.executable, ceaseless.__file__, str(path), str(seed)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        assert child.stdout.readline() == "begun\n"
        time.sleep(pause_s)
        child.kill()
        told = [line for line in child.stdout.read().split("\n")[:-1] if line]
    return int(told[-1]) if told else 0


def test_a_kill_at_any_instant_loses_nothing_that_was_reported(tmp_path: Path) -> None:
    """`kill -9`, again and again on one journal: what was reported is there, and batches are whole or not at all."""
    path, draw = tmp_path / "j.db", random.Random(7)
    reported, kept = [], []
    for seed in range(8):
        reported.append(killed_after(path, seed, draw.uniform(0, 0.15)))
        kept.append(is_whole(path))
        assert kept[-1] >= reported[-1]
    assert kept == sorted(kept)
    assert reported[-1] > 0


# ---- disks that are full or fail --------------------------------------------------------------------------------


class Heard:
    """Collects what a writer reports."""

    def __init__(self) -> None:
        self.committed: list[object] = []
        self.trouble: list[str | None] = []


def a_writer(path: Path, heard: Heard, *, most_waiting: int = 1_000_000) -> Writer:
    """Return a writer that tries again soon."""
    return Writer(path, heard.committed.append, heard.trouble.append, most_waiting=most_waiting, pause_s=0.02)


def limit_pages(writer: Writer, pages: int) -> None:
    """Let the file grow to so many pages only: SQLite then says `database or disk is full`, as on a full disk."""
    writer._connection.execute(f"PRAGMA max_page_count = {pages}")


def test_a_full_disk_is_told_and_nothing_is_lost_once_there_is_room(tmp_path: Path) -> None:
    """What waits is written later, in order; the trouble and its end are both told."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard)
    limit_pages(writer, 30)
    tokens, first = [], 1
    while not heard.trouble:
        one = ceaseless.batch(first, 100)
        writer.submit(one)
        tokens.append(one.token)
        first += 100
        assert first < 100_000
        assert eventually(lambda: heard.trouble or heard.committed[-1:] == tokens[-1:])
    assert heard.trouble[0] is not None
    assert "full" in heard.trouble[0]
    assert is_whole(path) == len(heard.committed) * 100 < first - 1
    for _ in range(5):
        one = ceaseless.batch(first, 100)
        writer.submit(one)
        tokens.append(one.token)
        first += 100
    assert eventually(lambda: len(heard.trouble) > 2)
    assert len(heard.committed) < len(tokens)
    with held_up(writer):
        limit_pages(writer, 100_000)
    assert eventually(lambda: heard.committed == tokens)
    assert writer.close()
    assert heard.trouble[-1] is None
    assert heard.trouble.count(None) == 1
    assert writer.dropped == 0
    assert is_whole(path) == first - 1


@contextmanager
def held_up(writer: Writer) -> Iterator[None]:
    """Keep the writer from taking up what waits meanwhile."""
    with writer._ready:
        yield


def test_what_waits_is_bounded_and_what_is_let_go_is_counted(tmp_path: Path) -> None:
    """The oldest is kept; what is let go is never reported committed."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard, most_waiting=500)
    limit_pages(writer, 1)
    first = 1
    for _ in range(12):
        writer.submit(ceaseless.batch(first, 100))
        first += 100
    assert eventually(lambda: writer.dropped == 700)
    assert heard.committed == []
    with held_up(writer):
        limit_pages(writer, 100_000)
    assert eventually(lambda: len(heard.committed) == 5)
    assert writer.close()
    assert heard.committed == [100, 200, 300, 400, 500]
    assert is_whole(path) == 500


def test_a_disk_that_refuses_to_write_is_told(tmp_path: Path) -> None:
    """The kernel lets no file grow beyond a size: an error of input and output, not of SQLite's own making."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard)
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    tokens, first = [], 1
    resource.setrlimit(resource.RLIMIT_FSIZE, (400_000, hard))
    try:
        while not heard.trouble:
            one = ceaseless.batch(first, 300)
            writer.submit(one)
            tokens.append(one.token)
            first += 300
            assert first < 100_000
            assert eventually(lambda: heard.trouble or heard.committed[-1:] == tokens[-1:])
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    assert eventually(lambda: heard.committed == tokens)
    assert writer.close()
    assert heard.trouble[-1] is None
    assert is_whole(path) == first - 1


def test_closing_while_the_disk_is_full_says_that_something_is_missing(tmp_path: Path) -> None:
    """It ends all the same, and what is on disk is whole."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard)
    limit_pages(writer, 1)
    writer.submit(ceaseless.batch(1, 500))
    assert eventually(lambda: heard.trouble)
    assert not writer.close()
    assert heard.committed == []
    assert is_whole(path) == 0


def test_settings_that_cannot_be_kept_are_told(tmp_path: Path) -> None:
    """Nothing may be decided by settings that the journal does not hold."""
    writer = a_writer(tmp_path / "j.db", Heard())
    limit_pages(writer, 1)
    with pytest.raises(JournalError, match=r"j.db: the settings cannot be kept: .*full"):
        writer.keep_settings("d", 1, {"site.yaml": "x" * 100_000})
    writer.close()


@pytest.mark.parametrize(
    "row",
    [
        EffectRow(2, 2, 2, "note", "x", {"level": float("nan")}),
        EffectRow(2, 2, 2, "note", "x", {"text": "\ud800"}),
        EffectRow(2, 2, 2**63, "note", "x", {}),
    ],
)
def test_an_effect_that_no_journal_can_hold_costs_no_input_and_holds_up_nothing(tmp_path: Path, row: EffectRow) -> None:
    """A mistake of ours is told; the inputs are kept, since effects can be recomputed from them."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard)
    writer.submit(Batch([EventRow(1, 1, Wake(1))], token=1))
    writer.submit(Batch([EventRow(2, 2, Wake(2))], [row], token=2))
    writer.submit(Batch([EventRow(3, 3, Wake(3))], token=3))
    assert writer.close()
    assert heard.committed == [1, 2, 3]
    assert "cannot hold" in (heard.trouble[0] or "")
    assert heard.trouble[-1] is None
    assert [event.seq for event in Reader(path).events()] == [1, 2, 3]
    assert writer.dropped == 0


def test_an_input_that_no_journal_can_hold_is_counted_and_holds_up_nothing(tmp_path: Path) -> None:
    """It is acknowledged all the same, or the broker would send it for ever."""
    path, heard = tmp_path / "j.db", Heard()
    writer = a_writer(path, heard)
    writer.submit(Batch([EventRow(1, 1, Message(1, "\ud800", b""))], token=1))
    writer.submit(Batch([EventRow(2, 2, Wake(2))], token=2))
    assert writer.close()
    assert heard.committed == [1, 2]
    assert [event.seq for event in Reader(path).events()] == [2]
    assert writer.dropped == 1


def test_a_folder_that_cannot_be_written_is_refused_by_name(tmp_path: Path) -> None:
    """A file stands where the folder should be."""
    (tmp_path / "var").write_text("x")
    with pytest.raises(JournalError, match=r"var/j.db: the journal cannot be used"):
        Writer(tmp_path / "var" / "j.db", lambda _: None)


def test_a_journal_of_another_format_is_refused(tmp_path: Path) -> None:
    """A newer program may have written it."""
    path = tmp_path / "j.db"
    writer = Writer(path, lambda _: None)
    writer._connection.execute("PRAGMA user_version = 9")
    writer.close()
    for opens in (lambda: Reader(path), lambda: Writer(path, lambda _: None)):
        with pytest.raises(JournalError, match="its format has the number 9; this program knows number 1"):
            opens()


# ---- order, and who may write -----------------------------------------------------------------------------------


def test_batches_are_reported_in_order_and_by_the_writers_own_thread(tmp_path: Path) -> None:
    """Submitting never waits, from whichever thread; an empty batch is reported too."""
    threads: set[str] = set()
    tokens: list[object] = []

    def committed(token: object) -> None:
        threads.add(threading.current_thread().name)
        tokens.append(token)

    writer = Writer(tmp_path / "j.db", committed)
    for n in range(200):
        writer.submit(Batch([EventRow(n + 1, n, Wake(n))] if n % 2 else [], token=n))
    assert writer.close()
    assert tokens == list(range(200))
    assert threads == {"journal"}


def test_an_input_that_is_there_already_is_not_written_twice(tmp_path: Path) -> None:
    """After a failure in the very act of committing, trying again changes nothing."""
    path = tmp_path / "j.db"
    for payload in (b"first", b"second"):
        writer = Writer(path, lambda _: None)
        writer.submit(Batch([EventRow(1, 1, Message(1, "a", payload))]))
        assert writer.close()
    assert [row.event for row in Reader(path).events()] == [Message(1, "a", b"first")]


def test_one_gateway_for_one_site(tmp_path: Path) -> None:
    """A second one is refused, with the first one's process; when the first lets go, another may."""
    folder = tmp_path / "var"
    with Lock(folder):
        for _ in range(2):
            with pytest.raises(
                InputError, match=r"lock: another gateway \(process \d+\) runs this site; stop it first"
            ):
                Lock(folder)
    with Lock(folder):
        pass


def test_a_lock_goes_with_its_process(tmp_path: Path) -> None:
    """However it ends, nothing has to be tidied up."""
    program = (
        "import sys, pathlib; from gateway.journal.lock import Lock\n"
        "lock = Lock(pathlib.Path(sys.argv[1])); print('held', flush=True); sys.stdin.read()"
    )
    command = [sys.executable, "-c", program, str(tmp_path)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        assert child.stdout.readline() == "held\n"
        with pytest.raises(InputError, match=rf"\(process {child.pid}\)"):
            Lock(tmp_path)
        child.kill()
    Lock(tmp_path).release()
