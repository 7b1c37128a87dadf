"""Spikes, lag and plausibility against published vectors and reference libraries."""

import math
import random

import numpy as np
import pytest
from scipy.signal import cont2discrete
from scipy.stats import median_abs_deviation, norm

from gateway.measure.validity.filters import SCALE, Despike, Lag, hampel
from gateway.measure.validity.plausible import Plausible

SECOND = 1_000_000_000

# Source: the list and its filtered form as the library hampel 1.0.2 gives it, window 5, three sigmas, ends kept.
SPIKY = [1.0, 1.02, 1.01, 1.03, 9.0, 1.04, 1.05, 1.04, 1.06, -3.0, 1.07, 1.08, 1.07]
CALMED = [1.0, 1.02, 1.01, 1.03, 1.04, 1.04, 1.05, 1.04, 1.06, 1.06, 1.07, 1.08, 1.07]


def test_the_hampel_identifier_replaces_what_the_reference_replaces() -> None:
    """Two values of thirteen, by the median of the five around them."""
    windows = [sorted(SPIKY[k - 2 : k + 3]) for k in range(2, len(SPIKY) - 2)]
    inner = [hampel(window, value, floor=0.0) for window, value in zip(windows, SPIKY[2:-2], strict=True)]
    assert inner == CALMED[2:-2]


def test_the_scale_is_that_of_the_normal_distribution() -> None:
    """1/Φ⁻¹(3/4). Source: scipy.stats."""
    assert pytest.approx(1 / norm.ppf(0.75), abs=3e-6) == SCALE
    values = [1, 1, 2, 2, 4, 6, 9]
    assert median_abs_deviation(values) == 1
    assert hampel([float(v) for v in values], 2 + 2.99 * SCALE) == 2 + 2.99 * SCALE
    assert hampel([float(v) for v in values], 2 + 3.01 * SCALE) == 2.0


def test_a_spike_is_replaced_and_a_step_comes_through_with_one_reading_of_delay() -> None:
    """`despike: 3`: the median of the last three."""
    despike = Despike(3)
    assert [despike.take(value) for value in (1.0, 1.0, 5.0, 1.0, 1.0, 2.0, 2.0, 2.0)] == [
        1.0, 1.0, 1.0, 1.0, 1.0, 1.0, 2.0, 2.0,
    ]  # fmt: skip


def test_in_a_calm_window_small_changes_are_no_spikes() -> None:
    """The deviation of a flat window is nothing; the floor of 2 mm keeps a creeping level alive."""
    despike = Despike(5)
    values = [1.0 + 0.001 * k for k in range(20)]
    assert [despike.take(value) for value in values] == values


def test_despike_keeps_the_latest_values_only() -> None:
    """What it holds is what a plain sorted slice holds."""
    rng, despike, seen = random.Random(3), Despike(7), []
    for _ in range(500):
        value = rng.choice([0.0, -0.0, rng.uniform(0, 2), 1.0])
        seen.append(value)
        expected = hampel(sorted(seen[-7:]), value) if len(seen) >= 7 else value
        assert despike.take(value) == expected


@pytest.mark.parametrize(("after", "share"), [(1, 63.212056), (2, 86.466472), (3, 95.021293), (5, 99.326205)])
def test_the_lag_answers_a_step_as_the_exact_solution(after: int, share: float) -> None:
    """% of a step after so many time constants: 1 - e^-n; whatever the distance of the samples."""
    for samples in (1, 3, 10, 100):
        lag = Lag(10 * SECOND)
        lag.take(0, 0.0)
        answers = [lag.take(round(after * 10 * SECOND * (k + 1) / samples), 1.0) for k in range(samples)]
        assert answers[-1] * 100 == pytest.approx(share, abs=1e-6)


def test_the_lag_is_the_zero_order_hold_of_control_theory() -> None:
    """Source: scipy.signal.cont2discrete, method zoh."""
    tau, step = 10.0, 1.0
    a, b, *_ = cont2discrete(tuple(np.array([[x]]) for x in (-1 / tau, 1 / tau, 1.0, 0.0)), step, method="zoh")
    lag, y = Lag(round(tau * SECOND)), 0.0
    lag.take(0, 0.0)
    for k in range(1, 50):
        x = math.sin(k / 3)
        y = float(a[0, 0]) * y + float(b[0, 0]) * x
        assert lag.take(k * SECOND, x) == pytest.approx(y, abs=1e-9)


# Source: the QARTOD tests for water level of U.S. IOOS, flags as the library ioos_qc 3.0.0 gives them for these values,
# a minute apart; 1 is pass, 3 suspect, 4 fail.
X = [1.0, 1.01, 1.02, 1.6, 1.03, 1.04, 1.04, 1.04, 1.04, 1.04, 2.6, -0.1]
RATE_OF_CHANGE = [1, 1, 1, 3, 3, 1, 1, 1, 1, 1, 3, 3]  # faster than 5 mm/s
FLAT_LINE_FAIL = [1, 1, 1, 1, 1, 1, 1, 1, 1, 4, 1, 1]  # less than 1 mm of change within 240 s


def test_too_fast_is_what_qartod_calls_suspect() -> None:
    """Each reading against the one before, as their test does."""
    plausible = Plausible(0.005, None)
    flags = []
    for k, level in enumerate(X):
        flags.append(3 if plausible.too_fast(k * 60 * SECOND, level) else 1)
        plausible.believe(k * 60 * SECOND, level)
    assert flags == RATE_OF_CHANGE


def test_frozen_is_what_qartod_calls_a_flat_line() -> None:
    """Not one digit of change for 240 s."""
    plausible = Plausible(None, 240 * SECOND)
    flags = [4 if plausible.frozen(k * 60 * SECOND, level) else 1 for k, level in enumerate(X)]
    assert flags == FLAT_LINE_FAIL
