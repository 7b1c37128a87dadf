"""Questions to the journal: by number, by time, by subject; the newest so many; while it is being written."""

import operator
from collections.abc import Iterator
from functools import partial
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.errors import JournalError
from gateway.events import LinkDown, LinkUp, Message, Start, Wake
from gateway.journal import reader as reader_module
from gateway.journal.reader import Reader, Span, read_or_none
from gateway.journal.records import Batch, EffectRow, EventRow
from gateway.journal.writer import Writer
from gateway.testing import eventually

TEN = [
    EventRow(1, 100, Start(0, 100)),
    EventRow(2, 110, LinkUp(10)),
    EventRow(3, 120, Message(20, "a", b"1")),
    EventRow(4, 130, Message(30, "b", b"2", retained=True)),
    EventRow(5, 140, Message(40, "a", b"3", late=True)),
    EventRow(6, 140, Message(40, "c", b"")),
    EventRow(7, 160, Wake(60)),
    EventRow(8, 170, LinkDown(70, "gone")),
    EventRow(9, 180, Message(80, "a", b"\xff\x00")),
    EventRow(10, 190, LinkUp(90)),
]
EFFECTS = [
    EffectRow(3, 20, 120, "command", "pump", {"n": 1}),
    EffectRow(3, 20, 120, "rule", "fill", {"n": 2}),
    EffectRow(5, 40, 140, "command", "valve", {"n": 3}),
    EffectRow(9, 80, 180, "reason", "pump", {"n": 4}),
    EffectRow(9, 80, 180, "command", "pump", {"n": 5}),
]


@pytest.fixture(scope="module")
def ten(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Reader]:
    """Give a journal of ten inputs and five effects."""
    path = tmp_path_factory.mktemp("journal") / "j.db"
    writer = Writer(path, lambda _: None)
    writer.submit(Batch(events=TEN, effects=EFFECTS))
    assert writer.close()
    reader = Reader(path)
    yield reader
    reader.close()


@pytest.mark.parametrize(
    ("after", "upto"), [(0, None), (0, 10), (3, 7), (9, 10), (10, 10), (10, None), (5, 99), (7, 3)]
)
def test_inputs_by_their_numbers(ten: Reader, after: int, upto: int | None, monkeypatch: pytest.MonkeyPatch) -> None:
    """Above one number, up to and with another; also when they are fetched in several goes."""
    expected = [row for row in TEN if after < row.seq <= (upto or 10)]
    for chunk in (1, 3, 2_000):
        monkeypatch.setattr(reader_module, "CHUNK", chunk)
        assert list(ten.events(after, upto)) == expected


@pytest.mark.parametrize("at", range(95, 200, 5))
def test_the_newest_input_up_to_a_time(ten: Reader, at: int) -> None:
    """Found by halving; of several at one instant it is the last."""
    assert ten.seq_at(at) == max((row.seq for row in TEN if row.at <= at), default=0)


@pytest.mark.parametrize("span", [Span(), Span(120, 180), Span(121, 179), Span(0, 99), Span(140, 140)])
@pytest.mark.parametrize("newest", [-1, 1, 2])
def test_messages_of_topics_within_a_span(ten: Reader, span: Span, newest: int) -> None:
    """Both ends are within; the newest so many, oldest first."""
    for topics in (("a",), ("a", "c"), ("nothing",)):
        expected = [
            row
            for row in TEN
            if isinstance(row.event, Message) and row.event.topic in topics and span.begin <= row.at <= span.end
        ]
        assert ten.messages(topics, span, newest) == (expected if newest < 0 else expected[-newest:])


def test_what_is_neither_message_nor_wake_up(ten: Reader) -> None:
    """Starts, and what became of the link."""
    assert [row.seq for row in ten.notable()] == [1, 2, 8, 10]
    assert [row.seq for row in ten.notable(Span(110, 180), 1)] == [8]
    assert ten.notable()[2].event == LinkDown(70, "gone")


