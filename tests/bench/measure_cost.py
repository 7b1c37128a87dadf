"""What measurement alone costs: a JSON frequency reading to judged level, volume, flow and totals, without any rule.

Also whether that grows with the window over which the rise is told. Run: `python tests/bench/measure_cost.py`.
"""

import gc
import statistics
import sys
import tempfile
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from gateway_under_load import TANK

from gateway.effects import Effect
from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load_texts

SECOND = 1_000_000_000
WINDOWS = ("1 min", "5 min", "1 h")
READINGS, TURNS = 20_000, 6


def plant_of(window: str) -> Plant:
    """Return a plant of one tank without rules."""
    tank = TANK.format(n=0).split("actuators:", maxsplit=1)[0] + f"rise_over: {window}\n"
    texts = {"site.yaml": "site: bench\nbroker: {url: 'mqtt://127.0.0.1:1883'}\n", "tanks/0.yaml": tank}
    with tempfile.TemporaryDirectory() as folder:
        plant = Plant(plant_plan(load_texts(texts, Path(folder))))
    plant.meters.begin(0)
    return plant


def microseconds(plant: Plant, turn: int) -> float:
    """Return the microseconds a reading, one each second."""
    payloads = [b'{"hz": %d}' % (6000 + n * 37 % 1499) for n in range(READINGS)]
    meters, effects = plant.meters, list[Effect]()
    gc.disable()
    start = time.perf_counter()
    for n, payload in enumerate(payloads, turn * READINGS):
        t = n * SECOND
        meters.signals(t, t, meters.take(t, "bench/tank-0", payload, old=False, offset=0), effects)
    took = time.perf_counter() - start
    gc.enable()
    return took / READINGS * 1e6


def main() -> None:
    """Measure each window in turn, and print."""
    plants = [plant_of(window) for window in WINDOWS]
    turns = [[microseconds(plant, turn) for plant in plants] for turn in range(TURNS)][1:]
    for window, costs in zip(WINDOWS, zip(*turns, strict=True), strict=True):
        print(f"rise over {window}: {statistics.median(costs):.1f} us a reading")


if __name__ == "__main__":
    main()
