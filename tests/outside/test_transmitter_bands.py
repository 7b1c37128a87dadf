"""4-20 mA against NAMUR NE 43, and NE 107's weights."""

import pytest

from gateway.measure.sensing.current import Current
from gateway.measure.status import Status

TANK = Current(0.0, 2.5)

# Linear scaling, value = low + (I - 4)/16 · (high - low): a span of 0 to 2.5 m. Source: IEC 60381-1 for the 4 and
# 20 mA ends (from memory); the arithmetic is its own proof.
LINEAR = {4.0: 0.0, 8.0: 0.625, 12.0: 1.25, 16.0: 1.875, 20.0: 2.5, 3.8: -0.03125, 20.5: 2.578125}

# NAMUR NE 43: measuring 3.8 to 20.5 mA, failure from 3.6 mA down and from 21 mA up. The recommendation is not free;
# the limits are as restated on the open pages of electricalandcontrol.com and zeroinstrument.com.
FAILURES = [0.0, 2.0, 3.59, 3.6, 21.0, 21.6, 24.0]
IN_RANGE = [4.0, 12.0, 20.0]
OUT_OF_RANGE = [3.8, 3.9, 20.01, 20.5]
GAPS = [3.61, 3.79, 20.51, 20.99]


@pytest.mark.parametrize("milliamperes", LINEAR)
def test_the_scaling_is_linear(milliamperes: float) -> None:
    """The level of every row of the table."""
    assert TANK.convert(milliamperes * 1e-3).level == pytest.approx(LINEAR[milliamperes], abs=1e-12)


@pytest.mark.parametrize("milliamperes", FAILURES)
def test_a_failure_current_is_signalled_by_the_device(milliamperes: float) -> None:
    """NE 43: such a current is no measurement, and says so by itself."""
    found = TANK.convert(milliamperes * 1e-3)
    assert (found.level, found.status, found.signalled) == (None, Status.FAILURE, True)
    assert found.reason is not None
    assert "signals a failure" in found.reason


@pytest.mark.parametrize("milliamperes", IN_RANGE)
def test_a_current_within_four_and_twenty_is_good(milliamperes: float) -> None:
    """NE 43: measuring information, within the span."""
    assert TANK.convert(milliamperes * 1e-3).status is Status.GOOD


@pytest.mark.parametrize("milliamperes", OUT_OF_RANGE)
def test_a_current_just_outside_is_usable_and_out_of_specification(milliamperes: float) -> None:
    """NE 43: still measuring information, outside the span."""
    found = TANK.convert(milliamperes * 1e-3)
    assert (found.status, found.status.usable, found.held) == (Status.OUT_OF_SPECIFICATION, True, False)


@pytest.mark.parametrize("milliamperes", GAPS)
def test_in_the_gaps_what_was_thought_before_is_held(milliamperes: float) -> None:
    """NE 43 leaves the gaps open: the current alone decides nothing there. A choice of ours."""
    found = TANK.convert(milliamperes * 1e-3)
    assert (found.held, found.signalled) == (True, False)


def test_which_values_rules_may_act_on() -> None:
    """NAMUR NE 107: a failed device and one that is worked on give no measurement; the others do."""
    usable = {status.value for status in Status if status.usable}
    assert usable == {"good", "maintenance required", "out of specification"}


def test_the_order_of_the_words() -> None:
    """NE 107:2006 as quoted in instrument manuals: failure, function check, out of specification, maintenance."""
    weights = [status.value for status in Status]
    assert weights == ["good", "maintenance required", "out of specification", "function check", "failure"]
