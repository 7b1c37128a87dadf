"""What one reading costs the plant: a JSON frequency reading through measurement, judgement and its tank's rules.

Also how that depends on the number of tanks. Run: `python tests/bench/step_cost.py`.
"""

import gc
import statistics
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from gateway_under_load import site_of

from gateway.events import LinkUp, Message, Start, Wake
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan

READINGS, TURNS = 20_000, 8
SECOND = 1_000_000_000
EVERY = 5 * SECOND  # ns from one reading of a tank to its next, whatever the number of tanks


def plant_of(tanks: int) -> Plant:
    """Return a started plant of so many tanks."""
    with tempfile.TemporaryDirectory() as folder:
        plant = Plant(plant_plan(site_of(tanks, 1883, Path(folder))))
    plant.step(Start(0, 0))
    plant.step(LinkUp(0))
    return plant


def microseconds(plant: Plant, tanks: int, turn: int) -> float:
    """Return the microseconds a reading, each on the next tank, each in every rule's dead band."""
    step = EVERY // tanks
    messages = [
        Message(SECOND + n * step, f"bench/tank-{n % tanks}", b'{"hz": %d}' % (6000 + n * 37 % 1499))
        for n in range(turn * READINGS, (turn + 1) * READINGS)
    ]
    gc.disable()
    start = time.perf_counter()
    for message in messages:
        plant.step(message)
        if plant.wake_at is not None and plant.wake_at < message.t:
            plant.step(Wake(message.t))
    took = time.perf_counter() - start
    gc.enable()
    return took / READINGS * 1e6


def main() -> None:
    """Measure small and large sites in turn, and print."""
    few, many = plant_of(10), plant_of(1000)
    pairs = [(microseconds(few, 10, turn), microseconds(many, 1000, turn)) for turn in range(TURNS)]
    pairs = pairs[1:]  # the first turn fills the windows
    small, large = (statistics.median(values) for values in zip(*pairs, strict=True))
    ratio = statistics.median(b / a for a, b in pairs)
    print(f"10 tanks: {small:.1f} us a reading; 1,000 tanks: {large:.1f} us; ratio {ratio:.2f}")


if __name__ == "__main__":
    main()
