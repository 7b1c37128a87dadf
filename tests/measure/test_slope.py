"""The running slope against least squares over the same samples, computed at once by SciPy."""

import json
import random

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import linregress

from gateway.measure.trend.slope import SECOND, Slope

WINDOW = 60 * SECOND


def fed(samples: list[tuple[int, float]], over: int = WINDOW) -> Slope:
    """Return a slope that has taken the samples."""
    slope = Slope(over)
    for sample in samples:
        slope.take(*sample)
    return slope


def by_scipy(samples: list[tuple[int, float]], over: int = WINDOW) -> float:
    """Return the slope over the latest window. Source: scipy.stats.linregress."""
    end = samples[-1][0]
    inside = [(t / SECOND, y) for t, y in samples if t >= end - over]
    return float(linregress(*zip(*inside, strict=True)).slope)


@given(st.lists(st.tuples(st.integers(1, 5000), st.integers(-10, 10)), min_size=20, max_size=200), st.integers(-9, 9))
def test_it_is_the_least_squares_slope_of_the_window(steps: list[tuple[int, int]], trend: int) -> None:
    """Readings at any distance, with a ripple of up to 0.1 mm, too little for a spike, on a steady rise or fall."""
    t, samples = 10**15, []
    for pause, ripple in steps:
        t += max(pause * SECOND // 1000, WINDOW // 240)
        samples.append((t, trend * 1e-4 * (t - 10**15) / SECOND + ripple * 1e-5))
    slope = fed(samples).slope()
    inside = [one for one in samples if one[0] >= samples[-1][0] - WINDOW]
    if (inside[-1][0] - inside[0][0]) * 4 < WINDOW or len(inside) < 3:
        assert slope is None
    else:
        assert slope == pytest.approx(by_scipy(samples), rel=1e-6, abs=1e-9)


def test_a_million_readings_add_up_no_error() -> None:
    """Sums are made anew often enough, at times as large as those of a machine that has run for years."""
    rng = random.Random(5)
    samples = [(10**17 + n * SECOND // 2, 1.5 + 1e-4 * n / 2 + rng.uniform(-1e-3, 1e-3)) for n in range(200_000)]
    assert fed(samples).slope() == pytest.approx(by_scipy(samples), rel=1e-7)


def test_a_spike_is_set_aside_and_a_step_is_not() -> None:
    """One reading half a metre off moves nothing; two to the same side do."""
    calm = [(n * SECOND, 1.0 + 0.001 * n) for n in range(40)]
    plain = fed(calm).slope()
    assert plain == pytest.approx(0.001)
    spiked = fed([*calm, (40 * SECOND, 1.54), (41 * SECOND, 1.041)])
    assert spiked.slope() == pytest.approx(0.001)
    stepped = fed([*calm, (40 * SECOND, 1.54), (41 * SECOND, 1.541)]).slope()
    assert stepped is not None
    assert stepped > 0.004


def test_two_spikes_to_different_sides_move_nothing() -> None:
    """They are no step."""
    calm = [(n * SECOND, 1.0) for n in range(40)]
    assert fed([*calm, (40 * SECOND, 1.5), (41 * SECOND, 0.5), (42 * SECOND, 1.0)]).slope() == pytest.approx(0.0)


def test_many_readings_are_thinned_to_a_bounded_number() -> None:
    """A kilohertz costs no more memory than what the window can hold, and gives the same slope."""
    slope = fed([(n * SECOND // 1000, 1e-3 * n / 1000) for n in range(100_000)])
    assert len(slope.save()["times"]) <= 241
    assert slope.slope() == pytest.approx(1e-3)


def test_too_little_says_nothing() -> None:
    """Neither no reading, nor two, nor a hundred in the blink of an eye."""
    assert fed([]).slope() is None
    assert fed([(0, 1.0), (WINDOW, 1.0)]).slope() is None
    assert fed([(n * WINDOW // 240, 1.0) for n in range(50)]).slope() is None


@given(st.lists(st.tuples(st.integers(1, 9), st.integers(0, 1000)), max_size=60), st.integers(0, 60))
def test_a_saved_slope_goes_on_as_if_it_had_never_stopped(steps: list[tuple[int, int]], at: int) -> None:
    """To the last digit."""
    whole, copy, t = Slope(WINDOW), Slope(WINDOW), 0
    for number, (pause, y) in enumerate(steps):
        if number == at:
            copy = Slope(WINDOW)
            copy.restore(json.loads(json.dumps(whole.save())))
        t += pause * SECOND
        whole.take(t, y / 1000)
        copy.take(t, y / 1000)
        assert whole.slope() == copy.slope()
        assert whole.save() == copy.save()
