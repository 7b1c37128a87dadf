"""`brimward convert`: what a raw value reads as."""

from typing import Annotated, Any

import typer

from gateway.cli.common import AsJson, SiteArgument, named, print_json
from gateway.errors import InputError
from gateway.measure.combine import range_of
from gateway.measure.reading import convert
from gateway.measure.sensing.method import Method
from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.tank import TankPlan
from gateway.settings.assemble import plant_plan
from gateway.settings.load import load
from gateway.settings.units import read, read_as
from gateway.topics import rounded
from rules.model import Bounds
from rules.quantity import Dimension


def convert_values(plan: SensorPlan, tank: TankPlan | None, method: Method, raw: float) -> dict[str, Any]:
    """Return what one raw value, in the sensor's own unit, reads as."""
    found = convert(plan, method, raw)
    known = found.level if found.level is None or plan.covers is None else plan.covers.of(found.level)
    level = known if isinstance(known, float) else None
    share = level / tank.brim if level is not None and tank and tank.brim else None
    volume = tank.shape.volume(level) if level is not None and tank and tank.shape else None
    return {
        "raw": raw,
        "level_m": rounded(level, 6),
        "percent": rounded(None if share is None else share * 100, 3),
        "volume_l": rounded(None if volume is None else volume * 1000, 3),
        "status": found.status.value,
        "reason": range_of(known) if isinstance(known, Bounds) else found.reason,
    }


def _method_at(plan: SensorPlan, temperature: str | None) -> Method:
    """Return how a sensor converts, at a temperature where one is given and it matters."""
    if plan.method is None:
        raise InputError(f"{plan.name} is a contact: its payloads are words, there is nothing to convert")
    if temperature is None:
        return plan.method
    if plan.method_at is None or "temperature" not in plan.feels:
        raise InputError(f"{plan.name} does not follow a temperature; leave `--temperature` out")
    try:
        felt = read_as(temperature, Dimension.TEMPERATURE).value
    except ValueError as problem:
        raise InputError(str(problem)) from None
    return plan.method_at({"temperature": felt})


def raw_of(text: str, plan: SensorPlan) -> float:
    """Return a raw value as it was typed, bare or with a unit, in the sensor's own unit."""
    try:
        value, dimension = read(text)
    except ValueError as problem:
        raise InputError(str(problem)) from None
    if dimension is Dimension.NUMBER:
        return value
    wanted = read(f"1 {plan.unit}").dimension
    if dimension is not wanted:
        raise InputError(f"`{text}` is {dimension.words}; {plan.name} sends {wanted.words}, in {plan.unit}")
    return float(
        f"{(value - plan.zero) / plan.scale:.12g}"
    )  # 12 digits: less than any sensor has is lost, and 1240 stays 1240


def convert_command(
    site: SiteArgument,
    sensor: Annotated[str, typer.Argument(help="The sensor, as TANK.SENSOR.", metavar="TANK.SENSOR")],
    raw: Annotated[list[str], typer.Argument(help="Raw values, bare or with a unit.", metavar="RAW...")],
    as_json: AsJson = False,
    temperature: Annotated[str | None, typer.Option(help="Of the air or the water, such as `15 degC`.")] = None,
) -> None:
    """Say what raw values read as: level, percent, volume, status.

    Example: brimward convert config_examples/hill-dairy condensate-drum.probe 80600 "2.9 kHz"

    A raw value below nothing stands behind two dashes: brimward convert SITE TANK.SENSOR -- -5
    """
    plan = plant_plan(load(site))
    sensors = {one.name: one for one in plan.sensors}
    chosen = sensors[named(sensor, sensors, "sensor")]
    tank = next((one for one in plan.tanks if chosen.name.startswith(f"{one.name}.")), None)
    method = _method_at(chosen, temperature)
    rows = [convert_values(chosen, tank, method, raw_of(text, chosen)) for text in raw]
    if as_json:
        print_json(rows)
        return
    for row in rows:
        typer.echo(line_of(row, chosen.unit))


def line_of(row: dict[str, Any], unit: str) -> str:
    """Return a converted value as one line for people."""
    parts = [f"{row['raw']:.12g} {unit}".strip(), "→"]
    if row["level_m"] is not None:
        parts.append(f"{row['level_m']:.4f} m")
    if row["percent"] is not None:
        parts.append(f"({row['percent']:.1f} %)")
    if row["volume_l"] is not None:
        parts.append(f"{row['volume_l']:.1f} l")
    parts.append(row["status"] if row["reason"] is None else f"{row['status']}: {row['reason']}")
    return "  ".join(parts)
