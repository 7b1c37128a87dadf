"""`brimward convert`: what a raw value reads as, for people and for programs."""

import json
from pathlib import Path

import pytest
from typer.testing import CliRunner

from gateway.cli import app, main

SITE = Path(__file__).parents[3] / "config_examples" / "hill-dairy"


def told(*arguments: str) -> tuple[int, str]:
    """Return the exit status and what is printed."""
    result = CliRunner().invoke(app, ["convert", str(SITE), *arguments])
    return result.exit_code, result.output


def refused(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[object, str]:
    """Return the exit status of the whole program, and what it says on its error output."""
    monkeypatch.setattr("sys.argv", ["brimward", "convert", str(SITE), *arguments])
    with pytest.raises(SystemExit) as ended:
        main()
    return ended.value.code, capsys.readouterr().err


def test_a_program_reads_a_list_with_one_object_a_raw_value() -> None:
    """The keys are a contract; 1240 mm below a head at 2.05 m is 0.81 m, of a tank of 2.0 m by 1.2 m."""
    status, text = told("cistern.head", "1240", "99", "--json")
    assert status == 0
    assert json.loads(text) == [
        {"raw": 1240, "level_m": 0.81, "percent": 47.647, "volume_l": 1944.0, "status": "good", "reason": None},
        {
            "raw": 99,
            "level_m": None,
            "percent": None,
            "volume_l": None,
            "status": "failure",
            "reason": "99 mm is outside the range of 250 to 2100",
        },
    ]


@pytest.mark.parametrize(
    ("sensor", "typed", "raw"),
    [
        ("condensate-drum.probe", "2.9 kHz", 2900),
        ("cistern.head", "1.24 m", 1240),
        ("cistern.head", "1240 mm", 1240),
        ("header-tank.probe", "1.2 nF", 1200),
        ("wash-sump.transmitter", "0.012 A", 12),
    ],
)
def test_a_raw_value_may_carry_a_unit(sensor: str, typed: str, raw: float) -> None:
    """It is turned into the sensor's own, without noise in the last digit."""
    _, text = told(sensor, typed, "--json")
    assert json.loads(text)[0]["raw"] == raw


def test_the_calibration_of_the_example_reads_at_its_points() -> None:
    """The two points of the settings read as their levels; half way in capacitance is half way in level."""
    _, text = told("condensate-drum.probe", "80.6 kHz", "2.9 kHz", "5598.56287425", "--json")
    assert [row["level_m"] for row in json.loads(text)] == [0.0, 0.8, 0.4]


def test_people_read_a_line_a_raw_value() -> None:
    """With its unit, and why it is not good."""
    status, text = told("wash-sump.transmitter", "12", "3.5")
    assert status == 0
    first, second = text.splitlines()
    assert first == "12 mA  →  0.8000 m  (53.3 %)  960.0 l  good"
    assert second == "3.5 mA  →  failure: the transmitter signals a failure (3.5 mA, low)"


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["cistern.heda", "1"], "cistern.head"),
        (["cistern.head", "1 kHz"], "a frequency"),
        (["cistern.head", "much"], "much"),
        (["cistern.head", "nan"], "nan"),
        (["condensate-drum.float", "1"], "contact"),
    ],
)
def test_what_cannot_be_converted_is_said_and_ends_with_status_2(
    arguments: list[str], said: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A wrong name shows the known ones, a wrong unit both kinds; never a traceback."""
    status, text = refused(monkeypatch, capsys, *arguments)
    assert status == 2
    assert said in text
    assert "Traceback" not in text
