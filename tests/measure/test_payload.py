"""Payloads: any bytes end in one number, one word, or a reason in words."""

import json

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.payloads.payload import LONGEST, PayloadError, Pointer, read_number, read_word, shown

HZ = Pointer("/hz")


@pytest.mark.parametrize(
    ("payload", "number"),
    [(b"12.5", 12.5), (b" -3 \r\n", -3.0), (b"+1e3", 1000.0), (b"0", 0.0), (b"2.90E+0003", 2900.0)],
)
def test_a_plain_number_is_text(payload: bytes, number: float) -> None:
    """A number as text reads as that number, blanks around it aside."""
    assert read_number(payload, None) == number


@pytest.mark.parametrize(
    ("payload", "reason"),
    [
        (b"", "empty"),
        (b" \n", "empty"),
        (b"nan", "no plain number"),
        (b"inf", "no plain number"),
        (b"-Infinity", "no plain number"),
        (b"1_000", "no plain number"),
        (b"0x10", "no plain number"),
        (b"1,5", "no plain number"),
        (b"12 13", "no plain number"),
        ("١٢".encode(), "no plain number"),
        (b"\xff\xfe1\x00", "no plain number"),
        (b"12\x00", "no plain number"),
        (b"1" * 400, "no plain number"),
        (b"1e999", "too large"),
        (b"1" * (LONGEST + 1), "65537 bytes"),
    ],
)
def test_what_is_no_plain_number_is_refused_with_the_reason(payload: bytes, reason: str) -> None:
    """Python's own float() takes several of these; a reading must not."""
    with pytest.raises(PayloadError, match=reason):
        read_number(payload, None)


@pytest.mark.parametrize(
    ("payload", "reason"),
    [
        (b"", "empty"),
        (b"{", "not JSON"),
        (b'{"hz": NaN}', "NaN is no number"),
        (b'{"hz": -Infinity}', "-Infinity is no number"),
        (b'{"hz": 9000, "hz": 2600}', "'hz' stands in it twice"),
        (b'{"other": [{"a": 1, "a": 1}], "hz": 9000}', "'a' stands in it twice"),
        (b'{"hz": 1e999}', "too large"),
        (b'{"hz": ' + b"9" * 400 + b"}", "too large"),
        (b'{"hz": ' + b"9" * 5_000 + b"}", "not JSON|too large"),
        (b'{"hz": "2900"}', "holds a string where a number belongs"),
        (b'{"hz": true}', "holds true or false where a number belongs"),
        (b'{"hz": null}', "holds null where a number belongs"),
        (b'{"hz": [1]}', "holds a list where a number belongs"),
        (b'{"hz": {}}', "holds an object where a number belongs"),
        (b'{"Hz": 1}', "there is no '/hz'"),
        (b"2900", "there is no '/hz'"),
        (b'{"hz": 1} {"hz": 2}', "not JSON"),
        (b"\xef\xbb\xbf{}", "not JSON"),
        ('{"hz": 1}'.encode("utf-16"), "not UTF-8"),
        (b'{"hz": "\xff"}', "not UTF-8"),
        (b"[" * 60_000, "not JSON"),
        (b'{"a":' * 10_000 + b"1" + b"}" * 10_000, "not JSON"),
        (b" " * LONGEST + b"1", "65537 bytes"),
    ],
)
def test_json_that_holds_no_number_is_refused_with_the_reason(payload: bytes, reason: str) -> None:
    """Python's own json takes NaN, Infinity and 1e999, and ends in a RecursionError for deep nesting."""
    with pytest.raises(PayloadError, match=reason):
        read_number(payload, HZ)


def test_the_longest_payload_is_still_read() -> None:
    """The bound is on what is longer than 64 KiB, not on 64 KiB itself."""
    assert read_number(b'{"hz": 1' + b" " * (LONGEST - 9) + b"}", HZ) == 1


@pytest.mark.parametrize("payload", [b"1", b" 1\n", b'"1"'])
def test_a_word_is_the_same_as_text_and_as_json_text(payload: bytes) -> None:
    """`1` and `"1"` are one word."""
    assert read_word(payload, None) == "1"


@pytest.mark.parametrize("payload", [b'{"hz": 1}', b'{"hz": "1"}', b'{"hz": 1.0}'])
def test_a_word_is_the_same_as_json_number_and_as_json_text(payload: bytes) -> None:
    """`1` and `"1"` are one word inside JSON too."""
    assert read_word(payload, HZ) == "1"


@pytest.mark.parametrize(
    ("payload", "pointer", "reason"),
    [
        (b"", None, "empty"),
        (b"\xff", None, "not UTF-8"),
        (b'"1', None, "not JSON"),
        (b'{"hz": null}', HZ, "holds null where a word belongs"),
        (b'{"hz": ["1"]}', HZ, "holds a list where a word belongs"),
        (b'{"hz": 1e999}', HZ, "too large"),
        (b'{"hz": ' + b"9" * 400 + b"}", HZ, "too large"),
        (b'{"hz": NaN}', HZ, "NaN is no number"),
        (b"1" * (LONGEST + 1), None, "65537 bytes"),
    ],
)
def test_what_is_no_word_is_refused_with_the_reason(payload: bytes, pointer: Pointer | None, reason: str) -> None:
    """A contact's payload is bounded and checked like any other."""
    with pytest.raises(PayloadError, match=reason):
        read_word(payload, pointer)


@given(st.binary(max_size=200), st.sampled_from([None, Pointer(""), HZ, Pointer("/a/0")]))
def test_any_bytes_end_in_a_value_or_a_printable_reason(payload: bytes, pointer: Pointer | None) -> None:
    """Nothing but a PayloadError leaves, and what it says can be printed on one line anywhere."""
    for read in (read_number, read_word):
        try:
            read(payload, pointer)
        except PayloadError as problem:
            reason = str(problem)
            assert reason.isprintable()
            assert reason.encode()


_JSON = st.recursive(
    st.none() | st.booleans() | st.floats() | st.integers() | st.text(max_size=5),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(["hz", "a", ""]), inner, max_size=3),
    max_leaves=6,
)


@given(_JSON)
def test_any_json_ends_in_a_finite_number_or_a_reason(document: object) -> None:
    """A number that gets through is the one that was sent."""
    payload = json.dumps({"hz": document}).encode()
    try:
        number = read_number(payload, HZ)
    except PayloadError:
        return
    assert number == document


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_a_number_survives_json_exactly(number: float) -> None:
    """No digit is lost on the way in."""
    assert read_number(json.dumps({"hz": number}).encode(), HZ) == number


def test_what_is_shown_of_a_payload_is_one_short_printable_line() -> None:
    """Control characters, escapes of terminals and lone surrogates do not get through."""
    text = shown("\x1b[2J\ud800\n" + "x" * 100)
    assert text.isprintable()
    assert text.encode()
    assert len(text) == 40


@pytest.mark.parametrize("text", ["hz", "#/hz", "/a~", "/a~2b", "/~"])
def test_what_is_no_pointer_is_refused(text: str) -> None:
    """A pointer begins with a slash, and `~` stands only before 0 or 1 (RFC 6901 section 3)."""
    with pytest.raises(ValueError, match="pointer"):
        Pointer(text)
