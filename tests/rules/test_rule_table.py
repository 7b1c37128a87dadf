"""Every cell of the rule table, typed here a second time from its description."""

from itertools import product

import pytest

from rules.model import OnUnknown, Rank, Rhythm
from rules.rule import Side, verdicts

F, U, T, X = Side.FALSE, Side.TOLERATED, Side.TRUE, Side.UNDECIDED
ACT, HOLD, RELEASE = OnUnknown.ACT, OnUnknown.HOLD, OnUnknown.RELEASE


def described(rank: Rank, if_unknown: OnUnknown, from_: Side, until: Side, choice: OnUnknown, *, held: bool) -> bool:
    """Return what the description of the table says, sentence by sentence."""
    protective = rank != Rank.AUTO
    acting = protective or if_unknown is ACT
    if from_ is T:
        return not (rank is Rank.AUTO and until is T)
    if from_ is X and not held:
        return choice is ACT
    if not held:
        return False
    if until is T:  # a protective rule leaves force only when `from` is known to be false
        return {F: False, U: acting, X: choice is ACT or (choice is HOLD and protective)}[from_]
    if until is X:
        return choice in {ACT, HOLD}
    return True


@pytest.mark.parametrize("rank", [Rank.TRIP, Rank.INTERLOCK, Rank.AUTO])
@pytest.mark.parametrize("if_unknown", list(OnUnknown))
def test_every_cell_is_as_described(rank: Rank, if_unknown: OnUnknown) -> None:
    """Sixteen pairs of sides, in and out of force, for each thing that a rule can say of unknown."""
    table = verdicts(rank, if_unknown)
    cells = list(product(Side, Side, (False, True), OnUnknown))
    assert set(table) == set(cells)
    for from_, until, in_force, choice in cells:
        expected = described(rank, if_unknown, from_, until, choice, held=in_force)
        assert table[from_, until, in_force, choice] == expected, (from_, until, in_force, choice)


@pytest.mark.parametrize("rank", [Rank.TRIP, Rank.INTERLOCK, Rank.AUTO])
def test_invariant_07_the_table_is_idempotent_in_one_instant(rank: Rank) -> None:
    """Judging twice with the same sides gives what judging once gives."""
    for if_unknown in (*OnUnknown, Rhythm(act_for=1, every=2)):
        table = verdicts(rank, if_unknown)
        for (from_, until, _, choice), after in table.items():
            assert table[from_, until, after, choice] == after


def test_a_protective_rule_with_true_from_is_in_force_whatever_else() -> None:
    """Set-dominant: nothing that is known or unknown of `until` matters."""
    for rank, until, in_force, choice in product((Rank.TRIP, Rank.INTERLOCK), Side, (False, True), OnUnknown):
        assert verdicts(rank, HOLD)[T, until, in_force, choice]
