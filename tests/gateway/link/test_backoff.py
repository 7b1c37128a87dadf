"""Waits between attempts grow, stay below their cap, and differ between gateways."""

from hypothesis import given
from hypothesis import strategies as st

from gateway.link.backoff import Backoff


@given(st.lists(st.floats(0, 1, exclude_max=True), min_size=1, max_size=80))
def test_waits_lie_in_the_upper_half_of_a_span_that_doubles_up_to_the_cap(shares: list[float]) -> None:
    """After n failures the wait lies between half of min(first * 2^n, most) and the whole of it."""
    numbers = iter(shares)
    backoff = Backoff(1_000, 10_000, lambda: next(numbers))
    for failures in range(len(shares)):
        span = min(1_000 * 2**failures, 10_000)
        assert span // 2 <= backoff.wait() <= span


def test_a_proven_connection_forgets_the_failures() -> None:
    """After a reset the next wait is a first one again."""
    backoff = Backoff(1_000, 10_000, lambda: 0.5)
    first = backoff.wait()
    backoff.wait()
    backoff.reset()
    assert backoff.wait() == first
