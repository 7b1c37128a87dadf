"""Calibration curves against SciPy, which computes them at once and in its own way."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.interpolate import PchipInterpolator
from scipy.stats import linregress

from gateway.measure.calibration import Covered, Line, Smooth, least_squares, through
from rules.model import Bounds

GAPS = st.floats(0.01, 10.0)


@st.composite
def monotone_points(draw: st.DrawFn, fewest: int = 3) -> list[tuple[float, float]]:
    """Return points whose levels all rise, or all fall, with x."""
    steps = draw(st.lists(st.tuples(GAPS, GAPS), min_size=fewest, max_size=9))
    sign, x, level, points = draw(st.sampled_from([1.0, -1.0])), -3.0, 0.5, []
    for dx, dy in steps:
        x, level = x + dx, level + sign * dy
        points.append((x, level))
    return points


@given(monotone_points(), st.floats(0.0, 1.0))
def test_the_smooth_curve_is_scipys_pchip(points: list[tuple[float, float]], share: float) -> None:
    """Within the points. Source: scipy.interpolate.PchipInterpolator."""
    curve = through(points)
    assert isinstance(curve, Smooth)
    x = points[0][0] + share * (points[-1][0] - points[0][0])
    reference = PchipInterpolator(*zip(*points, strict=True))
    assert curve.level(x) == pytest.approx(float(reference(x)), rel=1e-9, abs=1e-9)


@given(monotone_points(), st.floats(-0.5, 1.5), st.floats(-0.5, 1.5))
def test_monotone_in_monotone_out_and_back_again(points: list[tuple[float, float]], one: float, other: float) -> None:
    """Beyond the points too; and the inverse of the inverse is where one began."""
    curve = through(points)
    first, span = points[0][0], points[-1][0] - points[0][0]
    x, y = sorted((first + one * span, first + other * span))
    rising = points[-1][1] > points[0][1]
    low, high = (curve.level(x), curve.level(y)) if rising else (curve.level(y), curve.level(x))
    assert low <= high + 1e-9
    assert curve.level(curve.x(curve.level(x))) == pytest.approx(curve.level(x), abs=1e-6)


@given(monotone_points(fewest=4), st.lists(st.floats(-0.004, 0.004), min_size=9, max_size=9))
def test_least_squares_is_scipys(points: list[tuple[float, float]], noise: list[float]) -> None:
    """The line, its residuals, and the standard errors. Source: scipy.stats.linregress."""
    points = [(x, level + off) for (x, level), off in zip(points, noise, strict=False)]
    fitted = least_squares(points)
    xs, levels = (np.array(values) for values in zip(*points, strict=True))
    reference = linregress(xs, levels)
    assert fitted.level(xs[0]) == pytest.approx(reference.intercept + reference.slope * xs[0], abs=1e-9)
    expected = levels - (reference.intercept + reference.slope * xs)
    assert fitted.residuals == pytest.approx(tuple(expected), abs=1e-9)
    at_zero_x = fitted.error_at(fitted.level(0.0))
    assert at_zero_x == pytest.approx(reference.intercept_stderr, rel=1e-6, abs=1e-6)


@pytest.mark.parametrize(
    ("points", "said"),
    [
        ([(1.0, 1.0)], "needs two points or more"),
        ([(1.0, 1.0), (1.0, 2.0)], "must differ"),
        ([(1.0, 1.0), (2.0, 1.0)], "must differ"),
        ([(1.0, 0.1), (2.0, 0.3), (3.0, 0.2), (4.0, 0.5)], "the one at 0.2 m is out of order"),
        ([(4.0, 0.1), (3.0, 0.2), (2.0, 0.15), (1.0, 0.4)], "rise and fall"),
    ],
)
def test_points_that_give_no_curve_are_refused(points: list[tuple[float, float]], said: str) -> None:
    """A curve that turns would give two levels for one reading."""
    for way in (through, least_squares):
        with pytest.raises(ValueError, match=said):
            way(points)


def test_two_points_are_a_line() -> None:
    """Whatever way is asked for."""
    assert isinstance(through([(2.0, 1.0), (1.0, 0.5)]), Line)
    fitted = least_squares([(1.0, 0.5), (2.0, 1.0)])
    assert fitted.level(4.0) == pytest.approx(2.0)
    assert math.isnan(fitted.error)


def test_at_the_ends_of_what_a_probe_covers_only_a_bound_is_known() -> None:
    """A probe from 5 cm to 1.95 m that reads dry says: at most 5 cm."""
    probe = Covered(0.05, 1.95)
    assert probe.of(1.0) == 1.0
    assert probe.of(0.05) == probe.of(0.02) == Bounds(-math.inf, 0.05)
    assert probe.of(1.96) == Bounds(1.95, math.inf)
