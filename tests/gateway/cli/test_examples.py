"""A day in each example, from raw values that the physics of its sensors gives, to the commands that its rules give."""

import json
import math
from collections.abc import Callable, Iterator
from itertools import pairwise
from pathlib import Path
from typing import Any

import pytest
from lived import run

from gateway.examples import example

CELSIUS_20 = 293.15
Line = dict[str, Any]


def coolant(level: float) -> list[tuple[str, str]]:
    """Return what the coated rod sends: t = C·V/I, the wet part by its coating, the dry part in series with the air.

    Source: coaxial capacitors, any text on electromagnetism; 30 pF of stray capacitance beside the probe.
    """
    epsilon_0, wet_length = 8.8541878188e-12, level - 0.01
    coating = 2 * math.pi * epsilon_0 * 2.1 / math.log(6 / 4)
    air = 2 * math.pi * epsilon_0 / math.log(60 / 6)
    dry = coating * air / (coating + air)
    farad = coating * wet_length + dry * (0.40 - wet_length) + 30e-12
    return [("mill/sump/us", f"{farad * 2.0 / 10e-6 * 1e6:.4f}")]


def echo(level: float) -> list[tuple[str, str]]:
    """Return what the head sends at 20 °C: t = 2·d/c. Source: ISO 9613-1, 343.2 m/s."""
    return [("greenhouse/reservoir/echo", json.dumps({"us": round(2 * (1.45 - level) / 343.2 * 1e6, 2)}))]


def milliamperes(level: float) -> list[tuple[str, str]]:
    """Return what three transmitters of 0 to 2.20 m send, the third of them stuck at 0.11 m."""
    right = f"{4 + 16 * level / 2.2:.4f}"
    return [("roof/header/a", right), ("roof/header/b", right), ("roof/header/c", "4.8"), ("roof/header/float", "0")]


def hectopascals(level: float) -> list[tuple[str, str]]:
    """Return what the probe sends in water of 20 °C, 998.2072 kg/m3 (IAPWS), under 1013.25 hPa."""
    pressure = 1013.25 + 998.2072 * 9.80665 * (level - 0.05) / 100
    return [("yard/air/hpa", "1013.25"), ("yard/cistern/celsius", "20"), ("yard/cistern/hpa", f"{pressure:.4f}")]


SAYS: dict[str, Callable[[float], list[tuple[str, str]]]] = {
    "coolant-sump": coolant,
    "nutrient-reservoir": echo,
    "roof-tank": milliamperes,
    "lying-cistern": hectopascals,
}
# Levels in m at minutes, straight lines between them; and the commands that follow, with the level at which each comes.
STORIES: dict[str, tuple[list[tuple[int, float]], list[tuple[str, str, float]]]] = {
    "coolant-sump": (
        [(0, 0.25), (10, 0.15), (30, 0.35), (31, 0.30), (60, 0.10), (70, 0.10)],
        [
            ("barrel-pump", "off", 0.25), ("coolant-pump", "on", 0.25), ("barrel-pump", "on", 0.195),
            ("barrel-pump", "off", 0.32), ("barrel-pump", "on", 0.196), ("coolant-pump", "off", 0.109),
        ],
    ),
    "nutrient-reservoir": (
        [(0, 0.80), (20, 0.40), (60, 1.00), (80, 0.15), (90, 0.15)],
        [
            ("dosing-pump", "off", 0.80), ("fill-valve", "shut", 0.785), ("fill-valve", "open", 0.43),
            ("fill-valve", "shut", 0.935), ("fill-valve", "open", 0.42),
        ],
    ),
    "roof-tank": (
        [(0, 1.50), (20, 0.80), (50, 1.85), (60, 1.60)],
        [("lift-pump", "off", 1.5), ("lift-pump", "on", 0.994), ("lift-pump", "off", 1.6)],
    ),
    "lying-cistern": (
        [(0, 0.80), (20, 0.21), (50, 1.10)],
        [
            ("house-pump", "on", 0.8), ("mains-refill", "shut", 0.8), ("mains-refill", "open", 0.27),
            ("house-pump", "off", 0.226), ("house-pump", "on", 0.29), ("mains-refill", "shut", 0.405),
        ],
    ),
}  # fmt: skip


def level_at(story: list[tuple[int, float]], second: int) -> float:
    """Return the level of a story at a second."""
    for (begin, low), (end, high) in pairwise(story):
        if second <= end * 60:
            return low + (high - low) * (second - begin * 60) / ((end - begin) * 60)
    return story[-1][1]


def trace_of(name: str) -> Iterator[Line]:
    """Yield the lines of a trace: each sensor every five seconds."""
    story = STORIES[name][0]
    for second in range(0, story[-1][0] * 60, 5):
        at = f"2026-05-01T{10 + second // 3600:02}:{second // 60 % 60:02}:{second % 60:02}Z"
        if name == "nutrient-reservoir" and second % 60 == 0:
            payload = json.dumps({"celsius": 20.0, "ts": 1_777_629_600 + second})
            yield {"at": at, "topic": "greenhouse/reservoir/air", "payload": payload}
        for topic, payload in SAYS[name](level_at(story, second)):
            yield {"at": at, "topic": topic, "payload": payload}


@pytest.mark.parametrize("name", SAYS)
def test_the_example_checks_and_its_day_gives_the_commands_that_its_rules_ask_for(name: str, tmp_path: Path) -> None:
    """In this order, each at about this level: within 2 cm, for the delays, the lag and the five seconds."""
    assert run("check", "--strict", example(name)).out.endswith("all of it can be used\n")
    path = tmp_path / "day.jsonl"
    path.write_text("".join(json.dumps(line) + "\n" for line in trace_of(name)), "utf-8")
    ran = run("replay", example(name), "--messages", path)
    assert (ran.status, ran.err) == (0, "")
    commands = [one for one in map(json.loads, ran.out.splitlines()) if one["record"] == "command"]
    story, expected = STORIES[name]
    told = [(one["actuator"].partition(".")[2], one["state"], _level_then(story, one["at"])) for one in commands]
    assert [one[:2] for one in told] == [one[:2] for one in expected], told
    for (_, _, level), (_, _, wanted) in zip(told, expected, strict=True):
        assert level == pytest.approx(wanted, abs=0.02)


def _level_then(story: list[tuple[int, float]], at: str) -> float:
    hours, minutes, seconds = at[11:23].split(":")
    return level_at(story, round((int(hours) - 10) * 3600 + int(minutes) * 60 + float(seconds)))
