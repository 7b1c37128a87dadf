"""`brimward journal list`: the audit trail of a night, for people and for programs."""

import json
from pathlib import Path

import pytest
from lived import copy_of, live, night, run

from gateway.cli.journal import _of_effect
from gateway.journal.records import EffectRow

UNIT = "condensate-drum.cooling-unit"


@pytest.fixture(scope="module")
def site(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a site whose journal holds a night."""
    folder = copy_of("hill-dairy", tmp_path_factory.mktemp("site"))
    live(folder, night())
    return folder


def lines(site: Path, *options: object) -> list[str]:
    """Return what is listed."""
    ran = run("journal", "list", site, *options)
    assert (ran.status, ran.err) == (0, "")
    return ran.out.splitlines()


def test_people_read_what_happened_newest_last_in_the_sites_zone(site: Path) -> None:
    """The shutoff of the drum: eight seconds after the first high reading, which came at 00:01:02."""
    told = lines(site, "--actuator", "cooling-unit")
    assert told == [
        f"2026-05-01 00:00:03.0  command  {UNIT} → running: no rule asks for anything, so it rests",
        "2026-05-01 00:01:10.0  rule     'condensate-drum.overflow shutoff' comes into force",
        f"2026-05-01 00:01:10.0  command  {UNIT} → stopped: trip rule 'condensate-drum.overflow shutoff' is in force",
        (
            f"2026-05-01 00:02:01.5  command  {UNIT} → stopped, told again: "
            "trip rule 'condensate-drum.overflow shutoff' is in force"
        ),
    ]


def test_what_the_gateway_itself_did_is_listed(site: Path) -> None:
    """Start, link and stop, with reasons."""
    assert lines(site, "--kind", "gateway") == [
        "2026-05-01 00:00:00.0  gateway  the gateway has started",
        "2026-05-01 00:00:01.0  gateway  the link is proven",
        "2026-05-01 00:02:00.0  gateway  the link is lost: nothing has come for 5 s",
        "2026-05-01 00:02:01.5  gateway  the link is proven",
        "2026-05-01 00:03:00.0  gateway  the gateway has stopped",
    ]


def test_readings_are_listed_when_asked_for(site: Path) -> None:
    """As they came, printable whatever they hold, with the marks that they carried."""
    told = lines(site, "--kind", "reading", "--tank", "condensate-drum", "--from", "00:01:30", "--to", "00:01:31")
    assert told == []  # a clock alone is of the last day, and that night is long ago
    told = lines(site, "--kind", "reading", "--from", "2026-05-01 00:01:30", "--to", "2026-05-01 00:01:31")
    assert [line.split("  ")[1:3] for line in told] == [["reading", "dairy/condensate-drum/probe"]] * 3
    assert "rubbish" in told[1]
    assert told[2].endswith("(retained)")
    assert all(line.isprintable() for line in told)
    assert not any("wash-sump" in line for line in lines(site, "--kind", "reading"))


def test_a_program_reads_json_lines_in_utc(site: Path) -> None:
    """One object a line, keys sorted, times in UTC with milliseconds, the same rows as people see."""
    told = lines(site, "--json", "--actuator", UNIT, "--kind", "command")
    records = [json.loads(line) for line in told]
    assert told == [json.dumps(record, sort_keys=True, ensure_ascii=False) for record in records]
    assert [(one["at"], one["record"], one["about"], one["state"], one["again"]) for one in records] == [
        ("2026-04-30T22:00:03.000Z", "command", UNIT, "running", False),
        ("2026-04-30T22:01:10.000Z", "command", UNIT, "stopped", False),
        ("2026-04-30T22:02:01.500Z", "command", UNIT, "stopped", True),
    ]
    assert len(lines(site, "--json")) == len(lines(site))


@pytest.mark.parametrize(
    ("options", "count"),
    [
        (["--limit", "2"], 2),
        (["--limit", "2", "--kind", "reading"], 2),
        (["--limit", "0", "--kind", "gateway"], 5),
        (["--from", "2026-05-01 00:02", "--kind", "gateway"], 3),
        (["--from", "2026-04-30T22:02:00Z", "--kind", "gateway"], 3),
        (["--from", "2026-05-01T00:02:00+02:00", "--to", "2026-05-01 00:02:00", "--kind", "gateway"], 1),
        (["--to", "2026-05-01 00:02", "--kind", "gateway"], 4),
        (["--to", "2026-05-01", "--kind", "gateway"], 5),
        (["--to", "2026-04-30", "--kind", "gateway"], 0),
        (["--from", "2026-05-02"], 0),
        (["--tank", "header-tank", "--kind", "command"], 0),
    ],
)
def test_what_is_listed_can_be_narrowed(site: Path, options: list[str], count: int) -> None:
    """By kind, tank, time and number; a time is of the site's zone unless it says another, and as long as written."""
    assert len(lines(site, *options)) == count


def test_the_newest_are_kept_when_there_are_too_many(site: Path) -> None:
    """And they stay in the order of time."""
    assert lines(site, "--limit", "3") == lines(site)[-3:]


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (
            ["--kind", "weather"],
            "`weather` is no kind; known: command, reason, rule, sensor, volumes, pump flow, note, gateway, reading",
        ),
        (["--tank", "vat"], "`vat` is no tank of this site; known: cistern, condensate-drum, header-tank, wash-sump"),
        (
            ["--actuator", "coolin-unit"],
            "`coolin-unit` is no actuator of this site; did you mean `condensate-drum.cooling-unit`?",
        ),
        (["--actuator", "heater"], "`heater` is no actuator of this site; known: cistern.transfer-pump, "),
        (["--from", ""], "`` is not a time"),
        (["--from", "yesterday"], "`yesterday` is not a time; expected one such as `2026-05-01 03:12` or `03:12`"),
        (["--from", "25:00"], "`25:00` is not a time"),
        (["--to", "2026-02-30"], "`2026-02-30` is not a time"),
        (["--to", "9999-12-31"], "`9999-12-31` is before the year 1970 or after 2261"),
        (["--from", "0001-01-01T00:00:00+23:00"], "is before the year 1970 or after 2261"),
        (["--limit", "-1"], "--limit"),
        (["--limit", "99999999999999999999"], "--limit"),
        (["--limit", "few"], "--limit"),
    ],
)
def test_what_cannot_be_listed_is_told_with_status_2(site: Path, options: list[str], said: str) -> None:
    """One sentence with what is known, never a traceback."""
    ran = run("journal", "list", site, *options)
    assert (ran.status, ran.out) == (2, "")
    assert said in ran.err
    assert "Traceback" not in ran.err


