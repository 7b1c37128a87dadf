"""A program that writes batches into a journal until it is killed, and says which of them it was told are on disk.

Each batch has a random number of inputs, an effect that says how many and which is the first, and a snapshot.
"""

import random
import sys
import time
from pathlib import Path

from gateway.events import Message
from gateway.journal.reader import Reader
from gateway.journal.records import Batch, EffectRow, EventRow, SnapshotRow
from gateway.journal.writer import Writer


def batch(first: int, size: int) -> Batch:
    """Return a batch of so many inputs; its token is the number of the last."""
    last = first + size - 1
    events = [
        EventRow(seq, seq, Message(seq, f"topic/{seq % 7}", str(seq).encode() * (seq % 50)))
        for seq in range(first, first + size)
    ]
    effect = EffectRow(last, last, last, "note", "batch", {"first": first, "size": size})
    return Batch(events, [effect], [SnapshotRow(last, last, "d", {"last": last})], token=last)


def main(path: Path, seed: int) -> None:
    """Write on, after what is there, without end."""
    draw = random.Random(seed)
    writer = Writer(path, lambda last: print(last, flush=True))  # noqa: T201 - whoever started this reads it
    reader = Reader(path)
    first = reader.last_seq() + 1
    reader.close()
    print("begun", flush=True)  # noqa: T201 - as above
    while True:
        size = draw.randint(1, 300)
        writer.submit(batch(first, size))
        first += size
        while writer._inputs > 5_000:
            time.sleep(0.001)


if __name__ == "__main__":
    main(Path(sys.argv[1]), int(sys.argv[2]))
