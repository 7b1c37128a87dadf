"""From what the settings say of a tank's inside to its shape."""

from gateway.measure.shapes import Shape
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.settings import shape_models as models


def shape_of(shape: models.Shape) -> Shape:
    """Return the inside of a tank; raise ValueError, with a sentence, for what cannot be built."""
    if shape.form == "rectangular":
        return rectangular(shape.length or 0.0, shape.width or 0.0, shape.height)
    return vertical_cylinder(shape.diameter or 0.0, shape.height)
