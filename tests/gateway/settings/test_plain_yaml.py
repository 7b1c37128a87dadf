"""Only plain YAML is read: words stay words, and what could surprise or overflow is a complaint at its place."""

from typing import Any

import pytest
import yaml
from hypothesis import given
from hypothesis import strategies as st
from marked import marks

from gateway.settings.yaml_reader import DEEPEST, LONGEST_FILE, MOST_VALUES, Node, read_yaml


def read(text: str) -> tuple[Any, list[str]]:
    """Return what `text` holds, and the complaints about it."""
    complaints: list[Any] = []
    node = read_yaml("f", text, complaints)
    return None if node is None else node.plain(), [str(one) for one in complaints]


# YAML 1.1, as PyYAML's own safe loader reads it, makes something else of each of these.
WORDS = ["on", "off", "yes", "no", "On", "NO", "True", "22:30", "010", "0x1F", "1_000", "1e3", ".inf", ".nan"]
WORDS += ["2024-01-02", "12:30:45", "+", "1.", ".5", "0o7", "99999999999999999999"]


@pytest.mark.parametrize("word", WORDS)
def test_a_word_stays_a_word(word: str) -> None:
    """Only `true` and `false` are truth values, only plain decimal numbers are numbers; as a value and as a key."""
    assert read(f"a: {word}") == ({"a": word}, [])
    assert read(f"a: '{word}'") == ({"a": word}, [])
    assert read(f"'{word}': 1") == ({word: 1}, [])


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("true", True),
        ("false", False),
        ("null", None),
        ("~", None),
        ("", None),
        ("0", 0),
        ("-12", -12),
        ("+3", 3),
        ("1.10", 1.1),
        ("-0.5", -0.5),
        ("1.0e3", 1000.0),
        ("'true'", "true"),
        ('"12"', "12"),
        ("[1, a, [true]]", [1, "a", [True]]),
        ("{b: {c: 1}}", {"b": {"c": 1}}),
        ("|\n  x\n  y\n", "x\ny\n"),
        (">\n  x\n  y\n", "x y\n"),
    ],
)
def test_what_is_plain_is_read(text: str, value: Any) -> None:
    """The types of a value are those of JSON; quotation marks make text."""
    found, complaints = read(f"a: {text}")
    assert complaints == []
    assert found == {"a": value}
    assert type(found["a"]) is type(value)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("a: 1\n^a: 2", "`a` stands here a second time; the first is at 1:1"),
        ("b: {a: 1, ^a: 2}", "`a` stands here a second time; the first is at 1:5"),
        ("1: a\n^'1': b", "`1` stands here a second time; the first is at 1:1"),
        ("true: a\n^'true': b", "`true` stands here a second time"),
        ("? ^[a]\n: 1", "a key is a word"),
        ("^~: 1", "a key is a word"),
        ("^<<: {a: 1}", "merge keys are not used in settings; actuators have `like`"),
        ("a: &x {b: 1}\nc: {^<<: *x}", "merge keys are not used in settings"),
        ("a: ^!!python/object/apply:os.system [true]", "are not used in settings"),
        ("a: ^!!str 1", "tags such as `tag:yaml.org,2002:str` are not used in settings"),
        ("a: ^!own 1", "tags such as `!own` are not used in settings"),
        ("a: 1\n^---\nb: 2", "a settings file has one document only; this begins a second"),
        ("a: ^*b", "the alias *b stands for nothing, or for itself"),
        ("a: &b [1, ^*b]", "the alias *b stands for nothing, or for itself"),
        ("a: &b\n  c: ^*b", "the alias *b stands for nothing, or for itself"),
        ("^- a", "a settings file holds `key: value` lines; this one does not"),
        ("^", "a settings file holds `key: value` lines; this one does not"),
        ("^# nothing", "a settings file holds `key: value` lines; this one does not"),
        ("a: b^: c", "this is not YAML: mapping values are not allowed"),
        ("a:\n^\t- b", "this is not YAML: found character that cannot start any token"),
        ("a: ^@b", "this is not YAML: found character that cannot start any token"),
        ("a: [1, 2\n^", "this is not YAML: "),
        ("a: 'b\n^", "this is not YAML: found unexpected end of stream"),
        ('a: "\\u^D800"', "this is not YAML: found invalid Unicode character"),
        ('a: "\\x^"', "this is not YAML: did not find expected hexdecimal number"),
        ("^\x07", "this is not YAML: control characters are not allowed"),
    ],
)
def test_what_is_not_plain_is_a_complaint_at_its_place(text: str, message: str) -> None:
    """The first complaint is at the place of what is wrong."""
    plain, places = marks(text)
    _, complaints = read(plain)
    assert complaints, text
    assert complaints[0].startswith(f"f:{places[0]}: "), complaints
    assert message in complaints[0]


