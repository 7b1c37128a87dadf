"""The judge: when a value is usable. Times in seconds, for reading."""

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.validity.judge import FAULTS, TABLE, Happens, Judge, State
from rules.model import SECOND, Fault

A, R, S = Happens.ACCEPTED, Happens.REJECTED, Happens.SIGNALLED


def judged(
    story: list[tuple[float, Happens]], *, silent_after: float | None = 15, tolerate: float = 5, good_again: int = 2
) -> Judge:
    """Return a judge begun at 0 to whom `story` has happened, deadlines fired in between as they fell due."""
    silent = None if silent_after is None else round(silent_after * SECOND)
    judge = Judge(silent, round(tolerate * SECOND), good_again)
    judge.begin(0)
    for seconds, what in story:
        pass_to(judge, seconds)
        judge.happens(what, round(seconds * SECOND))
    return judge


def pass_to(judge: Judge, seconds: float) -> State:
    """Let time pass up to `seconds`, firing what falls due before it."""
    while judge.deadline is not None and judge.deadline < seconds * SECOND:
        judge.happens(Happens.TOO_LONG, judge.deadline)
    return judge.state


def test_the_table_knows_every_state_and_everything_that_can_happen() -> None:
    """Nothing that can happen is without a row, and every state has its fault."""
    assert set(TABLE) == set(itertools.product(State, Happens))
    assert set(FAULTS) == set(State)


def test_one_good_reading_is_enough_at_the_start() -> None:
    """A start needs no second reading."""
    assert judged([]).state is State.AWAITED
    assert judged([(1, A)]).state is State.GOOD


def test_nothing_at_all_after_the_start_is_silence() -> None:
    """Awaiting ends when the sensor has been silent for too long since the start."""
    judge = judged([])
    assert pass_to(judge, 15) is State.AWAITED
    assert pass_to(judge, 15.1) is State.SILENT


def test_a_reading_stands_until_it_has_been_silent_for_too_long() -> None:
    """Silence counts from the arrival of the last accepted reading, and the deadline says so beforehand."""
    judge = judged([(1, A), (6, A)])
    assert judge.deadline == 21 * SECOND
    assert pass_to(judge, 21) is State.GOOD
    assert pass_to(judge, 21.1) is State.SILENT


def test_one_good_reading_is_enough_after_plain_silence() -> None:
    """Silence is no failure of the measurement."""
    assert judged([(1, A), (60, A)], good_again=3).state is State.GOOD


def test_a_rejected_reading_leaves_the_last_good_one_in_use_for_a_while() -> None:
    """For `tolerate`, and no longer."""
    judge = judged([(5, A), (10, R)])
    assert judge.state is State.DOUBTFUL
    assert FAULTS[judge.state] is Fault.NONE
    assert judge.deadline == 15 * SECOND
    assert pass_to(judge, 15.1) is State.FAILED


def test_more_rejected_readings_win_no_time() -> None:
    """What is tolerated counts from the first rejected reading after the last good one."""
    assert judged([(5, A), (10, R), (12, R), (14, R)]).deadline == 15 * SECOND


def test_a_good_reading_within_the_time_makes_all_well() -> None:
    """One is enough: there was no failure yet. The time starts anew with the next rejected one."""
    judge = judged([(5, A), (10, R), (14, A)])
    assert judge.state is State.GOOD
    judge.happens(R, 16 * SECOND)
    assert judge.deadline == 21 * SECOND


def test_rejected_readings_keep_no_old_value_alive() -> None:
    """Silence of accepted readings ends the use of the last one, however long rejected ones are tolerated."""
    judge = judged([(5, A), (10, R)], tolerate=60)
    assert judge.deadline == 20 * SECOND
    assert pass_to(judge, 20.1) is State.FAILED


def test_where_nothing_is_tolerated_a_rejected_reading_counts_at_once() -> None:
    """`tolerate: 0 s` leaves no instant."""
    assert judged([(5, A), (10, R)], tolerate=0).state is State.FAILED


@pytest.mark.parametrize("story", [[], [(1, A)], [(1, A), (2, R)], [(1, A), (30, R)]])
def test_a_signalled_failure_counts_at_once(story: list[tuple[float, Happens]]) -> None:
    """What the device says of itself needs no second opinion, whatever was before."""
    assert judged([*story, (31, S)]).state is State.FAILED


