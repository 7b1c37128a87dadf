"""A value from readings of which some are wrong, against SciPy."""

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import median_abs_deviation

from gateway.measure.robust import steady


def test_one_wrong_reading_in_four_moves_nothing() -> None:
    """The median stands, and the spread is that of the others."""
    found = steady([1.0, 1.1, 0.9, 99.0] * 5)
    assert found.value == pytest.approx(1.05, abs=0.05)
    assert found.is_steady


def test_a_drift_is_not_steady_however_small_its_steps() -> None:
    """From the first half to the second it moves by more than its spread explains."""
    assert not steady([100 + k for k in range(20)]).is_steady
    assert steady([100 + (k * 7 % 5) for k in range(20)]).is_steady


@given(st.lists(st.floats(-100, 100), min_size=4, max_size=40))
def test_the_spread_of_one_half_twice_is_that_of_scipy(values: list[float]) -> None:
    """Source: scipy.stats.median_abs_deviation, scaled to the normal distribution."""
    found = steady([*values, *values])
    assert found.spread == pytest.approx(median_abs_deviation(values, scale="normal"), rel=1e-5, abs=1e-9)
    assert found.drift == 0


def test_three_readings_are_too_few() -> None:
    """A sentence says so."""
    with pytest.raises(ValueError, match="four readings"):
        steady([1.0, 1.0, 1.0])
