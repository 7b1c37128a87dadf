"""Messages a second at QoS 1: a bare subscriber (a), a script with a database (b), the whole gateway (c).

All on one kind of broker with unlimited in-flight, in turn, several rounds in one run; ratios of medians are the
result.
Run: `python tests/bench/throughput.py [COUNT] [ROUNDS]`.
"""

import statistics
import subprocess
import sys
from pathlib import Path

from gateway.testing import Mosquitto

HERE = Path(__file__).parent
TANKS = 10
TOPICS = [f"bench/tank-{n}" for n in range(TANKS)]


def measured(program: list[str], port: int, count: int) -> float:
    """Return how many messages a second a program deals with."""
    with subprocess.Popen([sys.executable, *program], stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        assert (said := child.stdout.readline().strip()) == "ready", (program, said)
        subprocess.run([sys.executable, str(HERE / "blaster.py"), str(port), str(count), "0", *TOPICS], check=True)
        return count / float(child.stdout.readline())


def rounds(count: int, times: int) -> dict[str, list[float]]:
    """Return the figures of each program, round by round; each has a broker to itself, all of one configuration."""
    programs = {
        "bare": (["subscribers.py", "bare"], count),
        "script": (["subscribers.py", "script"], count // 5),  # slow; a fifth is enough to see how slow
        "gateway": (["gateway_under_load.py"], count),
    }
    figures: dict[str, list[float]] = {name: [] for name in programs}
    for _ in range(times):
        for name, ((file, *words), share) in programs.items():
            with Mosquitto() as broker:
                program = [str(HERE / file), *words, str(broker.port), str(share)]
                figures[name].append(measured([*program, str(TANKS)], broker.port, share))
    return figures


def main() -> None:
    """Measure and print."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 30_000
    times = int(sys.argv[2]) if len(sys.argv) > 2 else 3
    figures = rounds(count, times)
    middle = {name: statistics.median(values) for name, values in figures.items()}
    for name, values in figures.items():
        print(f"{name:8} {middle[name]:9.0f}/s   ({min(values):.0f} to {max(values):.0f})")
    print(f"gateway against bare:   {middle['gateway'] / middle['bare']:.2f}")
    print(f"gateway against script: {middle['gateway'] / middle['script']:.2f}")


if __name__ == "__main__":
    main()
