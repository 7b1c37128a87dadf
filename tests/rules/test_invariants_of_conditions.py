"""Properties that conditions have for any signals: invariants 1 to 6."""

import math
from itertools import product

import pytest
from hypothesis import given
from hypothesis import strategies as st
from sentences import CONTACTS, Trial

from rules.model import Bounds
from rules.truth import FALSE, TRUE, UNKNOWN, at_least, negate

TRUTHS = st.sampled_from((FALSE, UNKNOWN, TRUE))
STEPS = st.lists(TRUTHS, min_size=1, max_size=25)  # what a contact is from each whole second on
DELAYS = st.integers(min_value=0, max_value=6)


def least(steps: list[int], begin: int, end: int) -> int:
    """Return the least of a step function over the closed window, by brute force; unknown before the start.

    A step holds from its second up to the next, which it no longer includes.
    """
    values: list[int] = [UNKNOWN] if begin < 0 else []
    values += [value for second, value in enumerate(steps) if second <= end and second + 1 > begin]
    return min(values)


def run(text: str, *signals: list[int]) -> list[int]:
    """Return the truth of a condition at each whole second, its contacts stepping as given."""
    trial = Trial(text)
    answers = []
    for second, values in enumerate(zip(*signals, strict=True)):
        for name, value in zip(CONTACTS, values, strict=False):
            trial.put(name, value)
        answers.append(trial.at(second))
    return answers


@given(st.lists(st.sampled_from((FALSE, TRUE)), min_size=1, max_size=25), DELAYS)
def test_invariant_01_without_unknowns_for_is_the_iec_on_delay(steps: list[int], delay: int) -> None:
    """TON, evaluated each second: the output has changed at the exact expiry."""
    elapsed, on_delay = 0, []
    rose: int | None = None
    for second, value in enumerate(steps):
        rose = (second if rose is None else rose) if value == TRUE else None
        elapsed = second - rose if rose is not None else 0
        on_delay.append(TRUE if rose is not None and elapsed >= delay else FALSE)
    # Before the start nothing is known, so what was true from the start on is unknown for the length of the delay.
    answers = run(f"a is yes for {delay} s", steps)
    began_true = next((second for second, value in enumerate(steps) if value == FALSE), len(steps))
    for second, (answer, expected) in enumerate(zip(answers, on_delay, strict=True)):
        assert answer == (UNKNOWN if second < min(began_true, delay) else expected)


@given(STEPS, DELAYS)
def test_invariant_02_for_is_the_least_over_the_closed_window(steps: list[int], delay: int) -> None:
    """The three values that are kept give what looking at every instant gives."""
    expected = [least(steps, second - delay, second) for second in range(len(steps))]
    assert run(f"a is yes for {delay} s", steps) == expected


@given(STEPS, DELAYS, DELAYS)
def test_invariant_03_for_within_for_is_for_the_sum(steps: list[int], one: int, other: int) -> None:
    """(X for a) for b = X for (a + b)."""
    assert run(f"(a is yes for {one} s) for {other} s", steps) == run(f"a is yes for {one + other} s", steps)


@given(STEPS, DELAYS)
def test_invariant_04_a_vote_of_delays_is_no_more_than_the_delay_of_the_vote(steps: list[int], delay: int) -> None:
    """At least n of (Xi for d) is at most (at least n of Xi) for d; not (X for d) is the greatest of not X."""
    others = [steps[::-1], [negate(value) for value in steps]]
    held = ", ".join(f"{name} is yes for {delay} s" for name in CONTACTS)
    plain = ", ".join(f"{name} is yes" for name in CONTACTS)
    inside = run(f"at least 2 of ({held})", steps, *others)
    outside = run(f"(at least 2 of ({plain})) for {delay} s", steps, *others)
    assert all(a <= b for a, b in zip(inside, outside, strict=True))
    greatest = [negate(least(steps, second - delay, second)) for second in range(len(steps))]
    assert run(f"not (a is yes for {delay} s)", steps) == greatest


SENTENCES = (
    "a is yes and b is yes or c is no",
    "not (a is yes or b is no) and c is yes",
    "at least 2 of (a is yes, b is yes, c is yes)",
    "2oo3(a is no, not b is yes, c is yes) or a is yes and c is no",
)


