"""Readings that carry their own time: what is news, what is not, and how old news is."""

import json

from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.validity.age import Ages

S = 1_000_000_000
NOON = 1_777_000_000 * S


def stored() -> Ages:
    """Return the ages of a device that stores and forwards; half a minute makes a reading old."""
    return Ages(buffers=True, old=30 * S)


def plain() -> Ages:
    """Return the ages of a device that does not."""
    return Ages(buffers=False, old=30 * S)


def test_what_has_come_before_and_what_is_older_is_no_news() -> None:
    """Each kind is counted by itself."""
    for ages in (stored(), plain()):
        assert ages.take(NOON, NOON - S).age is not None
        assert ages.take(NOON + S, NOON - S) == (None, "it has come before")
        assert ages.take(NOON + S, NOON - 5 * S) == (None, "a newer one has come before it")
        assert ages.take(NOON + S, NOON).age is not None
        assert ages.refused == {"duplicate": 1, "older": 1, "late": 0, "future": 0}


def test_a_stored_reading_is_as_old_as_it_says() -> None:
    """Beyond the silence that is tolerated it is history."""
    ages = stored()
    assert ages.take(NOON, NOON - 29 * S).age == 29 * S
    assert ages.take(NOON + 20 * S, NOON - 20 * S) == (None, "its own time is 40 s ago")
    assert ages.take(NOON + 21 * S, NOON + 21 * S).age == 0


def test_a_stored_reading_from_the_future_is_refused_and_a_clock_slightly_ahead_is_not() -> None:
    """A minute is what clocks may be apart."""
    ages = stored()
    assert ages.take(NOON, NOON + 59 * S).age == 0
    assert ages.take(NOON + S, NOON + 62 * S + 1).age is None
    assert ages.refused["future"] == 1


def test_a_clock_that_was_never_set_does_no_harm_where_nothing_is_stored() -> None:
    """The difference of the clocks is measured; what takes longer than the quickest is delay."""
    ages = plain()
    for k in range(10):
        assert ages.take(NOON + k * S, k * S) == (0, None)
    assert ages.offset == NOON
    assert ages.take(NOON + 15 * S, 10 * S).age == 5 * S
    assert ages.take(NOON + 60 * S, 11 * S) == (None, "it has been under way for 49 s")
    assert ages.take(NOON + 61 * S, 61 * S).age == 0


def test_a_device_that_starts_anew_with_its_clock_at_nothing_is_believed_after_three_readings() -> None:
    """Until then they look like old ones that come again."""
    ages = plain()
    assert ages.take(NOON, NOON).age == 0
    assert [ages.take(NOON + k * S, k * S).age for k in range(1, 5)] == [None, None, 0, 0]
    assert stored_never_believes()


def stored_never_believes() -> bool:
    """Return whether a device that stores is not believed so: these may be old readings."""
    ages = stored()
    ages.take(NOON, NOON)
    return all(ages.take(NOON + k * S, NOON - 1000 * S + k * S).age is None for k in range(1, 9))


def test_the_offset_follows_a_clock_that_drifts() -> None:
    """It is of the last half hour or hour, so a clock that runs slow is not mistaken for delay for ever."""
    ages = plain()
    for k in range(0, 100_000, 10):
        age = ages.take(NOON + k * S, NOON + k * S - k * S // 1000).age
        assert age is not None
        assert age < 5 * S


@given(st.lists(st.tuples(st.integers(0, 90), st.integers(-40, 90)), max_size=40), st.booleans(), st.integers(0, 40))
def test_saved_ages_go_on_as_if_they_had_never_stopped(steps: list[tuple[int, int]], buffers: bool, at: int) -> None:  # noqa: FBT001 - hypothesis gives it
    """To the nanosecond."""
    whole, copy, t = Ages(buffers=buffers, old=30 * S), Ages(buffers=buffers, old=30 * S), NOON
    for number, (pause, behind) in enumerate(steps):
        if number == at:
            copy = Ages(buffers=buffers, old=30 * S)
            copy.restore(json.loads(json.dumps(whole.save())))
        t += pause * S
        assert whole.take(t, t - behind * S) == copy.take(t, t - behind * S)
        assert whole.save() == copy.save()
