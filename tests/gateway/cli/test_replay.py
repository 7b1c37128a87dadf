"""`brimward replay`: a trace through the site's rules in virtual time, with the commands at their exact times."""

import json
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from lived import run

from gateway.examples import example

HEAD = "shed/rain-tank/mm"


def trace(path: Path, *lines: tuple[str, str] | str) -> Path:
    """Write a trace of readings of the rain tank's head (clock of 2026-05-01 UTC, payload); a bare clock ends it."""
    with path.open("w", encoding="utf-8") as file:
        for line in lines:
            clock, payload = line if isinstance(line, tuple) else (line, None)
            found: dict[str, Any] = {"at": f"2026-05-01T{clock}Z"}
            if payload is not None:
                found |= {"topic": HEAD, "payload": payload}
            file.write(json.dumps(found) + "\n")
    return path


def replayed(path: Path, *options: object) -> list[dict[str, Any]]:
    """Return the records of a replay of the smallest example."""
    ran = run("replay", example("first-tank"), "--messages", path, *options)
    assert (ran.status, ran.err) == (0, "")
    return [json.loads(line) for line in ran.out.splitlines()]


def rule(clock: str, name: str, *, in_force: bool) -> dict[str, Any]:
    """Return the record of a rule that comes into force or leaves it."""
    return {
        "at": f"2026-05-01T{clock}Z",
        "record": "rule",
        "rule": f"rain-tank.{name}",
        "in_force": in_force,
        "latched": False,
    }


def command(clock: str, state: str, rank: str, name: str | None) -> dict[str, Any]:
    """Return the record of a command to the inlet."""
    return {
        "at": f"2026-05-01T{clock}Z",
        "record": "command",
        "actuator": "rain-tank.inlet",
        "state": state,
        "topic": "shed/rain-tank/inlet",
        "payload": state,
        "rule": None if name is None else f"rain-tank.{name}",
        "rank": rank,
    }


# The head stands 1.75 m above the bottom, the brim is 1.50 m: `fill` from below 0.90 m until above 1.20 m; the shutoff
# from above 1.40 m for 5 s until below 1.30 m. Silence counts after three times 10 s. What each line leads to follows
# from the rules as they are written, by hand.
STORY: list[tuple[str, str] | str] = [
    ("10:00:00.000", "1250"),  # 0.50 m: filled
    ("10:00:10.000", "500"),  # 1.25 m: enough
    ("10:00:20.000", "340"),  # 1.41 m, five seconds later still: tripped
    ("10:00:30.000", "349"),  # 1.401 m
    ("10:00:40.000", "460"),  # 1.29 m: back
    ("10:00:45.000", "rubbish"),  # tolerated
    ("10:00:50.000", "900"),  # 0.85 m: filled
    "10:02:00.000",  # nothing more: silent from 10:01:20 on, the shutoff's 5 s later, tolerated for 20 s
]
TOLD = [
    rule("10:00:00.000", "fill", in_force=True),
    command("10:00:00.000", "open", "auto", "fill"),
    rule("10:00:10.000", "fill", in_force=False),
    command("10:00:10.000", "closed", "rest", None),
    rule("10:00:25.000", "overflow shutoff", in_force=True),
    rule("10:00:40.000", "overflow shutoff", in_force=False),
    rule("10:00:50.000", "fill", in_force=True),
    command("10:00:50.000", "open", "auto", "fill"),
    rule("10:01:20.000", "fill", in_force=False),
    command("10:01:20.000", "closed", "safe", None),
    rule("10:01:45.000", "overflow shutoff", in_force=True),
]


def test_a_trace_gives_the_commands_that_the_rules_ask_for(tmp_path: Path) -> None:
    """Each at its time, in JSON Lines with the keys of the contract; keys sorted, times in UTC with milliseconds."""
    path = trace(tmp_path / "t.jsonl", *STORY)
    assert replayed(path) == TOLD
    ran = run("replay", example("first-tank"), "--messages", path)
    assert ran.out.splitlines() == [json.dumps(one, sort_keys=True) for one in TOLD]


def test_values_are_told_when_asked_for(tmp_path: Path) -> None:
    """Level, volume and status of every reading, between the same commands."""
    records = replayed(trace(tmp_path / "t.jsonl", *STORY), "--values")
    values = [one for one in records if one["record"] == "value"]
    assert [one for one in records if one["record"] != "value"] == TOLD
    assert values[0] == {
        "at": "2026-05-01T10:00:00.000Z",
        "record": "value",
        "tank": "rain-tank",
        "level_m": 0.5,
        "volume_l": 565.487,  # 0.5 m of a circle of 1.20 m: 0.5·π·0.36 m3
        "flow_l_s": None,
        "status": "good",
    }
    assert values[-1] == values[0] | {
        "at": "2026-05-01T10:01:20.000Z", "level_m": None, "volume_l": None, "status": "failure",
    }  # fmt: skip


def test_the_output_may_go_to_a_file(tmp_path: Path) -> None:
    """The same lines, and nothing on the screen."""
    path, output = trace(tmp_path / "t.jsonl", *STORY), tmp_path / "out.jsonl"
    ran = run("replay", example("first-tank"), "--messages", path, "-o", output)
    assert ran == (0, "", "")
    assert [json.loads(line) for line in output.read_text("utf-8").splitlines()] == TOLD


