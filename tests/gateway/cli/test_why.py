"""`brimward why`: rule, condition, level, raw reading and time behind a state, now and at any time of the night."""

import json
from pathlib import Path

import pytest
from lived import copy_of, live, night, run

RULE = "condensate-drum.overflow shutoff"


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a site whose journal holds a night."""
    folder = copy_of("hill-dairy", tmp_path_factory.mktemp("site"))
    live(folder, night())
    return folder


def why(site: Path, *arguments: object) -> list[str]:
    """Return the answer's lines."""
    ran = run("why", site, *arguments)
    assert (ran.status, ran.err) == (0, "")
    return ran.out.splitlines()


def test_the_answer_comes_first_and_ends_at_the_raw_reading(site: Path) -> None:
    """State and since when; the rule; its condition; the level; the payload on its topic."""
    told = why(site, "cooling-unit")
    assert told[:4] == [
        "condensate-drum.cooling-unit is stopped since 2026-05-01 00:01:10.0.",
        f"  Trip rule '{RULE}' is in force.",
        "  Sent: `stopped` on dairy/cooling-unit/do at 2026-05-01 00:02:01.5 (told again after the link came back).",
        f"  '{RULE}' came into force at 2026-05-01 00:01:10.0:",
    ]
    (level,) = [line for line in told if line.strip().startswith("condensate-drum.level: ")]
    assert level.strip() == (
        "condensate-drum.level: 0.78 m ← condensate-drum.probe at 2026-05-01 00:01:10.0: 2971.8 Hz, "
        'payload `{"hz": 2971.8}` on dairy/condensate-drum/probe'
    )
    assert len(told) <= 24  # a screen


@pytest.mark.parametrize(
    ("at", "state", "since"),
    [
        ("2026-05-01 00:00:30", "running", "2026-05-01 00:00:03.0"),
        ("2026-04-30T22:01:09.999Z", "running", "2026-05-01 00:00:03.0"),
        ("2026-05-01T00:01:10+02:00", "stopped", "2026-05-01 00:01:10.0"),
        ("2026-05-01 00:02:00.5", "stopped", "2026-05-01 00:01:10.0"),
        ("2026-05-01 00:03", "stopped", "2026-05-01 00:01:10.0"),
        ("2026-05-01", "stopped", "2026-05-01 00:01:10.0"),
        ("2030-01-01", "stopped", "2026-05-01 00:01:10.0"),
    ],
)
def test_it_answers_for_any_time(site: Path, at: str, state: str, since: str) -> None:
    """As it was then: nothing of what came later shows."""
    told = why(site, "cooling-unit", "--at", at)
    assert told[0] == f"condensate-drum.cooling-unit is {state} since {since}."
    if state == "running":
        assert told[1] == "  No rule asks for anything, so it rests."
        assert told[-1] == f"  Rule '{RULE}' (trip, asks `stopped`) is out of force."


def test_it_answers_for_a_rule(site: Path) -> None:
    """In force since when, what it asks for, and on what grounds."""
    assert why(site, RULE)[:3] == [
        f"Rule '{RULE}' is in force since 2026-05-01 00:01:10.0.",
        "  A trip rule that asks condensate-drum.cooling-unit for `stopped`.",
        f"  '{RULE}' came into force at 2026-05-01 00:01:10.0:",
    ]
    assert why(site, RULE, "--at", "2026-05-01 00:00:30")[0] == f"Rule '{RULE}' is out of force."


def test_every_condition_is_told_when_asked_for(site: Path) -> None:
    """Also of rules that are out of force, each name with its value and reading."""
    told = "\n".join(why(site, "cooling-unit", "-v", "--at", "2026-05-01 00:00:30"))
    assert "from: ((condensate-drum.level above (condensate-drum.brim - 10 cm)) for 8 s) or" in told
    assert "until: (condensate-drum.level below 0.40 m) and (condensate-drum.float is dry) — false" in told
    assert "condensate-drum.float: dry ← condensate-drum.float at 2026-05-01 00:00:23.0: 0, payload `0`" in told


def test_what_is_not_known_is_said_to_be_so(site: Path) -> None:
    """The cistern's head never said a word: blind, so tripped once the grace of the start was over."""
    told = why(site, "transfer-pump")
    assert told[0] == "cistern.transfer-pump is off since 2026-05-01 00:01:00.0."
    assert "  Trip rule 'cistern.header full' is in force." in told
    assert any("cistern.level: unknown (silent)" in line for line in told)


def test_a_program_reads_json(site: Path) -> None:
    """One object; the state, the command, the change of the rule, and every rule with its truth."""
    (line,) = why(site, "condensate-drum.cooling-unit", "--json")
    facts = json.loads(line)
    assert line == json.dumps(facts, sort_keys=True, ensure_ascii=False)
    assert (facts["about"], facts["kind"], facts["state"]) == ("condensate-drum.cooling-unit", "actuator", "stopped")
    assert (facts["rule"], facts["rank"], facts["command"]["payload"]) == (RULE, "trip", "stopped")
    assert facts["rule_change"]["because"]["from"]["truth"] == "true"
    (line,) = why(site, RULE, "--json")
    assert json.loads(line)["in_force"] is True


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["overflow shutof"], "is no actuator or rule of this site; did you mean `wash-sump.overflow shutoff`?"),
        (["xyz"], "`xyz` is no actuator or rule of this site; known: cistern.transfer-pump, "),
        (["overflow shutoff"], "could be condensate-drum.overflow shutoff or wash-sump.overflow shutoff; type it in"),
        (["cooling-unit", "running"], "`why` with a state, why it was not in it, is not yet supported"),
        (["cooling-unit", "--at", "2026-04-30"], "the journal does not reach back to that time"),
        (["cooling-unit", "--at", "then"], "`then` is not a time"),
        ([], "ACTUATOR-OR-RULE"),
    ],
)
def test_what_cannot_be_answered_is_told_with_status_2(site: Path, arguments: list[str], said: str) -> None:
    """One sentence with what is meant or known."""
    ran = run("why", site, *arguments)
    assert (ran.status, ran.out) == (2, "")
    assert said in ran.err


def test_settings_that_changed_since_do_not_change_the_answer(tmp_path: Path) -> None:
    """A decision is explained by the settings it was made under, which the journal keeps."""
    site = copy_of("hill-dairy", tmp_path)
    live(site, night())
    before = why(site, "cooling-unit", "--at", "2026-05-01 00:01:30")
    drum = site / "tanks" / "condensate-drum.yaml"
    drum.write_text(drum.read_text("utf-8").replace("brim - 10 cm for 8 s", "brim - 2 cm for 60 s"), "utf-8")
    assert why(site, "cooling-unit", "--at", "2026-05-01 00:01:30") == before
