"""Methods and shapes: each converts any float without raising, and its inverse is its inverse."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.calibration import Line
from gateway.measure.reading import convert
from gateway.measure.sensing.capacitance import Capacitance
from gateway.measure.sensing.current import Current
from gateway.measure.sensing.distance import Distance
from gateway.measure.sensing.frequency import Frequency
from gateway.measure.sensing.level import Level
from gateway.measure.sensing.method import Method
from gateway.measure.sensor_plan import SensorPlan
from gateway.measure.shapes import Shape
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.measure.status import Status

TANK = vertical_cylinder(1.6, 2.2)
METHODS: dict[str, Method] = {
    "level": Level(),
    "level, corrected": Level(line=Line(0.02, 0.0, 1.98, 2.0)),
    "level, as a share": Level(lambda share: share * 2.0, lambda level: level / 2.0),
    "level, as a volume": Level(TANK.level, TANK.volume),
    "distance": Distance(2.05),
    "current": Current(0.0, 2.5),
    "current, as a distance": Current(2.5, 0.25, mounted_at=2.5),
    "capacitance": Capacitance(Line(84.4e-12, 0.0, 2345.7e-12, 2.0)),
    "frequency": Frequency(Line(1 / 80.6e3, 0.0, 1 / 2.9e3, 2.0)),
}
SHAPES: dict[str, Shape] = {"upright": TANK, "box": rectangular(2.0, 1.2, 1.5)}


@pytest.mark.parametrize("name", METHODS)
@given(level=st.floats(0.01, 2.0))
def test_the_inverse_of_the_inverse(name: str, level: float) -> None:
    """The raw value of a level reads as that level."""
    method = METHODS[name]
    assert method.convert(method.raw(level)).level == pytest.approx(level, abs=1e-9)


@pytest.mark.parametrize("name", METHODS)
@given(raw=st.floats())
def test_any_float_converts_to_a_finite_level_or_to_a_reason(name: str, raw: float) -> None:
    """Total, NaN and infinities included; not good means a reason."""
    plan = SensorPlan(name="x", topic="t", unit="u", method=METHODS[name])
    found = convert(plan, METHODS[name], raw)
    assert found.level is None or math.isfinite(found.level)
    assert (found.reason is None) == (found.status is Status.GOOD)
    assert (found.level is None) == (found.status is Status.FAILURE)


@pytest.mark.parametrize("name", METHODS)
@given(one=st.floats(0.01, 2.0), other=st.floats(0.01, 2.0))
def test_the_raw_value_goes_one_way_with_the_level(name: str, one: float, other: float) -> None:
    """Monotone: a higher level never reads as a lower one."""
    low, high = sorted((one, other))
    raws = METHODS[name].raw(low), METHODS[name].raw(high)
    assert raws[0] >= raws[1] if _falls(name) else raws[0] <= raws[1]


def _falls(name: str) -> bool:
    return METHODS[name].raw(2.0) < METHODS[name].raw(1.0)


def test_an_oscillator_that_stands_still_has_failed() -> None:
    """No frequency, and one below nothing, are no measurement; nor has every level a frequency."""
    probe = METHODS["frequency"]
    for raw in (0.0, -5.0):
        assert probe.convert(raw).reason == "the oscillator stands still"
    with pytest.raises(ValueError, match="no frequency belongs to a level of -1 m"):
        probe.raw(-1.0)


@pytest.mark.parametrize("name", METHODS)
def test_a_raw_value_beyond_any_number_is_a_failure(name: str) -> None:
    """A value that grows to infinity in SI units is no full tank."""
    plan = SensorPlan(name="x", topic="t", unit="Gu", scale=1e9, method=METHODS[name])
    found = convert(plan, METHODS[name], 1e300 * 1e8)
    assert (found.level, found.status) == (None, Status.FAILURE)


@pytest.mark.parametrize(("volume", "level", "reason"), [(-1.0, 0.0, "less than nothing"), (1e9, 2.2, "more than")])
def test_a_volume_that_the_tank_cannot_hold_is_out_of_specification(volume: float, level: float, reason: str) -> None:
    """It counts as empty or full, and says so."""
    found = METHODS["level, as a volume"].convert(volume)
    assert (found.level, found.status) == (level, Status.OUT_OF_SPECIFICATION)
    assert found.reason is not None
    assert found.reason.startswith(reason)


def test_a_line_needs_two_points() -> None:
    """Points that are one in either way are refused."""
    for points in ((1.0, 0.0, 1.0, 2.0), (1.0, 2.0, 3.0, 2.0)):
        with pytest.raises(ValueError, match="must differ"):
            Line(*points)


@pytest.mark.parametrize("name", SHAPES)
@given(share=st.floats(0, 1))
def test_level_and_volume_are_inverse_within_the_tank(name: str, share: float) -> None:
    """And the volume grows by the area."""
    shape = SHAPES[name]
    level = share * shape.height
    assert shape.level(shape.volume(level)) == pytest.approx(level, abs=1e-12)
    assert shape.volume(level) == pytest.approx(shape.area(level) * level)


@pytest.mark.parametrize("name", SHAPES)
def test_levels_outside_the_tank_count_as_its_bottom_or_its_top(name: str) -> None:
    """No tank holds less than nothing, or more than it is high."""
    shape = SHAPES[name]
    assert shape.volume(-0.1) == 0
    assert shape.volume(shape.height + 1) == shape.volume(shape.height)
