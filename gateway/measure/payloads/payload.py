"""From the bytes of a message to one number or one word, or to the reason why not. Total: any bytes end in either.

A plain number is text; inside JSON it is found by a pointer (RFC 6901). Nothing is guessed: a string where a number
belongs, NaN, an infinity, a number too large, a name that stands twice, are refused. What a reason quotes of a payload
is short and printable, since it ends on terminals and in the journal.
"""

import json
import math
import re
from typing import Any, NoReturn

LONGEST = 65_536  # bytes; a reading is never that long, and reading more would only take time
LONGEST_NUMBER = 32  # characters: more digits than any sensor has
SHOWN_OF_PAYLOAD = 200  # characters of a payload that an explanation shows
LONGEST_SHOWN = 40  # characters of a payload that a reason quotes

_NUMBER = re.compile(rb"[-+]?[0-9]+(?:\.[0-9]+)?(?:[eE][-+]?[0-9]+)?")
_INDEX = re.compile(r"0|[1-9][0-9]{0,8}")  # RFC 6901 section 4: ASCII digits, no leading zeros
_BLANK = b" \t\r\n"


class PayloadError(ValueError):
    """A payload that holds no reading; the text says why, for people."""


class Pointer:
    """A JSON Pointer, taken apart once. Source: RFC 6901.

    Raises ValueError, with a sentence, for text that is no pointer.
    """

    __slots__ = ("_parts", "text")

    def __init__(self, text: str) -> None:
        if text and not text.startswith("/"):
            raise ValueError(f"a pointer begins with '/', unlike '{text}'")
        if re.search(r"~(?![01])", text):
            raise ValueError(f"in a pointer, '~' is followed by 0 or 1, unlike in '{text}'")
        self.text = text
        self._parts = tuple(part.replace("~1", "/").replace("~0", "~") for part in text.split("/")[1:])

    def __eq__(self, other: object) -> bool:
        """Return whether the other one is the same pointer; settings that say the same are equal."""
        return isinstance(other, Pointer) and other.text == self.text

    def __hash__(self) -> int:
        return hash(self.text)

    def find(self, document: Any) -> Any:
        """Return what the pointer points to in `document`; raise PayloadError when it finds nothing."""
        for part in self._parts:
            if isinstance(document, dict) and part in document:
                document = document[part]
            elif isinstance(document, list) and _INDEX.fullmatch(part) and int(part) < len(document):
                document = document[int(part)]
            else:
                raise PayloadError(f"there is no '{self.text}' in it")
        return document


def read_number(payload: bytes, pointer: Pointer | None) -> float:
    """Return the number that `payload` holds; raise PayloadError with the reason when it holds none."""
    if pointer is None:
        return _plain_number(payload)
    return number_of(pointer.find(document_of(payload)), pointer.text)


def number_of(value: Any, where: str) -> float:
    """Return a number that stood in JSON; raise PayloadError when it is none, or too large."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise PayloadError(f"'{where}' holds {_kind(value)} where a number belongs")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    return _finite(number)


def read_word(payload: bytes, pointer: Pointer | None) -> str:
    """Return the word that `payload` holds; `1`, `"1"` and text `1` are the same word."""
    if pointer is not None:
        return word_of(pointer.find(document_of(payload)), pointer.text)
    text = _text(payload).strip()
    if not text:
        raise PayloadError("it is empty")
    if text.startswith('"'):
        return word_of(document_of(payload), "")
    return text


def shown(text: str, most: int = LONGEST_SHOWN) -> str:
    """Return the beginning of `text` as one printable line, fit for any terminal and any file."""
    return "".join(one if one.isprintable() else "\N{REPLACEMENT CHARACTER}" for one in text[:most])


def shown_payload(payload: bytes) -> str:
    """Return the beginning of a payload as one printable line of text, whatever its bytes."""
    return shown(payload[: 4 * SHOWN_OF_PAYLOAD].decode("utf-8", "replace"), SHOWN_OF_PAYLOAD)


def _plain_number(payload: bytes) -> float:
    text = payload.strip(_BLANK) if len(payload) <= LONGEST else _too_long(payload)
    if len(text) <= LONGEST_NUMBER and _NUMBER.fullmatch(text):
        return _finite(float(text))
    if not text:
        raise PayloadError("it is empty")
    raise PayloadError(f"it is no plain number: '{shown(text[: 4 * LONGEST_SHOWN].decode('utf-8', 'replace'))}'")


def _finite(number: float) -> float:
    if not math.isfinite(number):
        raise PayloadError("the number is too large")
    return number


def _too_long(payload: bytes) -> NoReturn:
    raise PayloadError(f"it has {len(payload)} bytes; {LONGEST} are the most that are read")


def _text(payload: bytes) -> str:
    if len(payload) > LONGEST:
        _too_long(payload)
    try:
        return payload.decode()
    except UnicodeDecodeError:
        raise PayloadError("it is not UTF-8 text") from None


def _refuse_constant(name: str) -> NoReturn:
    raise PayloadError(f"{name} is no number")


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    """Return an object; refuse one with a name twice, as readers differ in which they take (RFC 7493, 2.3)."""
    found = dict(pairs)
    if len(found) < len(pairs):
        names = [name for name, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        raise PayloadError(f"'{shown(twice)}' stands in it twice")
    return found


_decode = json.JSONDecoder(object_pairs_hook=_object, parse_constant=_refuse_constant).decode


def document_of(payload: bytes) -> Any:
    """Return the JSON document that `payload` is; raise PayloadError when it is none."""
    text = _text(payload)
    try:
        return _decode(text)
    except PayloadError:
        raise
    except (ValueError, RecursionError):
        raise PayloadError("it is empty" if not text.strip() else "it is not JSON") from None


def _kind(value: Any) -> str:
    kinds = {bool: "true or false", str: "a string", list: "a list", dict: "an object", type(None): "null"}
    return kinds.get(type(value), "a number")


def word_of(value: Any, where: str) -> str:
    """Return a word that stood in JSON; raise PayloadError where there is none."""
    match value:
        case bool():
            return "true" if value else "false"
        case str():
            return value
        case int():
            if abs(value) >= 10**LONGEST_NUMBER:
                raise PayloadError("the number is too large")
            return str(value)
        case float():
            return str(int(_finite(value))) if value.is_integer() and abs(value) < 1e15 else repr(_finite(value))
        case _:
            raise PayloadError(f"'{where}' holds {_kind(value)} where a word belongs")
