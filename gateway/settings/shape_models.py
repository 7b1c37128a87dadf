"""What a user can write of a tank's inside. Lengths in m once read."""

from typing import TYPE_CHECKING, Annotated, Literal

from pydantic import BeforeValidator, model_validator

from gateway.measure.shapes import FORMS
from gateway.settings.fields import Length, Part, Plain, Size, Text, VolumeValue, either, known

HEADS = Literal["flat", "conical", "ellipsoidal", "torispherical", "hemispherical"]

MEASURES: dict[str, tuple[frozenset[str], frozenset[str]]] = {
    "vertical cylinder": (frozenset({"diameter", "height"}), frozenset({"bottom"})),
    "horizontal cylinder": (frozenset({"diameter", "length"}), frozenset({"ends"})),
    "rectangular": (frozenset({"length", "width", "height"}), frozenset()),
    "sphere": (frozenset({"diameter"}), frozenset()),
    "frustum": (frozenset({"bottom", "top", "height"}), frozenset()),
    "strapping": (frozenset({"table"}), frozenset()),
}
"""What each form must have, and what it may have."""

_ORDER = ("diameter", "bottom", "top", "length", "width", "height", "table")


class Head(Part):
    """The bottom of an upright cylinder, or the ends of one that lies. `dish`, `knuckle` are parts of the diameter."""

    form: HEADS
    depth: Size | None = None
    dish: Plain | None = None
    knuckle: Plain | None = None

    @model_validator(mode="after")
    def _measures(self) -> "Head":
        needs_depth = self.form in {"conical", "ellipsoidal"}
        if needs_depth != (self.depth is not None):
            raise ValueError(f"a {self.form} head {'needs its' if needs_depth else 'has no'} `depth`")
        if self.form != "torispherical" and (self.dish is not None or self.knuckle is not None):
            raise ValueError("only a torispherical head has `dish` and `knuckle`")
        return self


def _is_mapping(written: object) -> bool:
    return isinstance(written, dict)


def _pairs(written: object) -> object:
    """Take each pair as a tuple, since strict reading tells lists and tuples apart."""
    return [tuple(p) if isinstance(p, list) else p for p in written] if isinstance(written, list) else written


Pairs = Annotated[list[tuple[Length, VolumeValue]], BeforeValidator(_pairs)]

if TYPE_CHECKING:
    Bottom = Head | float
    Table = list[tuple[float, float]] | str
else:
    Bottom = either(head=(Head, _is_mapping), diameter=(Size, lambda _: True))
    Table = either(pairs=(Pairs, lambda written: isinstance(written, list)), file=(Text, lambda _: True))


class Shape(Part):
    """The inside of a tank."""

    form: Annotated[str, known("form", dict.fromkeys(FORMS, True))]
    diameter: Size | None = None
    length: Size | None = None
    width: Size | None = None
    height: Size | None = None
    bottom: Bottom | None = None
    ends: Head | None = None
    top: Size | None = None
    table: Table | None = None

    @model_validator(mode="after")
    def _measures(self) -> "Shape":
        needed, possible = MEASURES[self.form]
        given = {key for key in self.model_fields_set if key != "form"}
        if not needed <= given <= needed | possible:
            told = ", ".join(key for key in _ORDER if key in needed)
            told += "".join(f", and may have `{key}`" for key in sorted(possible))
            raise ValueError(f"a {self.form} has {told}")
        if "bottom" in given and isinstance(self.bottom, Head) != (self.form == "vertical cylinder"):
            expected = "`{form: conical, depth: …}`" if self.form == "vertical cylinder" else "a diameter"
            raise ValueError(f"the `bottom` of a {self.form} is {expected}")
        return self
