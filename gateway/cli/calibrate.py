"""`brimward calibrate`: from levels that are known, and readings that come live, to the points of a calibration."""

import getpass
import time
from collections.abc import Callable, Iterator, Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Annotated, Any

import typer

from gateway.cli.common import SiteArgument, named
from gateway.connect import link_options
from gateway.errors import InputError
from gateway.link.tap import Tap
from gateway.measure.calibration import least_squares
from gateway.measure.robust import Steady, steady
from gateway.measure.sensing import SENSES
from gateway.measure.sensing.circuit import ByCapacitance
from gateway.measure.sensing.frequency import Frequency
from gateway.measure.sensor import Sensor
from gateway.measure.sensor_plan import SensorPlan
from gateway.settings.assemble import plant_plan
from gateway.settings.calibrations import Pair, calibration_file, comments_of, written
from gateway.settings.load import load
from gateway.settings.models import Site
from gateway.settings.names import full, parts
from gateway.settings.sensor_models import Sensor as SensorSettings
from gateway.settings.units import read_as
from gateway.settings.yaml_reader import read_yaml
from gateway.topics import moment
from rules.quantity import Dimension

PATIENCE = 5  # times what the sensor promises, before it counts as silent


def calibrate_command(
    site: SiteArgument,
    sensor: Annotated[str, typer.Argument(help="The sensor, as TANK.SENSOR.", metavar="TANK.SENSOR")],
    readings: Annotated[int, typer.Option(help="Readings for each point.", min=4)] = 12,
    by: Annotated[str | None, typer.Option(help="Who calibrates; else your user's name.")] = None,
) -> None:
    """Ask for levels that you have measured, take the readings that come meanwhile, and write the calibration.

    Begin dry and end full, or the other way round; dip points between make it better. An empty line ends.

    Example: brimward calibrate config_examples/hill-dairy condensate-drum.probe
    """
    settings = load(site)
    plan = plant_plan(settings)
    by_name = {one.name: one for one in plan.sensors}
    chosen = by_name[named(sensor, by_name, "sensor")]
    said = {full(tank, name): one for tank, part in parts(settings) for name, one in part.sensors.items()}[chosen.name]
    if "calibration" not in SENSES[said.senses].uses:
        raise InputError(f"{chosen.name} senses {said.senses}, which needs no calibration")
    tap = Tap(link_options(settings, ()), [chosen.topic])
    try:
        points = list(_points(tap, chosen, readings, (said.expect_every or 60 * 10**9) / 1e9))
    finally:
        tap.close()
    if len(points) < 2:
        raise InputError("nothing is written: two points or more make a calibration")
    _show(points, chosen)
    path = _write(settings, chosen, said, [pair for _, pair in points], by or _user())
    load(site)  # what was written must be readable
    typer.echo(f"Written to {path}. The running gateway takes it when it is started again.")


def _points(tap: Tap, plan: SensorPlan, count: int, every_s: float) -> Iterator[tuple[Steady, Pair]]:
    """Yield a point for each level that is typed."""
    while True:
        typed = typer.prompt("Level now, such as `0 cm` (empty: done)", default="", show_default=False).strip()
        if not typed:
            return
        try:
            read_as(typed, Dimension.LENGTH)
        except ValueError as problem:
            typer.echo(f"  {problem}")
            continue
        found = steady(_readings(tap, plan, count, every_s))
        told = f"{found.value:.6g} {plan.unit}, spread {found.spread:.3g}"
        if not found.is_steady:
            typer.echo(
                f"  {told}: it drifts by {found.drift:+.3g} {plan.unit} meanwhile; wait, and say the level again"
            )
            continue
        typer.echo(f"  {told}, from {found.readings} readings")
        yield found, (f"{found.value:.6g} {plan.unit}", typed)


def _readings(tap: Tap, plan: SensorPlan, count: int, every_s: float) -> list[float]:
    """Return the next raw values; raise InputError when none come."""
    sensor, values = Sensor(plan), list[float]()
    for _ in tap.heard(0.0):
        pass  # what came before the level was typed
    until = time.monotonic() + PATIENCE * every_s
    while len(values) < count:
        for heard in tap.heard(within_s=0.2):
            sensor.take(time.time_ns(), heard.topic, heard.payload, retained=heard.retained)
            raw = sensor.last.raw if sensor.last is not None else None
            if isinstance(raw, float) and not heard.retained:
                values.append(raw)
                until = time.monotonic() + PATIENCE * every_s
            if len(values) == count:
                break
        if time.monotonic() > until:
            raise InputError(f"nothing comes on {plan.topic}: {len(values)} of {count} readings")
    return values


def _show(points: Sequence[tuple[Steady, Pair]], plan: SensorPlan) -> None:
    """Print the points beside the straight line of least squares, where there are enough of them."""
    linear = _linear(plan)
    pairs = [(linear(found.value), read_as(level, Dimension.LENGTH).value) for found, (_, level) in points]
    try:
        fitted = least_squares(pairs)
    except ValueError as problem:
        raise InputError(f"nothing is written: {problem}") from None
    typer.echo(f"{'raw':>16}  {'level':>10}  {'line':>10}  {'off':>9}")
    for (_, (raw, _)), (x, level), off in zip(points, pairs, fitted.residuals, strict=True):
        typer.echo(f"{raw:>16}  {level:>8.4f} m  {fitted.level(x):>8.4f} m  {off * 1000:>+6.1f} mm")
    if len(pairs) > 2:
        top = max(level for _, level in pairs)
        typer.echo(f"The line is good to ±{fitted.error_at(top) * 1000:.1f} mm (standard error) at {top:g} m.")


def _linear(plan: SensorPlan) -> Callable[[float], float]:
    """Return the way from a raw value to the quantity in which the method is linear."""
    match plan.method:
        case Frequency():
            return lambda raw: 1 / (raw * plan.scale)
        case ByCapacitance(circuit=circuit):
            return lambda raw: circuit.farad(raw * plan.scale)
        case _:
            return lambda raw: raw * plan.scale


def _write(site: Site, plan: SensorPlan, said: SensorSettings, points: list[Pair], by: str) -> Path:
    """Write the file, with what was in force before, whole or not at all."""
    path = calibration_file(site.folder, plan.name)
    old = path.read_text("utf-8") if path.is_file() else ""
    text = comments_of(old) + written(points, moment(time.time_ns()), by, _before(old, site, said))
    path.parent.mkdir(exist_ok=True)
    fresh = path.with_suffix(".new")
    fresh.write_text(text, "utf-8")
    fresh.replace(path)
    return path


def _before(old: str, site: Site, said: SensorSettings) -> list[tuple[list[Pair], str, str]]:
    """Return the points before, newest first: of the calibration file, or else of the sensor's own file."""
    node = read_yaml("", old, []) if old else None
    plain = node.plain() if node is not None else None
    if isinstance(plain, dict):
        earlier = [plain, *plain.get("before", [])]
        return [(_as_pairs(one["points"]), str(one["at"]), str(one["by"])) for one in earlier]
    if said.calibration is None:
        return []
    pairs = [(f"{raw.value:.9g} {raw.dimension.unit}", f"{level:g} m") for raw, level in said.calibration.points]
    return [(pairs, f"{datetime.now(UTC):%Y-%m-%d}", f"the file of {site.name}")]


def _as_pairs(points: Any) -> list[Pair]:
    return [(str(raw), str(level)) for raw, level in points]


def _user() -> str:
    try:
        return getpass.getuser()
    except (KeyError, OSError):
        return "somebody"