def test_an_alias_stands_for_a_value_once_it_is_whole() -> None:
    """Aliases save typing; a value that is named anew means the newer one from there on."""
    assert read("a: &x [1, 2]\nb: *x\nc: &x 3\nd: *x") == ({"a": [1, 2], "b": [1, 2], "c": 3, "d": 3}, [])


def test_aliases_are_charged_with_all_that_they_stand_for() -> None:
    """Nine lines that stand for a thousand million values ('billion laughs') are refused before they are walked."""
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 10)}]" for n in range(1, 9)]
    _, complaints = read("\n".join(lines))
    assert len(complaints) == 1
    assert complaints[0].endswith(f"the file holds more than {MOST_VALUES} values, aliases counted in full")


def test_nesting_is_bounded_also_where_aliases_bring_it() -> None:
    """Each line nests the one before it a level deeper; walking that would overflow."""
    lines = ["a0: &a0 [1]", *(f"a{n}: &a{n} [*a{n - 1}]" for n in range(1, 500))]
    _, complaints = read("\n".join(lines))
    assert len(complaints) == 1
    assert complaints[0].startswith(f"f:{DEEPEST}:")
    assert complaints[0].endswith(f"with this alias, values are nested more than {DEEPEST} levels deep")


@pytest.mark.parametrize(("opening", "closing"), [("[", "]"), ("{a: ", "}")])
def test_nesting_is_bounded(opening: str, closing: str) -> None:
    """As deep as is allowed is read; deeper, however deep, is one complaint."""
    deepest = DEEPEST - 1  # the mapping around it is a level of its own
    assert read(f"a: {opening * deepest}1{closing * deepest}")[1] == []
    for depth in (deepest + 1, 900, 5_000):
        _, complaints = read(f"a: {opening * depth}1{closing * depth}")
        assert len(complaints) == 1
        assert f"this is nested more than {DEEPEST} levels deep" in complaints[0] or "nesting depth" in complaints[0]


def test_size_is_bounded() -> None:
    """A file is read whole or not at all."""
    _, complaints = read("a: 1\n" + "#" * LONGEST_FILE)
    assert complaints == [f"f:1:1: the file has more than {LONGEST_FILE} characters"]
    _, complaints = read("a: [" + "1," * (MOST_VALUES + 1) + "]")
    assert len(complaints) == 1
    assert f"more than {MOST_VALUES} values" in complaints[0]


@given(st.text(max_size=80))
def test_any_text_ends_in_values_or_complaints(text: str) -> None:
    """Nothing is ever raised, and what is wrong has a place."""
    complaints: list[Any] = []
    node = read_yaml("f", text, complaints)
    assert isinstance(node, Node) or complaints
    assert all(one.line >= 1 and one.column >= 1 for one in complaints)


_YAML = st.text(alphabet="ab:&*!-?[]{},'\"|># \n1.~<%@\\", max_size=60)


@given(_YAML)
def test_any_text_of_the_signs_of_yaml_ends_in_values_or_complaints(text: str) -> None:
    """The same for text that is nearly YAML."""
    _, complaints = read(text)
    value = read(text)[0]
    assert isinstance(value, dict) or complaints


_SCALARS = st.none() | st.booleans() | st.integers(-(10**17), 10**17) | st.text("abon12.-: é", max_size=8)
_VALUES = st.recursive(
    _SCALARS,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text("abc", min_size=1, max_size=3), inner),
    max_leaves=12,
)


@given(st.dictionaries(st.text("abc", min_size=1, max_size=3), _VALUES, max_size=4))
def test_what_the_library_writes_is_read_back(document: dict[str, Any]) -> None:
    """Source: PyYAML's own writer. What it writes without tags and anchors means the same here."""

    class Plain(yaml.SafeDumper):
        def ignore_aliases(self, data: Any) -> bool:  # noqa: ARG002 - the signature is the library's
            return True

    written = yaml.dump(document, Dumper=Plain, allow_unicode=True, default_flow_style=None)
    found, complaints = read(written)
    if document:
        assert complaints == []
        assert found == document
