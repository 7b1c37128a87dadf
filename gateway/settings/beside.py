"""Files beside the tanks': strapping tables in CSV, and the calibrations that `brimward calibrate` writes.

They belong to the settings like any other: their texts are kept in the journal, and their slips are told by place.
"""

import csv
import io
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from pydantic import Field

from gateway.settings.complaint import Complaint
from gateway.settings.fields import Part, Text
from gateway.settings.models import Common, TankFile
from gateway.settings.sensor_models import Calibration, Points
from gateway.settings.units import read_as
from gateway.settings.yaml_reader import Node
from rules.quantity import Dimension

CALIBRATIONS = "calibration"
MOST_ROWS = 10_000


class Written(Part):
    """Points that were once in force, with their date and author."""

    points: Points
    at: Text
    by: Text


class CalibrationFile(Part):
    """What `brimward calibrate` has written of one sensor: the points in force, and those before."""

    points: Points
    at: Text
    by: Text
    before: list[Written] = Field(default_factory=list)


def is_beside(file: str) -> bool:
    """Return whether a file of the settings is none of the site's or the tanks'."""
    return file.startswith(f"{CALIBRATIONS}/") or file.lower().endswith(".csv")


def files_beside(folder: Path, nodes: Mapping[str, Node]) -> Iterator[str]:
    """Yield the files beside: every calibration, and every table that a tank names and that is there."""
    for path in sorted(folder.glob(f"{CALIBRATIONS}/*.yaml")):
        if path.is_file():
            yield path.relative_to(folder).as_posix()
    for file, node in nodes.items():
        name = table_of(file, node)
        if name is not None and (folder / name).is_file():
            yield name


def table_of(file: str, node: Node) -> str | None:
    """Return the file that a tank's strapping table is in, relative to the site's folder; None where there is none."""
    shape = node.child("shape")
    table = shape.child("table") if shape else None
    name = table.plain() if table else None
    if not isinstance(name, str) or ".." in name or name.startswith("/") or not name.lower().endswith(".csv"):
        return None
    return (Path(file).parent / name).as_posix()


def read_table(file: str, text: str) -> tuple[list[tuple[float, float]], list[Complaint]]:
    """Return the pairs (level in m, volume in m3) of a strapping table, and what is wrong with it.

    Two columns with their units in the values, or in a first line such as `m,l`.
    """
    pairs: list[tuple[float, float]] = []
    units = ("", "")
    rows = csv.reader(io.StringIO(text))
    for number, row in enumerate(rows, 1):
        if not any(cell.strip() for cell in row):
            continue
        if number > MOST_ROWS:
            return pairs, [Complaint(file, number, 1, f"a table has {MOST_ROWS} lines at most")]
        if len(row) != 2:
            return pairs, [Complaint(file, number, 1, "expected two columns: level and volume")]
        first, second = (cell.strip() for cell in row)
        if not pairs and units == ("", "") and not any(letter.isdigit() for letter in first):
            units = (first, second)
            continue
        try:
            level = read_as(f"{first} {units[0]}".strip(), Dimension.LENGTH).value
            volume = read_as(f"{second} {units[1]}".strip(), Dimension.VOLUME).value
        except ValueError as problem:
            return pairs, [Complaint(file, number, 1, str(problem))]
        pairs.append((level, volume))
    return pairs, []


def with_table(tank: TankFile, pairs: list[tuple[float, float]]) -> TankFile:
    """Return a tank whose strapping table is read."""
    shape = tank.shape and tank.shape.model_copy(update={"table": pairs})
    return tank.model_copy(update={"shape": shape})


def sensor_of(file: str) -> tuple[str | None, str]:
    """Return the tank and the sensor that a calibration file is of: `calibration/<tank>.<sensor>.yaml`."""
    tank, dot, sensor = Path(file).stem.partition(".")
    return (tank, sensor) if dot else (None, tank)


def calibrated(part: Common, name: str, found: CalibrationFile) -> Common:
    """Return a part of the settings with the points of one of its sensors replaced."""
    sensor = part.sensors[name]
    own: dict[str, Any] = {} if sensor.calibration is None else dict(sensor.calibration)
    calibration = Calibration.model_construct(**{"fit": "through", "covers": None, **own, "points": found.points})
    sensors = {**part.sensors, name: sensor.model_copy(update={"calibration": calibration})}
    return part.model_copy(update={"sensors": sensors})
