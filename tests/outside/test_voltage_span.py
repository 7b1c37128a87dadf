"""Voltage outputs against a 4-20 mA loop read across a resistor."""

import pytest

from gateway.measure.sensing.voltage import Voltage
from gateway.measure.status import Status

# mA, V across 250 ohm by Ohm's law, level in m for 0 to 2.5 m over 4 to 20 mA: linear, worked out beforehand.
LOOP = {
    3.8: (0.95, -0.031250, Status.OUT_OF_SPECIFICATION),
    4.0: (1.0, 0.0, Status.GOOD),
    8.0: (2.0, 0.625, Status.GOOD),
    12.0: (3.0, 1.25, Status.GOOD),
    16.0: (4.0, 1.875, Status.GOOD),
    20.0: (5.0, 2.5, Status.GOOD),
    20.5: (5.125, 2.578125, Status.OUT_OF_SPECIFICATION),
}


@pytest.mark.parametrize("milliamperes", LOOP)
def test_a_current_across_a_resistor_reads_as_its_level(milliamperes: float) -> None:
    """In both directions, and as a distance too; what NAMUR NE 43 still calls a measurement is one here."""
    volts, level, status = LOOP[milliamperes]
    for sensor in (Voltage((1.0, 5.0), 0.0, 2.5), Voltage((1.0, 5.0), 3.0, 0.5, mounted_at=3.0)):
        found = sensor.convert(volts)
        assert found.level == pytest.approx(level, abs=1e-9)
        assert found.status is status
        assert sensor.raw(level) == pytest.approx(volts, rel=1e-9)


@pytest.mark.parametrize("volts", [0.0, 0.87, 5.13, 10.0])
def test_far_outside_the_span_nothing_is_measured(volts: float) -> None:
    """More than 3.125 % of the span beyond its ends is a failure (common practice, no source)."""
    found = Voltage((1.0, 5.0), 0.0, 2.5).convert(volts)
    assert (found.level, found.status) == (None, Status.FAILURE)
    assert found.reason is not None
    assert found.reason.startswith("far outside the span")


def test_a_span_may_fall() -> None:
    """10 V empty, 0 V full."""
    sensor = Voltage((10.0, 0.0), 0.0, 2.0)
    assert sensor.convert(2.5).level == pytest.approx(1.5)
    assert sensor.convert(10.2).status is Status.OUT_OF_SPECIFICATION


def test_a_span_without_width_is_refused() -> None:
    """In volts, and in metres."""
    for volts, low, high in (((1.0, 1.0), 0.0, 2.0), ((1.0, 5.0), 2.0, 2.0)):
        with pytest.raises(ValueError, match="must differ"):
            Voltage(volts, low, high)
