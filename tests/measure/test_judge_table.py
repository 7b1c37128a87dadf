"""Every cell of the judge's table, reached by a story and written down a second time, from the words of the settings.

A last good value stands while readings are merely rejected; a failure that the device signals counts at once; after a
failure two good readings in a row are needed, after a start or plain silence one.
"""

import pytest

from gateway.measure.validity.judge import FAULTS, Happens, Judge, State
from rules.model import SECOND, Fault

# How each state is reached from a start at 0: (second, what happens). Silence counts after 15 s, 5 s are tolerated.
WAYS: dict[str, list[tuple[int, Happens]]] = {
    "awaited": [],
    "good": [(1, Happens.ACCEPTED)],
    "doubtful": [(1, Happens.ACCEPTED), (2, Happens.REJECTED)],
    "failed": [(1, Happens.SIGNALLED)],
    "recovering": [(1, Happens.SIGNALLED), (2, Happens.ACCEPTED)],
    "silent": [(15, Happens.TOO_LONG)],
}

CELLS = """
              accepted    rejected    signalled   too long
awaited       good        failed      failed      silent
good          good        doubtful    failed      silent
doubtful      good        doubtful    failed      failed
failed        recovering  failed      failed      failed
recovering    good        failed      failed      failed
silent        good        failed      failed      silent
"""

USABLE = {"good", "doubtful"}


def cells() -> list[tuple[str, str, str]]:
    """Return the table's cells: state before, what happens, state after."""
    head, *rows = [line.replace("too long", "too_long").split() for line in CELLS.strip().splitlines()]
    return [(row[0], what.replace("_", " "), after) for row in rows for what, after in zip(head, row[1:], strict=True)]


def at(state: str) -> Judge:
    """Return a judge that has come into a state."""
    judge = Judge(15 * SECOND, 5 * SECOND, 2)
    judge.begin(0)
    for second, what in WAYS[state]:
        judge.happens(what, second * SECOND)
    assert judge.state == state
    return judge


@pytest.mark.parametrize(("before", "what", "after"), cells())
def test_every_cell(before: str, what: str, after: str) -> None:
    """What happens in a state leads to the state that the settings' words call for; so does the value's use."""
    judge = at(before)
    assert judge.happens(Happens(what), 16 * SECOND) == after
    assert (FAULTS[judge.state] is Fault.NONE) is (after in USABLE)


def test_no_state_and_nothing_that_can_happen_is_left_out() -> None:
    """Six states, four things that can happen."""
    assert {before for before, _, _ in cells()} == {state.value for state in State} == set(WAYS)
    assert {what for _, what, _ in cells()} == {what.value for what in Happens}


@pytest.mark.parametrize(
    ("state", "deadline"),
    [("awaited", 15), ("good", 16), ("doubtful", 7), ("failed", None), ("recovering", 17), ("silent", None)],
)
def test_every_state_says_when_it_changes_by_itself(state: str, deadline: int | None) -> None:
    """Silence from the last accepted reading or the start, tolerance from the first rejected one, else never."""
    assert at(state).deadline == (None if deadline is None else deadline * SECOND)
