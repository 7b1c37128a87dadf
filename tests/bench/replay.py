"""How much faster than life a day of `hill-dairy` replays, as the whole command, start of the program included.

Each analogue sensor sends every second, five times as often as it promises, on slow waves that move every rule.
Run: `python tests/bench/replay.py [HOURS]`.
"""

import json
import math
import subprocess
import sys
import tempfile
import time
from datetime import UTC, datetime, timedelta
from pathlib import Path

from gateway.examples import example

BEGIN = datetime(2026, 5, 1, tzinfo=UTC)
WAVES = {  # topic: the payload, its least, its most, and the period in s
    "dairy/condensate-drum/probe": ('{{"hz": {:.1f}}}', 2500, 9000, 4000),
    "dairy/wash-sump/ma": ('{{"current": {{"ma": {:.3f}}}}}', 5.0, 19.0, 2700),
    "dairy/header-tank/pf": ("{:.1f}", 300, 2300, 5300),
    "dairy/cistern/mm": ("{:.0f}", 400, 1900, 9100),
}


def write_trace(path: Path, seconds: int) -> int:
    """Write the trace and return the number of its messages."""
    count = 0
    with path.open("w", encoding="utf-8") as file:
        for second in range(seconds):
            at = (BEGIN + timedelta(seconds=second)).isoformat().replace("+00:00", "Z")
            said = {
                topic: text.format(low + (high - low) * (0.5 + 0.5 * math.sin(second * math.tau / period)))
                for topic, (text, low, high, period) in WAVES.items()
            }
            if second % 10 == 0:
                said |= {"dairy/condensate-drum/float": "0", "dairy/wash-sump/float": "0", "dairy/wash-sump/alive": "1"}
            for topic, payload in said.items():
                file.write(json.dumps({"at": at, "topic": topic, "payload": payload}) + "\n")
            count += len(said)
    return count


def main() -> None:
    """Measure and print."""
    seconds = round(3600 * float(sys.argv[1] if len(sys.argv) > 1 else 24))
    with tempfile.TemporaryDirectory() as folder:
        trace = Path(folder) / "day.jsonl"
        messages = write_trace(trace, seconds)
        command: list[str | Path] = [
            sys.executable,
            "-c",
            "from gateway.cli import main; main()",
            "replay",
            example("hill-dairy"),
        ]
        began = time.perf_counter()
        ran = subprocess.run([*command, "--messages", trace], capture_output=True, text=True, check=True)
        took = time.perf_counter() - began
    records = len(ran.stdout.splitlines())
    print(
        f"{messages} messages of {seconds / 3600:g} h, {records} records: {seconds / took:.0f} times faster than life"
    )


if __name__ == "__main__":
    main()
