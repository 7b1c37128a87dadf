"""The kinds of values that settings hold: each reads what a user wrote into SI units, or says what is wrong with it."""

import re
from collections.abc import Callable, Mapping
from functools import reduce
from operator import or_
from typing import Annotated, Any
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError

from pydantic import BaseModel, BeforeValidator, ConfigDict, Discriminator, Tag

from gateway.measure.payloads.payload import Pointer
from gateway.settings.units import SECOND, linear, read_as
from rules.conditions.parse import RESERVED
from rules.quantity import Dimension, Quantity

SMALLEST, LARGEST = 1e-6, 1e6  # m; levels are told apart to 1e-6 m, and areas and volumes stay finite numbers

_NAME = re.compile(r"[A-Za-z][A-Za-z0-9-]{0,63}")


def either(**tests: tuple[Any, Callable[[Any], bool]]) -> Any:
    """Return a type that is one of several kinds, told apart by what was written; the first whose test says yes.

    So a slip is complained of as a slip of that kind alone. The names are in brackets where errors name their place.
    """
    tagged = [Annotated[kind, Tag(f"[{name}]")] for name, (kind, _) in tests.items()]

    def tell(value: Any) -> str:
        return next((f"[{name}]" for name, (_, test) in tests.items() if test(value)), f"[{next(reversed(tests))}]")

    return Annotated[reduce(or_, tagged), Discriminator(tell)]


class Part(BaseModel):
    """A mapping of the settings. Unknown keys are complaints; keys of `LATER` are refused by name."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, arbitrary_types_allowed=True)


def of(*wanted: Dimension) -> BeforeValidator:
    """Return a check that a value is of one of these dimensions; it reads as a number in SI units."""
    return BeforeValidator(lambda value: read_as(value, *wanted).value)


def known(kind: str, table: Mapping[str, bool]) -> BeforeValidator:
    """Return a check that a word is in a table, and supported yet."""

    def validate(value: object) -> str:
        word = str(value)
        if word not in table:
            raise ValueError(f"`{word}` is no {kind}; expected one of {', '.join(table)}")
        if not table[word]:
            raise ValueError(f"`{word}` is not yet supported")
        return word

    return BeforeValidator(validate)


def _size(value: object) -> object:
    size = read_as(value, Dimension.LENGTH).value
    if not size > 0:
        raise ValueError("expected more than nothing")
    if not SMALLEST <= size <= LARGEST:
        raise ValueError(f"`{value}` is no size of a tank")
    return value


def _duration(value: object) -> int:
    seconds = read_as(value, Dimension.TIME).value
    if seconds < 0:
        raise ValueError("a time cannot be negative")
    return round(seconds * SECOND)


def name(value: object) -> str:
    """Return a name that can stand in conditions and topics."""
    if not isinstance(value, str) or not _NAME.fullmatch(value):
        raise ValueError(f"`{value}` is not a name; a name has letters, digits and `-`, and begins with a letter")
    if value.lower() in RESERVED:
        raise ValueError(f"`{value}` is a word of the condition language and cannot be a name")
    return value


def _dotted(value: object) -> str:
    """Return the name of something in this tank, of the site, or `tank.name`."""
    if not isinstance(value, str) or not 1 <= len(parts := value.split(".")) <= 2:
        raise ValueError(f"`{value}` is not a name; expected one such as `air` or `tank.air`")
    for part in parts:
        name(part)
    return value


def _word(value: object) -> str:
    if isinstance(value, str) and value and not re.search(r"\s", value):
        return value
    raise ValueError(f"`{value}` is not one word")


def _topic(value: object) -> str:
    if not isinstance(value, str) or not value:
        raise ValueError("expected a topic such as `farm/tank-1/probe`")
    if "+" in value or "#" in value or "\0" in value:
        raise ValueError(f"`{value}` holds a wildcard; name one topic")
    if len(value.encode()) > 65_535:  # MQTT 5, 4.7.3
        raise ValueError("a topic has at most 65,535 bytes")
    return value


def payload(value: object) -> str:
    """Return a payload as text; a number or a truth value counts as its text."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str | int | float):
        return str(value)
    raise ValueError("expected a payload: text or a number")


def _pointer(value: object) -> Pointer:
    if not isinstance(value, str):
        raise ValueError("expected a JSON Pointer such as `/hz`")
    return Pointer(value)


def _unit(value: object) -> str:
    if not isinstance(value, str):
        raise ValueError("expected a unit such as `Hz`")
    linear(value)
    return value


def _zone(value: object) -> str:
    try:
        ZoneInfo(str(value))
    except (ZoneInfoNotFoundError, ValueError, OSError):
        raise ValueError(f"`{value}` is not a time zone; expected one such as `Europe/Vienna`") from None
    return str(value)


def _text(value: object) -> str:
    if not isinstance(value, str):
        raise ValueError(f"`{value}` is not text; put it in quotation marks if it is meant as text")
    return value


def _pattern(value: object) -> str:
    if isinstance(value, dict) and "typical" in value:
        raise ValueError("`typical` is not yet supported")
    if not isinstance(value, str) or not is_pattern(value):
        raise ValueError(f"`{value}` is not a pattern of files within the site's folder, such as `tanks/*.yaml`")
    return value


def is_pattern(text: str) -> bool:
    """Return whether `text` says where to look for files, at or below the site's folder."""
    parts = text.split("/")
    return "\0" not in text and not {"", ".", ".."} & set(parts) and all(p == "**" or "**" not in p for p in parts)


def _any_quantity(value: object) -> Quantity:
    return read_as(value, *(dimension for dimension in Dimension if dimension is not Dimension.NUMBER))


Length = Annotated[float, of(Dimension.LENGTH)]
Size = Annotated[Length, BeforeValidator(_size)]
Plain = Annotated[float, of(Dimension.NUMBER)]
VolumeValue = Annotated[float, of(Dimension.VOLUME)]
Duration = Annotated[int, BeforeValidator(_duration)]
AnyQuantity = Annotated[Quantity, BeforeValidator(_any_quantity)]
Name = Annotated[str, BeforeValidator(name)]
Dotted = Annotated[str, BeforeValidator(_dotted)]
Word = Annotated[str, BeforeValidator(_word)]
Topic = Annotated[str, BeforeValidator(_topic)]
PointerText = Annotated[Pointer, BeforeValidator(_pointer)]
Unit = Annotated[str, BeforeValidator(_unit)]
Zone = Annotated[str, BeforeValidator(_zone)]
Text = Annotated[str, BeforeValidator(_text)]
Pattern = Annotated[str, BeforeValidator(_pattern)]


def _payloads(value: Any) -> dict[str, str]:
    if not isinstance(value, dict) or not value:
        raise ValueError('expected words with their payloads, such as `{on: "1", off: "0"}`')
    return {_word(word): payload(text) for word, text in value.items()}


Payloads = Annotated[dict[str, str], BeforeValidator(_payloads)]
