"""A tank's movement: rise, flows, how long until the brim, totals, and what a pump really takes."""

import json
from typing import Any

import pytest

from gateway.measure.combine import Member, Take
from gateway.measure.shapes import Shape
from gateway.measure.shapes.horizontal import horizontal_cylinder
from gateway.measure.shapes.prism import vertical_cylinder
from gateway.measure.status import Status
from gateway.measure.tank import NEVER, PumpRun, Tank, TankPlan
from gateway.measure.trend.totals import Total
from gateway.settings.calendar import calendar_of
from rules.model import Bounds, Fault

S = 1_000_000_000
NOON = 1_777_629_600 * S  # 2026-05-01T10:00:00Z, noon in Vienna
LITRE = 1e-3
SHAPE = vertical_cylinder(2.0, 3.0)


def tank_of(shape: Shape | None = SHAPE, **more: Any) -> Tank:
    """Return a tank with one sensor, a rise over 60 s and the calendar of Vienna."""
    given: dict[str, Any] = {
        "name": "t", "sensors": ("t.s",), "take": Take(way="first", need=1), "shape": shape, "brim": 2.5,
        "suction": 0.5, "rise_over": 60 * S, "calendar": calendar_of("Europe/Vienna"),
    }  # fmt: skip
    return Tank(TankPlan(**(given | more)))


def know(tank: Tank, second: float, level: float | Bounds | None) -> list[Total | PumpRun]:
    """Let a tank's level be known; return what has ended."""
    t = NOON + round(second * S)
    fault = Fault.NONE if level is not None else Fault.SILENT
    return tank.know(t, t, level, fault, Status.GOOD, None)


def litres_a_minute(tank: Tank) -> float:
    """Return the net flow."""
    flow = tank.measured.flow
    assert flow is not None
    return flow / LITRE * 60


# Source: worked out from the volumes of section "flow from level change": Q = ΔV/Δt, volumes by the library fluids.
FALLS = [
    (vertical_cylinder(2.0, 3.0), 1.000, 31.41593),
    (horizontal_cylinder(1.5, 4.0), 0.750, 59.99822),
    (horizontal_cylinder(1.5, 4.0), 0.150, 35.45825),
]


@pytest.mark.parametrize(("shape", "level", "flow"), FALLS)
def test_a_fall_of_ten_millimetres_in_a_minute(shape: Shape, level: float, flow: float) -> None:
    """The same fall is another flow where the tank is narrower."""
    tank = tank_of(shape)
    for second in range(61):
        know(tank, second, level - 0.010 * second / 60)
    assert litres_a_minute(tank) == pytest.approx(-flow, rel=1e-4)


def test_how_long_until_the_brim_and_the_suction_level() -> None:
    """By the flow and the room that is left; never, in the other direction."""
    tank = tank_of()
    for second in range(61):
        know(tank, second, 1.0 + 0.001 * second)
    assert tank.quantity("rise").value == pytest.approx(0.001)
    assert tank.quantity("time_to_brim").value == pytest.approx((2.5 - 1.06) / 0.001)
    assert tank.quantity("time_to_suction").value == NEVER
    assert tank.quantity("ullage").value == pytest.approx(SHAPE.volume(2.5) - SHAPE.volume(1.06))


def test_what_is_not_known_exactly_has_no_movement_and_bounded_volumes() -> None:
    """And the reason is the level's own."""
    tank = tank_of()
    for second in range(61):
        know(tank, second, 1.0)
    know(tank, 61, Bounds(2.0, float("inf")))
    assert tank.quantity("rise").value is None
    assert tank.quantity("volume").value == Bounds(SHAPE.volume(2.0), SHAPE.volume(3.0))
    know(tank, 62, None)
    assert tank.quantity("flow").fault is Fault.SILENT


def test_inflow_is_the_net_flow_and_what_the_pumps_take() -> None:
    """A pump of 2 l/s runs against an inflow of 1 l/s."""
    tank = tank_of(pumps={"t.pump": 2 * LITRE})
    tank.switch("t.pump", runs=True)
    for second in range(61):
        know(tank, second, 2.0 - second * LITRE / SHAPE.area(1))
    assert tank.measured.inflow == pytest.approx(1 * LITRE)


def test_a_pumps_real_flow_is_estimated_at_every_run() -> None:
    """Inflow 0.5 l/s throughout; the pump, rated for 4 l/s, really takes 3."""
    tank = tank_of(pumps={"t.pump": 4 * LITRE})
    level, runs = 2.0, []
    for second in range(400):
        runs += [one for one in know(tank, second, level) if isinstance(one, PumpRun)]
        if second in {100, 200}:
            tank.switch("t.pump", runs=second == 100)
        level += (0.5 - (3.0 if 100 <= second < 200 else 0.0)) * LITRE / SHAPE.area(1)
    assert [run.flow for run in runs] == [pytest.approx(3 * LITRE, rel=1e-6)]
    assert tank.flow_of("t.pump") == pytest.approx(3 * LITRE, rel=1e-6)


