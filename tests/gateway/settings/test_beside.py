"""Files beside the tanks': strapping tables and calibrations are settings like any other."""

from pathlib import Path

import pytest
from marked import SITE, TANK, changed

from gateway.plant import Plant
from gateway.settings.assemble import plant_plan
from gateway.settings.complaint import SettingsError
from gateway.settings.load import load, load_texts

STRAPPED = changed(
    TANK, "{form: vertical cylinder, diameter: 1.60 m, height: 2.20 m}", "{form: strapping, table: t.csv}"
)
TABLE = "m,l\n0,0\n1.0,800\n2.2,2000\n"


def site(folder: Path, tank: str, **beside: str) -> Path:
    """Write a site with one tank; `_` in the names of files beside stands for `/`."""
    (folder / "tanks").mkdir()
    (folder / "site.yaml").write_text(SITE, "utf-8")
    (folder / "tanks/sump.yaml").write_text(tank, "utf-8")
    for name, text in beside.items():
        path = folder / name.replace("_", "/").replace("9", ".")
        path.parent.mkdir(exist_ok=True)
        path.write_text(text, "utf-8")
    return folder


def test_a_strapping_table_may_stand_in_a_file(tmp_path: Path) -> None:
    """Beside its tank; its text is kept with the settings, so that the journal can build the tank again."""
    settings = load(site(tmp_path, STRAPPED, tanks_t9csv=TABLE))
    again = load_texts(settings.texts, Path("elsewhere"))
    for one in (settings, again):
        shape = Plant(plant_plan(one)).meters.tanks[0].plan.shape
        assert shape is not None
        assert shape.volume(1.5) == pytest.approx(1.3)
    assert "tanks/t.csv" in settings.texts
    assert settings.digest == again.digest


@pytest.mark.parametrize(
    ("table", "complaint"),
    [
        ("m,l\n0,0\n1,2,3\n", "tanks/t.csv:3:1: expected two columns: level and volume"),
        ("m,l\n0,0\n1,much\n", "tanks/t.csv:3:1: `much l` is not a value with its unit"),
        ("0,0\n1,2\n", "tanks/t.csv:1:1: `0` needs a unit"),
        ("m,l\n0,0\n1,9\n2,9\n", "tanks/sump.yaml:2:8: the pair at 2 m is not above the one at 1 m"),
        ("", "tanks/sump.yaml:2:8: a strapping table has two pairs or more"),
    ],
)
def test_a_slip_in_a_table_is_told_by_its_line(tmp_path: Path, table: str, complaint: str) -> None:
    """Or, where it is of the whole, at the tank's shape."""
    with pytest.raises(SettingsError) as caught:
        load(site(tmp_path, STRAPPED, tanks_t9csv=table))
    assert str(caught.value.complaints[0]).startswith(complaint)


def test_a_table_that_is_not_there_is_told(tmp_path: Path) -> None:
    """At its name."""
    with pytest.raises(SettingsError) as caught:
        load(site(tmp_path, STRAPPED))
    assert "there is no file `t.csv` beside this one" in str(caught.value.complaints[0])


PROBE = changed(
    TANK, "senses: distance, unit: mm, mounted_at: 2.5 m", "senses: capacitance, unit: pF, calibration: CAL"
)
CAL = "{points: [[100 pF, 0 m], [1000 pF, 2 m]], covers: [5 cm, 1.9 m]}"
WRITTEN = "points: [[200 pF, 0 m], [1000 pF, 2 m]]\nat: 2026-12-01T10:00:00Z\nby: anna\n"


def test_a_calibration_file_replaces_the_points_and_keeps_what_else_is_said(tmp_path: Path) -> None:
    """The tank's file stays as its owner wrote it."""
    tank = PROBE.replace("CAL", CAL)
    (plan,) = [
        one for one in plant_plan(load(site(tmp_path, tank, calibration_sump9head9yaml=WRITTEN))).sensors if one.method
    ]
    assert plan.method is not None
    assert plan.method.convert(200e-12).level == pytest.approx(0.0)
    assert plan.covers is not None


@pytest.mark.parametrize(
    ("name", "text", "complaint"),
    [
        ("calibration_sump9haed9yaml", WRITTEN, "calibration/sump.haed.yaml:1:1: there is no sensor `sump.haed`"),
        ("calibration_sump9head9yaml", "points: [[1 pF, 0 m]]\n", "calibration/sump.head.yaml:1:9: two points or more"),
        (
            "calibration_sump9head9yaml",
            WRITTEN + "who: me\n",
            "calibration/sump.head.yaml:4:1: `who` is not known here",
        ),
    ],
)
def test_a_slip_in_a_calibration_file_is_told_by_its_place(
    tmp_path: Path, name: str, text: str, complaint: str
) -> None:
    """Like any other."""
    with pytest.raises(SettingsError) as caught:
        load(site(tmp_path, PROBE.replace("CAL", CAL), **{name: text}))
    assert any(str(one).startswith(complaint) for one in caught.value.complaints), caught.value.complaints
