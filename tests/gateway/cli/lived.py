"""For tests of the commands: running one in this process, and a site whose gateway has lived through a night."""

import contextlib
import io
import shutil
import sys
from collections.abc import Iterable
from pathlib import Path
from typing import NamedTuple
from unittest import mock

from gateway.cli import main
from gateway.events import Event, LinkDown, LinkUp, Message, Start, Stop
from gateway.examples import example
from gateway.journal.effects import effect_row
from gateway.journal.records import Batch, EventRow, SnapshotRow
from gateway.journal.writer import Writer
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load

SECOND = 1_000_000_000
MIDNIGHT = 1_777_586_400 * SECOND  # 2026-05-01 00:00 in Vienna, 2026-04-30T22:00:00Z
PROBE, FLOAT = "dairy/condensate-drum/probe", "dairy/condensate-drum/float"


class Ran(NamedTuple):
    """What a command came to."""

    status: int
    out: str
    err: str


def run(*arguments: object) -> Ran:
    """Run the whole program with these arguments."""
    out, err = io.StringIO(), io.StringIO()
    argv = ["brimward", *map(str, arguments)]
    with mock.patch.object(sys, "argv", argv), contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        try:
            main()
            status = 0
        except SystemExit as ended:
            status = ended.code if isinstance(ended.code, int) else int(ended.code is not None)
    return Ran(status, out.getvalue(), err.getvalue())


def copy_of(name: str, folder: Path) -> Path:
    """Return a copy of an example site, which may be changed and have a journal."""
    copy = folder / name
    shutil.copytree(example(name), copy)
    return copy


def night() -> list[Event]:
    """Return what happens in the dairy in one night; times count from some start of the machine, 1000 s before.

    The drum's probe says 0.40 m (2 readings a minute apart are enough to be told apart), then 0.78 m at 00:01, for
    longer than the eight seconds of its shutoff; at 00:02 the link is lost for two seconds; at 00:03 the gateway stops.
    """

    def at(seconds: float) -> int:
        return round((1000 + seconds) * SECOND)

    happened: list[Event] = [Start(at(0), MIDNIGHT - at(0)), LinkUp(at(1))]
    for second in range(2, 180, 4):
        payload = b'{"hz": 5598.56287425}' if second < 60 else b'{"hz": 2971.8}'
        happened.append(Message(at(second), PROBE, payload))
        if second % 20 == 2:
            happened.append(Message(at(second + 1), FLOAT, b"0"))
    happened += [Message(at(90), PROBE, b"\x1b[2J rubbish"), Message(at(91), PROBE, b'{"hz": 1}', retained=True)]
    happened += [LinkDown(at(120), "nothing has come for 5 s"), LinkUp(at(121.5)), Stop(at(180))]
    return sorted(happened, key=lambda event: event.t)


def live(folder: Path, happened: Iterable[Event]) -> None:
    """Let things happen to the gateway of the site in `folder`, and keep them in its journal as the gateway does."""
    site = load(folder)
    plant, batch = Plant(plant_plan(site)), Batch()
    batch.snapshots.append(SnapshotRow(0, MIDNIGHT, site.digest, plant.save()))
    for seq, event in enumerate(happened, 1):
        effects = plant.step(event)
        batch.events.append(EventRow(seq, event.t + plant.offset, event))
        batch.effects += [row for row in (effect_row(seq, effect) for effect in effects) if row]
    writer = Writer(site.journal_path, lambda _: None)
    writer.keep_settings(site.digest, MIDNIGHT, site.texts)
    writer.submit(batch)
    if not writer.close():
        raise OSError("the journal could not be written")
