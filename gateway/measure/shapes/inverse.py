"""From a volume back to its level, for shapes that have no closed form that way."""

from gateway.measure.shapes import Shape

NEAR = 1e-13  # of the height


def level_at(shape: Shape, volume: float) -> float:
    """Return the level at which `volume` stands: Newton's steps, since the area is the slope, kept within bounds."""
    height = shape.height
    if not volume > 0:
        return 0.0
    if volume >= shape.volume(height):
        return height
    low, high = 0.0, height
    level = height / 2
    for _ in range(100):
        off = shape.volume(level) - volume
        if off > 0:
            high = level
        else:
            low = level
        area = shape.area(level)
        step = level - off / area if area > 0 else low
        following = step if low < step < high else (low + high) / 2
        if abs(following - level) <= NEAR * height:
            return following
        level = following
    return level