@given(st.sampled_from(SENTENCES), st.tuples(TRUTHS, TRUTHS, TRUTHS))
def test_invariant_05_learning_an_unknown_never_turns_a_decided_answer_around(
    text: str, values: tuple[int, int, int]
) -> None:
    """An answer that is true or false with unknowns in it stays so, whatever they turn out to be."""
    answer = run(text, *([value] for value in values))[0]
    for known in product(*[(value,) if value != UNKNOWN else (FALSE, TRUE) for value in values]):
        learned = run(text, *([value] for value in known))[0]
        assert learned != UNKNOWN
        assert answer in {UNKNOWN, learned}


@given(st.integers(1, 4), st.lists(TRUTHS, min_size=4, max_size=4))
def test_invariant_06_a_vote_is_decided_exactly_when_every_completion_agrees(needed: int, votes: list[int]) -> None:
    """True iff true for every completion of its unknown members, false likewise."""
    completions = product(*[(vote,) if vote != UNKNOWN else (FALSE, TRUE) for vote in votes])
    outcomes = {sum(vote == TRUE for vote in votes) >= needed for votes in completions}
    expected = UNKNOWN if len(outcomes) == 2 else TRUE if True in outcomes else FALSE
    assert at_least(needed, votes) == expected


COMPARISONS = (
    "x above 1 m",
    "x below y",
    "x at least y + 1 m",
    "x - y at most 0.5 m",
    "-2 * x > y",
    "x between 1 m and 2 m",
    "x between y and 3 m",
    "not (x <= 2 * y)",
)
VALUES = st.integers(-8, 8).map(lambda quarters: quarters / 4)
ENDS = st.tuples(VALUES | st.just(-math.inf), VALUES | st.just(math.inf))
WITHIN = ENDS.map(lambda ends: Bounds(min(ends), max(ends)))


@given(st.sampled_from(COMPARISONS), WITHIN, WITHIN | VALUES, st.data())
def test_what_bounds_decide_holds_for_every_value_within_them(
    text: str, x: Bounds, y: Bounds | float, data: st.DataObject
) -> None:
    """An answer that is true or false with bounds in it is that of any values within them."""
    answer = compared(text, x, y)
    for _ in range(6):
        exact = compared(text, data.draw(_inside(x)), data.draw(_inside(y)))
        assert exact != UNKNOWN
        assert answer in {UNKNOWN, exact}


def _inside(known: Bounds | float) -> st.SearchStrategy[float]:
    if isinstance(known, float):
        return st.just(known)
    low, high = max(known.low, -100.0), min(known.high, 100.0)
    return st.sampled_from([low, high, (low + high) / 2])


def compared(text: str, x: Bounds | float, y: Bounds | float) -> int:
    """Return the truth of a comparison of the two levels."""
    trial = Trial(text)
    trial.put("x", value=x)
    trial.put("y", value=y)
    return trial.at(0)


BOUNDED = [
    ("x above 1 m", Bounds(1.5, math.inf), TRUE),
    ("x above 1 m", Bounds(0.5, math.inf), UNKNOWN),
    ("x above 1 m", Bounds(-math.inf, 1.0), FALSE),
    ("x at least 1 m", Bounds(1.0, math.inf), TRUE),
    ("x below 2 m", Bounds(2.0, math.inf), FALSE),
    ("x below 2 m", Bounds(-math.inf, 1.9), TRUE),
    ("x between 1 m and 2 m", Bounds(1.2, 1.8), TRUE),
    ("x between 1 m and 2 m", Bounds(2.1, math.inf), FALSE),
    ("x + 1 m above 2 m", Bounds(1.5, math.inf), TRUE),
    ("2 m - x above 1 m", Bounds(1.5, math.inf), FALSE),
    ("x is usable", Bounds(0.0, 1.0), TRUE),
]


@pytest.mark.parametrize(("text", "known", "truth"), BOUNDED)
def test_a_level_known_only_within_bounds_is_used_one_sidedly(text: str, known: Bounds, truth: int) -> None:
    """A comparison that the bound settles is true or false, any other unknown."""
    trial = Trial(text)
    trial.put("x", value=known)
    assert trial.at(0) == truth
