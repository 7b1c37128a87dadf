"""`brimward check`: what is wrong, what is risky, and the exit status that says which."""

from pathlib import Path

import pytest
from lived import copy_of, run

from gateway.examples import example


@pytest.mark.parametrize("name", ["first-tank", "hill-dairy"])
@pytest.mark.parametrize("options", [[], ["--strict"], ["-v"], ["--strict", "--verbose"]])
def test_the_examples_pass(name: str, options: list[str]) -> None:
    """Nothing is wrong with them, and nothing risky; by their folder and by their `site.yaml`."""
    for path in (example(name), example(name) / "site.yaml"):
        ran = run("check", path, *options)
        assert (ran.status, ran.err) == (0, "")
        assert ran.out.startswith(f"{name}: ")
        assert "all of it can be used" in ran.out
        assert "risky" not in ran.out


def test_every_rule_is_printed_in_full_when_asked_for() -> None:
    """With all brackets, so that nobody is in doubt how a sentence was read."""
    assert run("check", example("first-tank"), "-v").out.splitlines()[1:] == [
        "  rain-tank.fill: auto → rain-tank.inlet open",
        "    from  rain-tank.level below 60 %",
        "    until rain-tank.level above 80 %",
        "  rain-tank.overflow shutoff: trip → rain-tank.inlet closed",
        "    from  (rain-tank.level above (rain-tank.brim - 10 cm)) for 5 s",
        "    until rain-tank.level below 1.30 m",
    ]


def test_mistakes_are_the_answer_and_end_with_status_1(tmp_path: Path) -> None:
    """All of them, each at its place, on standard output; it ran, and the answer is bad."""
    site = copy_of("first-tank", tmp_path)
    tank = site / "tanks" / "rain-tank.yaml"
    text = tank.read_text("utf-8").replace("brim: 1.50 m", "brim: 1.50").replace("level: head", "levle: head")
    tank.write_text(text, "utf-8")
    ran = run("check", site)
    assert (ran.status, ran.err) == (1, "")
    assert ran.out.splitlines() == [
        "tanks/rain-tank.yaml:7:7: `1.5` needs a unit; expected a length such as `1.40 m`",
        "tanks/rain-tank.yaml:18:1: `levle` is not known here; did you mean `level`?",
        "2 complaints; nothing of it can be used yet",
    ]


RISKS = [
    ("url: mqtt://127.0.0.1:1883", "url: mqtt://broker.example", "broker broker.example: not encrypted"),
    ("url: mqtt://127.0.0.1:1883", "url: mqtts://broker.example", "no user name and no certificate"),
    ("url: mqtt://127.0.0.1:1883", "url: embedded", "the embedded broker is for trials"),
    ("    safe: closed\n", "", "rain-tank.inlet: `safe` is not written, so it is `closed`, its rest"),
    ("topic: shed/rain-tank/inlet}", "topic: shed/rain-tank/inlet, qos: 0}", "commands at qos 0 can be lost"),
    (
        "topic: shed/rain-tank/inlet}",
        "topic: shed/rain-tank/inlet, retain: true}",
        "reaches a device that comes back days",
    ),
    (
        "    expect_every: 10 s\n",
        "    expect_every: 10 s\n    silent_after: 2 s\n",
        "rain-tank.head: counts as silent after 2 s, though it sends every 10 s",
    ),
    ("    until: level above 80 %\n", "", "'rain-tank.fill': no `until`, so no dead band"),
    ("if_unknown: act", "if_unknown: release", "a trip that releases when it cannot be decided protects nothing"),
    ("level above brim - 10 cm", "level above brim + 5 cm", "is 0.05 m above the brim; it comes after the spill"),
]


@pytest.mark.parametrize(("old", "new", "risk"), RISKS)
def test_what_is_risky_is_told_and_is_status_1_only_when_strict(tmp_path: Path, old: str, new: str, risk: str) -> None:
    """Each with its reason."""
    site = copy_of("first-tank", tmp_path)
    for path in (site / "site.yaml", site / "tanks" / "rain-tank.yaml"):
        path.write_text(path.read_text("utf-8").replace(old, new), "utf-8")
    ran, strict = run("check", site), run("check", site, "--strict")
    assert (ran.status, strict.status) == (0, 1)
    assert ran.out == strict.out
    risky = [line for line in ran.out.splitlines() if line.startswith("risky: ")]
    assert any(risk in line for line in risky), ran.out


def test_an_actuator_that_no_rule_moves_is_told(tmp_path: Path) -> None:
    """Perhaps a rule was forgotten."""
    site = copy_of("first-tank", tmp_path)
    tank = site / "tanks" / "rain-tank.yaml"
    text = tank.read_text("utf-8").replace("rules:\n", "  lamp: {command: {topic: shed/lamp}}\n\nrules:\n")
    tank.write_text(text, "utf-8")
    assert "risky: rain-tank.lamp: no rule asks anything of it" in run("check", site).out


def test_a_tank_without_sensors_counts_as_a_tank(tmp_path: Path) -> None:
    """What is counted are the tanks that were written."""
    site = copy_of("first-tank", tmp_path)
    (site / "tanks" / "vat.yaml").write_text("tank: vat\n", "utf-8")
    assert run("check", site).out.startswith("first-tank: 2 tanks, 1 sensor, 1 actuator, 2 rules;")


def test_a_folder_that_cannot_be_read_is_status_2(tmp_path: Path) -> None:
    """It could not run."""
    ran = run("check", tmp_path / "nowhere")
    assert (ran.status, ran.out) == (2, "")
    assert "there is no site.yaml here; a site is a folder that holds one" in ran.err


def test_a_probe_in_a_liquid_that_is_neither_conductor_nor_insulator_is_risky(tmp_path: Path) -> None:
    """Neither of the two models holds; a calibration does."""
    site = copy_of("coolant-sump", tmp_path)
    tank = site / "tanks" / "sump.yaml"
    tank.write_text(tank.read_text("utf-8").replace("conductivity: 0.3 S/m", "conductivity: 0.00004 S/m"), "utf-8")
    told = [line for line in run("check", site).out.splitlines() if line.startswith("risky: sump.rod: ")]
    assert len(told) == 1
    assert "calibrat" in told[0]


def test_what_a_probes_dimensions_come_to_is_told() -> None:
    """Its ends, its slope, and which of the two models applies."""
    told = run("check", "-v", example("coolant-sump")).out.splitlines()
    assert told[1].startswith("  sump.rod: ")
    assert told[1].endswith("pF/mm; the liquid conducts, so the coating alone counts")
