"""From what the settings say of a tank's inside to its shape."""

from collections.abc import Hashable
from functools import lru_cache
from typing import cast

from gateway.measure.shapes import Shape, heads
from gateway.measure.shapes.horizontal import horizontal_cylinder
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.measure.shapes.round import Frustum, Sphere
from gateway.measure.shapes.strapping import Strapping
from gateway.settings import shape_models as models


def shape_of(shape: models.Shape) -> Shape:
    """Return the inside of a tank; raise ValueError, with a sentence, for what cannot be built."""
    diameter, height = shape.diameter or 0.0, shape.height or 0.0
    match shape.form:
        case "vertical cylinder":
            return vertical_cylinder(diameter, height, _head(shape.bottom, diameter))
        case "horizontal cylinder":
            return _horizontal(diameter, shape.length or 0.0, cast("Hashable", _head(shape.ends, diameter)))
        case "rectangular":
            return rectangular(shape.length or 0.0, shape.width or 0.0, height)
        case "sphere":
            return Sphere(diameter)
        case "frustum":
            bottom = shape.bottom if isinstance(shape.bottom, float) else 0.0
            return Frustum(bottom, shape.top or 0.0, height)
        case _:
            table = shape.table if isinstance(shape.table, list) else []
            return Strapping(tuple(level for level, _ in table), tuple(volume for _, volume in table))


@lru_cache(maxsize=64)
def _horizontal(diameter: float, length: float, end: Hashable) -> Shape:
    """Return a cylinder that lies; made once for tanks that are alike, since some ends take numbers."""
    return horizontal_cylinder(diameter, length, cast("heads.Head | None", end))


def _head(said: object, diameter: float) -> heads.Head | None:
    if not isinstance(said, models.Head):
        return None
    return heads.head_of(said.form, diameter, said.depth, said.dish, said.knuckle)