@pytest.mark.parametrize(
    ("subjects", "kinds", "span", "newest", "expected"),
    [
        (None, (), Span(), -1, [1, 2, 3, 4, 5]),
        (("pump",), (), Span(), -1, [1, 4, 5]),
        (("pump", "fill"), ("command", "rule"), Span(), -1, [1, 2, 5]),
        (None, ("command",), Span(0, 140), -1, [1, 3]),
        (None, ("command",), Span(), 2, [3, 5]),
        ((), (), Span(), -1, []),
        (("x' OR 1=1 --",), (), Span(), -1, []),
    ],
)
def test_effects_by_subject_kind_and_time(
    ten: Reader, subjects: tuple[str, ...] | None, kinds: tuple[str, ...], span: Span, newest: int, expected: list[int]
) -> None:
    """Oldest first, the newest so many."""
    found = ten.effects(subjects=subjects, kinds=kinds, span=span, newest=newest)
    assert [row.data["n"] for row in found] == expected


@given(st.lists(st.integers(0, 5), max_size=30), st.integers(0, 60))
def test_halving_finds_what_counting_finds(tmp_path_factory: pytest.TempPathFactory, steps: list[int], at: int) -> None:
    """For any times that do not run backwards."""
    rows, now = [], 0
    for seq, step in enumerate(steps, 1):
        now += step
        rows.append(EventRow(seq, now, Wake(now)))
    path = tmp_path_factory.mktemp("journal") / "j.db"
    writer = Writer(path, lambda _: None)
    writer.submit(Batch(events=rows))
    assert writer.close()
    reader = Reader(path)
    assert reader.seq_at(at) == max((row.seq for row in rows if row.at <= at), default=0)
    reader.close()


def test_a_reader_sees_what_is_committed_while_writing_goes_on(tmp_path: Path) -> None:
    """It neither waits for the writer nor makes it wait, and sees whole batches."""
    path = tmp_path / "j.db"
    done: list[object] = []
    writer = Writer(path, done.append)
    reader = Reader(path)
    assert (reader.last_seq(), list(reader.events())) == (0, [])
    for n in range(20):
        seqs = range(n * 10 + 1, n * 10 + 11)
        writer.submit(Batch(events=[EventRow(seq, seq, Wake(seq)) for seq in seqs], token=n))
        assert eventually(partial(operator.contains, done, n))
        assert reader.last_seq() == seqs[-1]
        assert len(list(reader.events(0, seqs[-1]))) == seqs[-1]
    assert writer.close()
    assert done == list(range(20))
    reader.close()


def test_a_journal_that_is_not_there_is_told_and_not_made(tmp_path: Path) -> None:
    """Asking leaves no file behind."""
    path = tmp_path / "j.db"
    assert read_or_none(path) is None
    with pytest.raises(JournalError, match=r"j.db: there is no journal yet; `brimward run` begins one"):
        Reader(path)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("name", ["tank #1", "what?", "50%", "a b", "ü", "x?mode=rwc"])
def test_a_folder_may_have_any_name(tmp_path: Path, name: str) -> None:
    """Signs that mean something in an address do not lead to another file."""
    folder = tmp_path / name
    writer = Writer(folder / "j.db", lambda _: None)
    writer.submit(Batch(events=TEN))
    assert writer.close()
    assert Reader(folder / "j.db").last_seq() == 10
    assert [path.name for path in tmp_path.iterdir()] == [name]


def test_a_reader_cannot_write(ten: Reader) -> None:
    """The file is opened read-only."""
    with pytest.raises(JournalError, match="readonly"):
        ten._all("DELETE FROM event")


@pytest.mark.parametrize("content", [b"this is no database at all, by any means" * 100, b"\x00" * 5_000, b""])
def test_a_file_that_is_no_journal_is_refused_by_its_name(tmp_path: Path, content: bytes) -> None:
    """Reading and writing both name the file; what is in it is left alone."""
    path = tmp_path / "j.db"
    path.write_bytes(content)
    with pytest.raises(JournalError, match=r"j.db: the journal cannot be read"):
        Reader(path)
    if content:
        with pytest.raises(JournalError, match=r"j.db: the journal cannot be used"):
            Writer(path, lambda _: None)
        assert path.read_bytes() == content
