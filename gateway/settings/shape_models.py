"""What a user can write of a tank's inside. Lengths in m once read."""

from typing import Annotated, ClassVar

from pydantic import model_validator

from gateway.measure.shapes import FORMS
from gateway.settings.fields import Part, Size, known


class Shape(Part):
    """The inside of a tank. Lengths in m."""

    LATER: ClassVar[frozenset[str]] = frozenset({"bottom", "ends", "table", "top"})

    form: Annotated[str, known("form", FORMS)]
    diameter: Size | None = None
    length: Size | None = None
    width: Size | None = None
    height: Size

    @model_validator(mode="after")
    def _measures(self) -> "Shape":
        needed = {"vertical cylinder": {"diameter"}, "rectangular": {"length", "width"}}[self.form]
        given = {key for key in ("diameter", "length", "width") if getattr(self, key) is not None}
        if needed != given:
            raise ValueError(f"a {self.form} has {', '.join(sorted(needed))} and height")
        return self