def test_without_a_journal_it_is_told_how_one_begins(tmp_path: Path) -> None:
    """And none is made by asking."""
    site = copy_of("first-tank", tmp_path)
    ran = run("journal", "list", site)
    assert (ran.status, ran.out) == (2, "")
    assert "there is no journal yet; `brimward run` begins one" in ran.err
    assert not (site / "var").exists()


def test_a_damaged_journal_is_told(tmp_path: Path) -> None:
    """Its file is named."""
    site = copy_of("first-tank", tmp_path)
    (site / "var").mkdir()
    (site / "var" / "journal.db").write_bytes(b"SQLite format 3\x00" + b"\xff" * 5_000)
    for command in (["journal", "list", site], ["why", site, "inlet"]):
        ran = run(*command)
        assert (ran.status, ran.out) == (2, "")
        assert "journal.db: the journal cannot be read: " in ran.err


def test_volumes_and_a_pumps_own_flow_are_told_in_litres() -> None:
    """Each with its tank or pump."""
    volumes = {"period": "hour", "name": "2026-05-01T12+0200", "into": 0.36, "out": 0.1, "spilled": 0.0}
    rows = [
        EffectRow(1, 1, 1, "volumes", "sump", volumes),
        EffectRow(1, 1, 1, "pump flow", "sump.pump", {"flow": 0.0031}),
    ]
    assert [_of_effect(row)[2] for row in rows] == [
        "volumes  sump hour 2026-05-01T12+0200: 360 l in, 100 l out, 0 l spilled",
        "pump     sump.pump took 3.1 l/s in this run",
    ]
