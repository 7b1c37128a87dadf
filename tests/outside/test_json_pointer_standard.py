"""JSON Pointer against RFC 6901 and against the jsonpointer library."""

from typing import Any

import jsonpointer
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.payloads.payload import PayloadError, Pointer

# RFC 6901 section 5: the document and the evaluation of every pointer of the list.
DOCUMENT = {
    "foo": ["bar", "baz"],
    "": 0,
    "a/b": 1,
    "c%d": 2,
    "e^f": 3,
    "g|h": 4,
    "i\\j": 5,
    'k"l': 6,
    " ": 7,
    "m~n": 8,
}
SECTION_5 = {
    "": DOCUMENT,
    "/foo": ["bar", "baz"],
    "/foo/0": "bar",
    "/": 0,
    "/a~1b": 1,
    "/c%d": 2,
    "/e^f": 3,
    "/g|h": 4,
    "/i\\j": 5,
    '/k"l': 6,
    "/ ": 7,
    "/m~0n": 8,
}


@pytest.mark.parametrize("text", SECTION_5)
def test_the_examples_of_section_5(text: str) -> None:
    """Every example of RFC 6901 section 5 evaluates as printed there."""
    assert Pointer(text).find(DOCUMENT) == SECTION_5[text]


@pytest.mark.parametrize("index", ["01", "-", "2", "-1", "1e0", "1\u0661", "", "0x0"])
def test_an_index_is_plain_digits_within_the_list(index: str) -> None:
    """RFC 6901 section 4: no leading zeros; `-` is the place after the last element, where nothing is."""
    with pytest.raises(PayloadError, match="there is no"):
        Pointer(f"/foo/{index}").find(DOCUMENT)


def test_the_order_of_unescaping() -> None:
    """RFC 6901 section 4: `~1` first, then `~0`, so `~01` is the name `~1`."""
    assert Pointer("/~01").find({"~1": 5, "/": 6}) == 5


_KEYS = st.sampled_from(["a", "b/c", "~", "0", "1", "", "é", "~1"])
_DOCUMENTS = st.recursive(
    st.integers() | st.text(max_size=3),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(_KEYS, inner, max_size=3),
    max_leaves=10,
)


@given(_DOCUMENTS, st.lists(_KEYS, max_size=4))
def test_the_same_is_found_as_by_the_library(document: Any, path: list[str]) -> None:
    """Source: jsonpointer 3 on PyPI, a general library for RFC 6901. Pointers into text are no pointers of ours."""
    pointer = jsonpointer.JsonPointer.from_parts(path)
    try:
        expected = pointer.resolve(document)
    except jsonpointer.JsonPointerException:
        with pytest.raises(PayloadError):
            Pointer(pointer.path).find(document)
        return
    assert Pointer(pointer.path).find(document) == expected
