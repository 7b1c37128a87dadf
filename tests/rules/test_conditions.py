"""The language of conditions: what reads as what, and what is refused with which words at which character."""

import pytest
from hypothesis import given
from hypothesis import strategies as st
from sentences import sentence

from rules.conditions.errors import ConditionError
from rules.conditions.parse import DEEPEST, LONGEST, parse
from rules.conditions.tree import (
    And,
    AtLeast,
    Between,
    Commanded,
    Comparison,
    Condition,
    Held,
    Is,
    Literal,
    Name,
    Not,
    Or,
    Product,
    Relation,
    Status,
    Sum,
    Term,
)

NAMES = st.sampled_from(["level", "brim", "volume", "high-float", "cistern.level", "iso_tank.x2", "orchard", "fork"])
LITERALS = st.sampled_from(["1.40 m", "20 cm", "-3 °C", "85 %", "1e3 l", "+5 mm", "12.5 l/min", "3"]).map(Literal)
TERMS: st.SearchStrategy[Term] = st.recursive(
    st.one_of(NAMES.map(Name), LITERALS),
    lambda term: st.one_of(
        st.builds(Sum, term, term, st.booleans()),
        st.builds(Product, st.sampled_from([2.0, 0.5, -1.5, 1e-9]), term),
    ),
    max_leaves=4,
)
WORDS = st.sampled_from(["wet", "dry", "on", "half-open"])
BASICS: st.SearchStrategy[Condition] = st.one_of(
    st.builds(Comparison, TERMS, st.sampled_from(Relation), TERMS),
    st.builds(Between, TERMS, TERMS, TERMS),
    st.builds(Is, NAMES, WORDS),
    st.builds(Commanded, NAMES, WORDS),
    st.builds(Status, NAMES, st.sampled_from(["usable", "unknown", "silent", "failed"])),
)


def _combined(part: st.SearchStrategy[Condition]) -> st.SearchStrategy[Condition]:
    parts = st.lists(part, min_size=2, max_size=3).map(tuple)
    return st.one_of(
        st.builds(Not, part),
        st.builds(And, parts),
        st.builds(Or, parts),
        st.builds(lambda some: AtLeast(len(some) - 1, some), parts),
        st.builds(Held, part, st.sampled_from(["10 s", "2 min", "0.5 h"]).map(Literal)),
    )


CONDITIONS = st.recursive(BASICS, _combined, max_leaves=8)


@given(CONDITIONS)
def test_the_canonical_text_reads_back_to_the_same_tree(tree: Condition) -> None:
    """So what `check -v` prints is what is meant."""
    assert parse(str(tree)) == tree


# Written plainly, and with all parentheses: which words bind tighter is a promise to those who write rules.
BINDING = [
    ("a is yes or b is yes and c is no", "(a is yes) or ((b is yes) and (c is no))"),
    ("not a is yes and b is yes", "(not (a is yes)) and (b is yes)"),
    ("a is yes and b is yes for 3 s", "(a is yes) and ((b is yes) for 3 s)"),
    ("(a is yes and b is yes) for 3 s", "((a is yes) and (b is yes)) for 3 s"),
    ("not (a is yes for 3 s)", "not ((a is yes) for 3 s)"),
    ("(not a is yes) for 3 s", "(not (a is yes)) for 3 s"),
    ("x - 1 m - 2 m above 2 * x", "((x - 1 m) - 2 m) above (2.0 * x)"),
    ("x + 2 * 3 m >= 4 m", "(x + (2.0 * 3 m)) at least 4 m"),
    ("x between 1 m and 2 m and a is yes", "(x between 1 m and 2 m) and (a is yes)"),
    ("2oo3(a is yes, b is yes, c is yes)", "at least 2 of (a is yes, b is yes, c is yes)"),
    ("x above 1 m\nor x below\n0.5 m", "(x above 1 m) or (x below 0.5 m)"),
    ("x > 1 m or x < 1 m or x <= 1 m", "(x above 1 m) or (x below 1 m) or (x at most 1 m)"),
]


