"""Every kind of input comes back from the journal exactly as it happened."""

import typing
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway import events
from gateway.effects import Command, Effect, Note, Reason, RuleChange, SensorChange, Value
from gateway.events import ClockSet, Event, LinkDown, LinkUp, Message, Start, Stop, Wake
from gateway.journal.effects import effect_row
from gateway.journal.reader import Reader
from gateway.journal.records import Batch, EffectRow, EventRow, SnapshotRow
from gateway.journal.writer import Writer

TIMES = st.integers(0, 2**63 - 1)
OFFSETS = st.integers(-(2**63), 2**63 - 1)
TOPICS = st.text(st.characters(exclude_categories=["Cs"]), min_size=1, max_size=20)

EVENTS: dict[type[Event], st.SearchStrategy[Event]] = {
    Start: st.builds(Start, TIMES, OFFSETS),
    Message: st.builds(Message, TIMES, TOPICS, st.binary(max_size=40), st.booleans(), st.booleans()),
    LinkUp: st.builds(LinkUp, TIMES),
    LinkDown: st.builds(LinkDown, TIMES, TOPICS),
    ClockSet: st.builds(ClockSet, TIMES, OFFSETS),
    Wake: st.builds(Wake, TIMES),
    Stop: st.builds(Stop, TIMES),
}


def kept(path: Path, *batches: Batch) -> Reader:
    """Write batches, wait for the disk, and return a reader of them."""
    writer = Writer(path, lambda _: None)
    for batch in batches:
        writer.submit(batch)
    assert writer.close()
    return Reader(path)


def test_every_kind_of_input_is_tried_here() -> None:
    """A new kind cannot be forgotten."""
    assert set(EVENTS) == set(typing.get_args(events.Event))


@given(st.lists(st.one_of(*EVENTS.values()), max_size=12))
def test_inputs_come_back_as_they_were(tmp_path_factory: pytest.TempPathFactory, happened: list[Event]) -> None:
    """Same kind, same time, same fields, same order."""
    rows = [EventRow(seq, seq * 7, event) for seq, event in enumerate(happened, 1)]
    reader = kept(tmp_path_factory.mktemp("journal") / "j.db", Batch(events=rows))
    found = list(reader.events())
    assert found == rows
    assert [type(row.event) for row in found] == [type(event) for event in happened]
    reader.close()


EFFECTS: list[Effect] = [
    Command(1, 2, "a.pump", "on", "t", "1", 1, False, 10, "auto", "a.fill", "because", ("a.other",), False),
    Command(1, 2, "a.pump", "on", "t", "1", 0, True, None, None, None, "nobody asks", (), True),
    Reason(1, 2, "a.pump", "on", "trip", "a.stop", "because", ()),
    RuleChange(1, 2, "a.fill", True, False, "true", "false", {"from": {"text": "level above 1 m", "truth": "true"}}),
    SensorChange(1, 2, "a.probe", "failure", "silent for more than 15 s"),
    Note(1, 2, "link", "bytes, ünïcode, \x1b and \u2028"),
]


def test_effects_come_back_by_their_subject(tmp_path: Path) -> None:
    """Each with its kind, its times and all its fields, as JSON has them."""
    rows = [effect_row(1, effect) for effect in EFFECTS]
    assert all(rows)
    reader = kept(tmp_path / "j.db", Batch(effects=[row for row in rows if row]))
    found = reader.effects()
    assert [(row.kind, row.subject) for row in found] == [
        ("command", "a.pump"),
        ("command", "a.pump"),
        ("reason", "a.pump"),
        ("rule", "a.fill"),
        ("sensor", "a.probe"),
        ("note", "link"),
    ]
    for effect, row in zip(EFFECTS, found, strict=True):
        facts = effect._asdict() | {"overruled": list(getattr(effect, "overruled", ()))}
        assert (row.seq, row.t, row.at) == (1, effect.t, effect.at)
        assert row.data.items() <= facts.items()
        subject = effect._fields[2]  # comes after the two times, in every effect
        assert set(facts) - set(row.data) <= {"t", "at", "overruled", subject}
    assert effect_row(1, Value(1, 2, "a", 1.0, 0.5, 2.0, None, "good", None)) is None


def test_snapshots_and_settings_come_back(tmp_path: Path) -> None:
    """The state after an input, and the whole text of the settings it was under."""
    path = tmp_path / "j.db"
    writer = Writer(path, lambda _: None)
    texts = {"site.yaml": "site: ä\n", "tanks/b.yaml": "tank: b\n", "tanks/a.yaml": "tank: a\n"}
    writer.keep_settings("d1", 5, texts)
    writer.keep_settings("d1", 9, {"site.yaml": "not this"})
    snapshots = [SnapshotRow(seq, seq * 10, "d1", {"n": seq, "deep": [None, 1.5, "ü"]}) for seq in (3, 8)]
    writer.submit(Batch(snapshots=snapshots))
    assert writer.close()
    reader = Reader(path)
    assert (reader.settings("d1"), reader.settings("d2"), reader.newest_settings()) == (texts, None, "d1")
    assert list(reader.settings("d1") or ()) == list(texts)
    assert [reader.last_snapshot(upto) for upto in (2, 3, 7, 8, None)] == [
        None, snapshots[0], snapshots[0], snapshots[1], snapshots[1],
    ]  # fmt: skip


def test_the_subject_of_an_effect_is_kept_once() -> None:
    """The data of its row hold neither the subject nor the times."""
    row = effect_row(4, EFFECTS[4])
    assert row == EffectRow(4, 1, 2, "sensor", "a.probe", {"status": "failure", "reason": "silent for more than 15 s"})