def test_a_rejected_first_reading_is_a_failure() -> None:
    """There is no good one to fall back on, at the start and after silence."""
    assert judged([(1, R)]).state is State.FAILED
    assert judged([(1, A), (30, R)]).state is State.FAILED


@pytest.mark.parametrize("needed", [1, 2, 3])
def test_after_a_failure_several_good_readings_in_a_row_are_needed(needed: int) -> None:
    """Exactly `good_again` of them."""
    fewer = [(2.0 + i, A) for i in range(needed - 1)]
    assert FAULTS[judged([(1, S), *fewer], good_again=needed).state] is Fault.FAILED
    assert judged([(1, S), *fewer, (9, A)], good_again=needed).state is State.GOOD


@pytest.mark.parametrize("bad", [R, S])
def test_a_bad_reading_among_them_starts_the_count_anew(bad: Happens) -> None:
    """In a row means without a bad one between."""
    assert judged([(1, S), (2, A), (3, bad), (4, A)]).state is State.RECOVERING
    assert judged([(1, S), (2, A), (3, bad), (4, A), (5, A)]).state is State.GOOD


def test_silence_among_them_starts_the_count_anew() -> None:
    """Two good readings an hour apart are not in a row."""
    assert judged([(1, S), (2, A), (3600, A)]).state is State.RECOVERING
    assert judged([(1, S), (2, A), (3600, A), (3601, A)]).state is State.GOOD


def test_good_readings_before_a_failure_do_not_count_for_it() -> None:
    """The count begins after the failure."""
    assert judged([(1, A), (2, A), (3, R), (4, A), (5, S), (6, A)]).state is State.RECOVERING


def test_without_a_time_silence_says_nothing() -> None:
    """A sensor that sends only changes may be quiet for ever."""
    judge = judged([(1, A)], silent_after=None)
    assert judge.deadline is None


# ---- for any story -------------------------------------------------------------------------------------------

STORIES = st.lists(st.tuples(st.floats(0.1, 20), st.sampled_from([A, R, S])), max_size=15).map(
    lambda steps: list(zip(itertools.accumulate(gap for gap, _ in steps), (what for _, what in steps), strict=True))
)


@given(STORIES, st.floats(0, 40), st.integers(1, 3))
def test_saved_and_restored_it_goes_on_the_same(
    story: list[tuple[float, Happens]], later: float, good_again: int
) -> None:
    """A restored judge is where the saved one was, for every continuation."""
    judge = judged(story, good_again=good_again)
    other = Judge(judge.silent_after, judge.tolerate, judge.good_again)
    other.restore(judge.save())
    end = (story[-1][0] if story else 0) + later
    assert pass_to(other, end) is pass_to(judge, end)
    for what in (A, A, R, S, A, A, A):
        assert other.happens(what, round(end * SECOND)) is judge.happens(what, round(end * SECOND))
        assert other.deadline == judge.deadline


@given(STORIES, st.floats(0, 40))
def test_a_usable_value_is_never_older_than_silence_allows(story: list[tuple[float, Happens]], later: float) -> None:
    """Whatever came: usable means accepted within `silent_after`, and rejected for no longer than tolerated."""
    judge = judged(story)
    end = (story[-1][0] if story else 0) + later
    if FAULTS[pass_to(judge, end)] is not Fault.NONE:
        return
    accepted = [seconds for seconds, what in story if what is A]
    assert accepted
    assert end - accepted[-1] <= 15 + 1e-6
    assert not [1 for seconds, what in story if what is S and seconds > accepted[-1]]
    rejected = [seconds for seconds, what in story if what is R and seconds > accepted[-1]]
    assert not rejected or end - rejected[0] <= 5 + 1e-6


@given(STORIES, st.lists(st.floats(0, 300), max_size=10))
def test_looking_in_between_changes_nothing(story: list[tuple[float, Happens]], looks: list[float]) -> None:
    """Deadlines fire at their own times, however often time is let pass."""
    looked = Judge(15 * SECOND, 5 * SECOND, 2)
    looked.begin(0)
    for seconds, what in story:
        for look in sorted(looks):
            if look < seconds:
                pass_to(looked, look)
        pass_to(looked, seconds)
        looked.happens(what, round(seconds * SECOND))
    assert looked.save() == judged(story).save()
