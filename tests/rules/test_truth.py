"""Three-valued truth against published tables."""

import itertools

import pytest

from rules.truth import FALSE, TRUE, UNKNOWN, Truth, at_least, negate

LETTER = {"T": TRUE, "F": FALSE, "U": UNKNOWN}

# Source: pandas 3.1.1 user guide, "Kleene logical operations" with pd.NA as unknown.
AND = {"TT": "T", "TF": "F", "TU": "U", "FT": "F", "FF": "F", "FU": "F", "UT": "U", "UF": "F", "UU": "U"}
OR = {"TT": "T", "TF": "T", "TU": "T", "FT": "T", "FF": "F", "FU": "U", "UT": "T", "UF": "U", "UU": "U"}


@pytest.mark.parametrize("pair", AND)
def test_and_is_the_least_and_or_the_greatest(pair: str) -> None:
    """Strong Kleene conjunction and disjunction come out of the order of the numbers."""
    values = [LETTER[letter] for letter in pair]
    assert min(values) == LETTER[AND[pair]]
    assert max(values) == LETTER[OR[pair]]


def test_not_mirrors_and_leaves_unknown_alone() -> None:
    """Not true is false, not false is true, not unknown is unknown."""
    assert [negate(LETTER[letter]) for letter in "TFU"] == [FALSE, TRUE, UNKNOWN]


# Source: 2oo3 = (a·b)+(b·c)+(a·c) in the same logic; the order of the inputs does not matter.
TWO_OF_THREE = {
    "TTT": "T", "TTF": "T", "TTU": "T", "TFF": "F", "TFU": "U",
    "TUU": "U", "FFF": "F", "FFU": "F", "FUU": "U", "UUU": "U",
}  # fmt: skip


@pytest.mark.parametrize("votes", list(itertools.product("TFU", repeat=3)))
def test_two_of_three_over_all_27_combinations(votes: tuple[str, str, str]) -> None:
    """A vote is never quietly turned into another vote when a member is unknown."""
    a, b, c = (LETTER[vote] for vote in votes)
    expected = LETTER[TWO_OF_THREE["".join(sorted(votes, key="TFU".index))]]
    assert at_least(2, (a, b, c)) == expected == max(min(a, b), min(b, c), min(a, c))


def test_a_truth_value_has_a_word_for_people() -> None:
    """What is printed is the word, never the number."""
    assert [Truth(value).word for value in (0, 1, 2)] == ["false", "unknown", "true"]
