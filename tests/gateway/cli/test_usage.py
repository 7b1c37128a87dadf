"""Every command: help with an example, and bad usage or unreadable settings end in a sentence and status 2."""

import os
import subprocess
import sys
from pathlib import Path

import pytest
from lived import copy_of, live, night, run

from gateway.examples import example

COMMANDS = [
    ["check"], ["run"], ["demo"], ["listen"], ["convert"], ["calibrate"], ["record"], ["replay"], ["why"],
    ["journal", "list"],
]  # fmt: skip

# What each command needs after its site, and never gets to where the site cannot be used.
NEEDS = {
    "run": [],
    "listen": [],
    "convert": ["a.b", "1"],
    "calibrate": ["a.b"],
    "record": ["-o", "/nowhere/x"],
    "replay": ["--messages", "/dev/null"],
    "why": ["x"],
    "journal": [],
}


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
def test_every_command_helps_with_an_example(command: list[str]) -> None:
    """`--help` is status 0, and shows how it is typed."""
    ran = run(*command, "--help")
    assert (ran.status, ran.err) == (0, "")
    assert f"Example: brimward {' '.join(command)}" in " ".join(ran.out.split())


def test_the_list_of_commands_is_whole() -> None:
    """What `--help` lists is what is tried here."""
    text = run("--help").out.split("Commands:")[1]
    listed = {line.split()[0] for line in text.splitlines() if line.startswith("  ") and not line.startswith("   ")}
    assert listed == {command[0] for command in COMMANDS}


@pytest.mark.parametrize("command", [c for c in COMMANDS if c != ["demo"]], ids=" ".join)
def test_without_a_site_it_says_what_is_missing(command: list[str]) -> None:
    """Status 2 and the name of the argument."""
    ran = run(*command)
    assert (ran.status, ran.out) == (2, "")
    assert "SITE" in ran.err


@pytest.mark.parametrize("command", COMMANDS, ids=" ".join)
def test_an_option_that_does_not_exist_is_status_2(command: list[str]) -> None:
    """It is named."""
    ran = run(*command, example("first-tank"), "--no-such-option")
    assert (ran.status, ran.out) == (2, "")
    assert "--no-such-option" in ran.err


@pytest.mark.parametrize("command", [c for c in COMMANDS if c[0] in NEEDS], ids=" ".join)
def test_settings_that_cannot_be_used_are_told_with_status_2(command: list[str], tmp_path: Path) -> None:
    """A folder without a site, and a site with mistakes: each complaint at its place, on the error output."""
    rest = NEEDS[command[0]]
    ran = run(*command, tmp_path, *rest)
    assert (ran.status, ran.out) == (2, "")
    assert "there is no site.yaml here" in ran.err
    (tmp_path / "site.yaml").write_text("site: a\nbroker: {url: x}\nbrokre: 1\n", "utf-8")
    ran = run(*command, tmp_path, *rest)
    assert (ran.status, ran.out) == (2, "")
    assert [line.split(": ")[0] for line in ran.err.splitlines()] == ["site.yaml:2:15", "site.yaml:3:1"]


@pytest.mark.parametrize("arguments", [["frobnicate"], ["journal", "frobnicate"], ["--frobnicate"]])
def test_a_command_that_does_not_exist_is_status_2(arguments: list[str]) -> None:
    """Also within a group."""
    ran = run(*arguments)
    assert ran.status == 2
    assert "frobnicate" in ran.err


@pytest.mark.parametrize("text", ["soon", "10", "5 m", "", "1e999 s"])
def test_a_length_of_time_has_a_unit(text: str, tmp_path: Path) -> None:
    """`--for 10` could be anything."""
    ran = run("record", example("first-tank"), "-o", tmp_path / "x", "--for", text)
    assert (ran.status, ran.out) == (2, "")
    assert f"`{text}`" in ran.err
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    "arguments", [["journal", "list", "--kind", "reading"], ["replay", "--messages", "t.jsonl"]], ids=" ".join
)
def test_a_reader_that_has_seen_enough_is_no_trouble(tmp_path: Path, arguments: list[str]) -> None:
    """`brimward journal list … | head -1` ends quietly, also where the output is short; never with status 2."""
    site = copy_of("hill-dairy", tmp_path)
    live(site, night())
    messages = [
        f'{{"at": "2026-05-01T10:00:{second}Z", "topic": "dairy/cistern/mm", "payload": "900"}}\n'
        for second in range(10, 60)
    ]
    (tmp_path / "t.jsonl").write_text("".join(messages), "utf-8")
    split = 1 if arguments[0] == "replay" else 2
    command = [sys.executable, "-c", "from gateway.cli import main; main()"]
    command += [*arguments[:split], str(site), *arguments[split:]]
    receiving, sending = os.pipe()
    os.close(receiving)
    with os.fdopen(sending, "w") as pipe:
        ended = subprocess.run(
            command, stdout=pipe, stderr=subprocess.PIPE, text=True, check=False, timeout=60, cwd=tmp_path
        )
    assert ended.stderr == ""
    assert ended.returncode in {0, 1}