def test_a_run_that_another_pump_disturbs_says_nothing() -> None:
    """Its share cannot be told."""
    tank = tank_of(pumps={"t.one": 4 * LITRE, "t.two": 4 * LITRE})
    runs = []
    for second in range(500):
        runs += [one for one in know(tank, second, 2.0 - second * 1e-4) if isinstance(one, PumpRun)]
        for at, pump, starts in (
            (100, "t.one", True),
            (150, "t.two", True),
            (200, "t.one", False),
            (250, "t.two", False),
        ):
            if second == at:
                tank.switch(pump, runs=starts)
    assert runs == []


def hours(tank: Tank, count: int, inflow: float, level: float = 1.0) -> list[Total]:
    """Let water flow in for some hours, a reading every ten seconds; return the totals of what has ended."""
    ended: list[Total] = []
    for tens in range(count * 360 + 30):
        now = level + tens * 10 * inflow / SHAPE.area(1)
        ended += [one for one in know(tank, tens * 10, now) if isinstance(one, Total)]
    return ended


def test_totals_of_hours_and_days_in_the_sites_own_zone() -> None:
    """0.1 l/s from noon on are 360 litres an hour; the day ends at midnight in Vienna."""
    ended = hours(tank_of(), 13, 0.1 * LITRE)
    names = [one.name for one in ended if one.period == "hour"]
    assert names[0] == "2026-05-01T12+0200"
    assert len(names) == 13
    assert ended[1].into / LITRE == pytest.approx(360, rel=1e-6)
    (day,) = [one for one in ended if one.period == "day"]
    assert (day.name, round(day.into / LITRE)) == ("2026-05-01", 12 * 360 - 2)  # the first rise is known after 15 s


def test_totals_go_on_over_a_restart() -> None:
    """Saved as text; the time in between is a gap of which nothing is known."""
    whole, copy = tank_of(), tank_of()
    for second in range(0, 1800, 10):
        know(whole, second, 1.0 + second * 1e-5)
    copy.restore(json.loads(json.dumps(whole.save())))
    assert copy.running == whole.running
    copy.begin()
    assert copy.running["hour"].into > 0
    assert copy.running["hour"] == whole.running["hour"]


def test_what_flows_in_above_the_brim_is_spilled() -> None:
    """At the brim the level stands; inflow is then what a pump takes and no more is known."""
    tank = tank_of(pumps={"t.pump": 1 * LITRE})
    for second in range(61):
        know(tank, second, 2.5)
    tank.switch("t.pump", runs=True)
    for second in range(61, 300):
        know(tank, second, 2.5)
    assert tank.running["hour"].spilled == pytest.approx(tank.running["hour"].into)
    assert tank.running["hour"].spilled > 0


def test_an_hour_that_comes_twice_is_two_hours() -> None:
    """Clocks are put back at 03:00 on 2026-10-25 in Vienna; the day has 25 hours."""
    calendar = calendar_of("Europe/Vienna")
    begin = 1_792_879_200 * S  # 2026-10-25T00:00 in Vienna
    names, at = [], begin
    while calendar(at)[0][1] == "2026-10-25":
        names.append(calendar(at)[0][0])
        at = calendar(at)[1]
    assert (at - begin) // (3600 * S) == len(names) == len(set(names)) == 25


@pytest.mark.parametrize(
    ("day", "season"),
    [("2026-01-15", "2025-12/2026-02"), ("2026-03-01", "2026-03/2026-05"), ("2026-12-01", "2026-12/2027-02")],
)
def test_seasons_are_three_months(day: str, season: str) -> None:
    """From December, March, June and September on; winter belongs to two years."""
    from datetime import UTC, datetime  # noqa: PLC0415 - only here

    at = round(datetime.fromisoformat(f"{day}T12:00:00").replace(tzinfo=UTC).timestamp()) * S
    assert calendar_of("UTC")(at)[0][3] == season


def test_a_contradiction_of_a_float_counts_after_a_minute() -> None:
    """A float hangs a little, and tells seldom."""
    from gateway.measure.combine import Float  # noqa: PLC0415 - only here

    tank = tank_of(floats={"t.f": 1.9})
    member = Member("t.s", 1.0, Fault.NONE, Status.GOOD, None)
    for second, status in ((0, Status.GOOD), (59, Status.GOOD), (60, Status.OUT_OF_SPECIFICATION)):
        tank.update(second * S, second * S, [member], [Float("t.f", 1.9, wet=True)])
        assert tank.measured.status is status


@pytest.mark.parametrize(
    ("level", "told"), [(-0.02, "-0.020 m is below the bottom"), (3.02, "above the tank's height of 3 m")]
)
def test_a_level_outside_the_tank_is_out_of_specification(level: float, told: str) -> None:
    """Usable all the same: it may stand above its rim, or the sensor may be wrong."""
    tank = tank_of()
    know(tank, 0, level)
    assert tank.measured.status is Status.OUT_OF_SPECIFICATION
    assert told in (tank.measured.reason or "")
    assert tank.quantity("level").value == level