@pytest.mark.parametrize(("text", "meaning"), BINDING)
def test_words_bind_as_documented(text: str, meaning: str) -> None:
    """Shown with all parentheses."""
    assert str(parse(text)) == meaning


# Each with the character at which the fault is, and some words of the complaint.
REFUSED = [
    ("", 1, "the end cannot stand here; expected"),
    ("x", 2, "the end cannot stand here; expected '*'"),
    ("x above", 8, "the end cannot stand here"),
    ("x over 1 m", 3, "'over' cannot stand here"),
    ("x above 1 m and", 16, "the end cannot stand here"),
    ("x above 1 m or or a is yes", 16, "'or' cannot stand here"),
    ("(a is yes", 10, "expected ')'"),
    ("a is yes)", 9, "')' cannot stand here"),
    ("a is", 5, "the end cannot stand here; expected a name or usable, unknown, silent or failed"),
    ("x above 1 m; y above 2 m", 12, "';' cannot stand here"),
    ("a is yes for", 13, "expected a value"),
    ("not a is yes for 3 s", 1, "`not … for …` can be read two ways"),
    ("at least 4 of (a is yes, b is yes)", 1, "at least 4 of 2 conditions can never be decided"),
    ("at least 0 of (a is yes)", 1, "can never be decided"),
    ("2oo3(a is yes, b is yes)", 1, "2oo3 with 2 conditions"),
    ("x * y above 1 m", 1, "one side of `*` must be a plain number"),
    ("starts of p in 1 h above 6", 1, "`starts of … in …` is not yet supported"),
    ("a is yes or p is faulty", 15, "`is faulty` is not yet supported"),
    ("day is monday", 1, "`day is …` is not yet supported"),
    ("x above 1 s", 9, "`1 s` is a time, but `x` is a length"),
    ("x above 1", 9, "`1` needs a unit"),
    ("a above 1 m", 1, "`a` is a contact; ask `a is …`"),
    ("a is maybe", 1, "`a` can be yes, no, never `maybe`"),
    ("x is yes", 1, "`x` is a quantity; compare it"),
    ("a commanded yes", 1, "`a` is no actuator"),
    ("z above 1 m", 1, "`z` is not known here"),
    ("x-1 above 1 m", 1, "a minus sign needs blanks around it"),
    ("a is yes for 3 m", 14, "`for` takes a time such as `10 s`"),
    ("a is yes for -3 s", 14, "a time cannot be negative"),
    ("x between 2 m and 1 m", 11, "`2 m` is more than `1 m`"),
    ("x above 5 %", 9, "`5 %`"),
]


@pytest.mark.parametrize(("text", "column", "said"), REFUSED)
def test_what_cannot_be_read_is_refused_where_it_stands(text: str, column: int, said: str) -> None:
    """With what was found and what was expected."""
    with pytest.raises(ConditionError) as caught:
        sentence(text)
    assert caught.value.column == column
    assert said in caught.value.message


@pytest.mark.parametrize(
    "text",
    [
        "(" * (DEEPEST + 1) + "a is yes" + ")" * (DEEPEST + 1),
        "a is yes or " * LONGEST + "a is yes",
        "not " * 600 + "a is yes",
    ],
)
def test_endless_sentences_are_refused_and_not_followed(text: str) -> None:
    """Nothing recurses as deep as a text can be long."""
    with pytest.raises(ConditionError, match=r"levels deep|characters|cannot stand here"):
        sentence(text)


@given(st.text(alphabet="abxy is above below and or not for 1234567890.m s()*,+-<>=%oo", max_size=60))
def test_no_text_at_all_leads_to_anything_but_a_condition_or_a_complaint(text: str) -> None:
    """Whatever somebody's cat has typed."""
    problem = complaint_about(text)
    assert problem is None or (problem.message and 1 <= problem.column <= len(text) + 1)


def complaint_about(text: str) -> ConditionError | None:
    """Return the complaint, or None for a condition."""
    try:
        sentence(text)
    except ConditionError as problem:
        return problem
    return None