def test_blank_lines_other_zones_and_foreign_topics_are_no_trouble(tmp_path: Path) -> None:
    """A time is an instant, whatever its zone; what nobody listens to moves nothing."""
    path = tmp_path / "t.jsonl"
    path.write_text(
        f'{{"at": "2026-05-01T12:00:00+02:00", "topic": "{HEAD}", "payload": "1250"}}\n\n'
        '{"at": "2026-05-01T10:00:01Z", "topic": "else", "payload": "\\ud800"}\n',
        "utf-8",
    )
    assert replayed(path) == TOLD[:2]


def test_an_empty_trace_does_nothing(tmp_path: Path) -> None:
    """There is no time at which anything could start."""
    assert replayed(trace(tmp_path / "t.jsonl")) == []


STORMY = [
    ("dairy/condensate-drum/probe", ['{"hz": 9000}', '{"hz": 2600}', "rubbish"]),
    ("dairy/condensate-drum/float", ["0", "1", "0"]),
    ("dairy/wash-sump/ma", ['{"current": {"ma": 19}}', '{"current": {"ma": 5}}', "{}"]),
    ("dairy/wash-sump/float", ["0", "1", "0"]),
    ("dairy/wash-sump/alive", ["1", "1", "0"]),
    ("dairy/header-tank/pf", ["300", "2300", "1500"]),
    ("dairy/cistern/mm", ["600", "1900", "1000"]),
]


@pytest.mark.parametrize("turned", [False, True])
@pytest.mark.parametrize("seed", ["1", "2", "77"])
def test_invariant_24_a_replay_is_equal_to_the_byte_whatever_the_hashes_and_the_files_order(
    seed: str, tmp_path: Path, *, turned: bool
) -> None:
    """The order in which the tanks' files were made, or the hashes of a process, move nothing."""
    path = tmp_path / "storm.jsonl"
    with path.open("w", encoding="utf-8") as file:
        for second in range(0, 600, 3):
            for topic, payloads in STORMY:
                at = f"2026-05-01T10:{second // 60:02}:{second % 60:02}Z"
                said = {"at": at, "topic": topic, "payload": payloads[second // 60 % 3]}
                file.write(json.dumps(said) + "\n")
    given = example("hill-dairy")
    site = tmp_path / "site"
    (site / "tanks").mkdir(parents=True)
    for source in sorted(given.rglob("*.yaml"), reverse=turned):
        shutil.copyfile(source, site / source.relative_to(given))
    command: list[str | Path] = [
        sys.executable,
        "-c",
        "from gateway.cli import main; main()",
        "replay",
        site,
        "--messages",
        path,
    ]
    told = [
        subprocess.run([*command, "--values"], env={"PYTHONHASHSEED": seed}, capture_output=True, check=True).stdout,
        run("replay", given, "--messages", path, "--values").out.encode(),
    ]
    assert told[0] == told[1]
    assert told[0].count(b'"command"') > 10


GOOD = '{"at": "2026-05-01T10:00:00Z", "topic": "a", "payload": "1"}\n'


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ("nonsense", "this line is not JSON"),
        ("[1]", "expected a line such as"),
        ('{"topic": "a", "payload": "1"}', "expected a line such as"),
        ('{"at": 5}', "expected a line such as"),
        ('{"at": "today"}', "`today` is not a time such as"),
        ('{"at": "2026-05-01T10:00:00"}', "does not say in which zone it is"),
        ('{"at": "0001-01-01T00:00:00+23:59"}', "is before the year 1970 or after 2261"),
        ('{"at": "9999-12-31T23:59:59-23:59"}', "is before the year 1970 or after 2261"),
        ('{"at": "2026-05-01T09:59:59Z"}', "this is earlier than the line before"),
        ('{"at": "2026-05-01T10:00:00Z", "topic": 5, "payload": "1"}', "`topic` and `payload` are text"),
        ('{"at": "2026-05-01T10:00:00Z", "topic": "a", "payload": 1}', "`topic` and `payload` are text"),
        ('{"at": "2026-05-01T10:00:00Z", "act": "hand", "on": "x"}', "acts of operators are not yet supported"),
        ("[" * 100_000, "this line is not JSON"),
        ('{"at": "' + "x" * 1_000_000 + '"}', "the line is too long"),
    ],
)
def test_a_line_that_cannot_be_used_is_told_by_its_number(tmp_path: Path, line: str, said: str) -> None:
    """File and line, and status 2; what came before has been told."""
    path = tmp_path / "t.jsonl"
    path.write_text(GOOD + line + "\n", "utf-8")
    ran = run("replay", example("first-tank"), "--messages", path)
    assert ran.status == 2
    assert f"{path}:2: " in ran.err
    assert said in ran.err


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ([], "replay of the journal is not yet supported; name a trace with --messages FILE"),
        (["--messages", "nowhere.jsonl"], "nowhere.jsonl: cannot be read: No such file or directory"),
        (["--messages", "/"], "/: cannot be read: Is a directory"),
        (["--messages", "/dev/null", "-o", "/nowhere/out"], "/nowhere/out: cannot be written"),
    ],
)
def test_files_that_cannot_be_used_are_told_by_name(arguments: list[str], said: str) -> None:
    """Status 2, one sentence."""
    ran = run("replay", example("first-tank"), *arguments)
    assert (ran.status, ran.out) == (2, "")
    assert said in ran.err
