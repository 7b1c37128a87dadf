"""Bringing a plant back from the journal: the nearest snapshot, and the inputs since, through the same `step`.

Restart uses this, and so does every question about the past.
"""

from pathlib import Path

from gateway.errors import JournalError
from gateway.events import Start, Wake
from gateway.journal.reader import Reader
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts
from gateway.settings.models import Site


def recall(reader: Reader, site: Site, upto: int | None = None) -> tuple[Plant, str] | None:
    """Return the plant and the digest of its settings after the input numbered `upto` (None: the newest).

    None when there was no input yet. The settings are those in force then, which the journal keeps; `site` says where
    the site's folder is.
    """
    last = reader.last_seq() if upto is None else upto
    if last == 0:
        return None
    snapshot = reader.last_snapshot(last)
    if snapshot is None:
        raise JournalError("the journal holds inputs, but no snapshot to begin from")
    plant = Plant(plant_plan(_site_of(reader, site, snapshot.digest)))
    plant.restore(snapshot.state)
    for row in reader.events(snapshot.seq, last):
        plant.step(row.event)
    return plant, snapshot.digest


def recall_at(reader: Reader, site: Site, at: int) -> tuple[Plant, str] | None:
    """Return the plant, and the digest of its settings, as it was at the wall time `at`; None when nothing was yet."""
    upto = reader.seq_at(at)
    found = recall(reader, site, upto) if upto else None
    if found is None:
        return None
    plant, _ = found
    following = next(reader.events(upto, upto + 1), None)
    if following is not None and not isinstance(following.event, Start):
        plant.step(Wake(at - plant.offset + 1))  # deadlines between two inputs have fired by then
    return found


def _site_of(reader: Reader, site: Site, digest: str) -> Site:
    if digest == site.digest:
        return site
    texts = reader.settings(digest)
    if texts is None:
        raise JournalError(f"the journal does not hold the settings {digest[:12]} that it speaks of")
    return load_texts(texts, site.folder)


def reader_of(site: Site) -> Reader:
    """Return a reader of the site's journal; raise JournalError when there is none."""
    return Reader(Path(site.journal_path))
