"""Every shape: the volume grows with the level, the area is its slope, the level comes back; nothing ever raises."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.shapes import Shape
from gateway.measure.shapes.heads import Cone, Ellipsoid, Head, Torisphere, head_of
from gateway.measure.shapes.horizontal import horizontal_cylinder
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.measure.shapes.round import Frustum, Sphere
from gateway.measure.shapes.strapping import Strapping

SHAPES: dict[str, Shape] = {
    "vertical": vertical_cylinder(1.6, 2.2),
    "vertical on a cone": vertical_cylinder(1.6, 2.2, Cone(0.8, 0.4)),
    "vertical on an ellipsoid": vertical_cylinder(1.6, 2.2, Ellipsoid(0.8, 0.3)),
    "vertical on a dish": vertical_cylinder(1.6, 2.2, Torisphere(0.8, 1.28, 0.16)),
    "horizontal": horizontal_cylinder(1.5, 4.0),
    "horizontal with cones": horizontal_cylinder(1.5, 4.0, Cone(0.75, 0.4)),
    "horizontal with ellipsoids": horizontal_cylinder(1.5, 4.0, Ellipsoid(0.75, 0.375)),
    "horizontal with dishes": horizontal_cylinder(1.5, 4.0, Torisphere(0.75, 1.5, 0.09)),
    "box": rectangular(2.0, 1.2, 1.5),
    "sphere": Sphere(3.0),
    "bucket": Frustum(0.8, 1.2, 1.0),
    "narrowing": Frustum(1.2, 0.8, 1.0),
    "strapping": Strapping((0.0, 0.5, 0.8, 2.0), (0.0, 0.31, 0.6, 1.1)),
}
NAMES = st.sampled_from(sorted(SHAPES))


@given(NAMES, st.floats(0, 1), st.floats(0, 1))
def test_the_higher_the_fuller(name: str, one: float, other: float) -> None:
    """Monotone, from nothing to the whole."""
    shape = SHAPES[name]
    low, high = sorted((one * shape.height, other * shape.height))
    assert shape.volume(low) <= shape.volume(high) + 1e-12
    assert shape.volume(0.0) == pytest.approx(0.0, abs=1e-12)


@given(NAMES, st.floats(0.001, 0.999))
def test_the_level_comes_back_from_its_volume(name: str, share: float) -> None:
    """To a hundred-millionth of the height; at the very top of a round tank the volume says too little of the level."""
    shape = SHAPES[name]
    level = share * shape.height
    assert shape.level(shape.volume(level)) == pytest.approx(level, abs=1e-8 * shape.height)


@given(NAMES, st.floats(0, 1))
def test_the_volume_comes_back_from_its_level(name: str, share: float) -> None:
    """From the bottom to the very top."""
    shape = SHAPES[name]
    volume = share * shape.volume(shape.height)
    assert shape.volume(shape.level(volume)) == pytest.approx(volume, abs=1e-9 * shape.volume(shape.height))


@given(NAMES, st.floats(0.02, 0.98))
def test_the_area_is_the_slope_of_the_volume(name: str, share: float) -> None:
    """By a central difference; at the corners of a table or a head, within what the two sides differ by."""
    shape, step = SHAPES[name], 1e-5
    level = share * shape.height
    slope = (shape.volume(level + step) - shape.volume(level - step)) / (2 * step)
    around = sorted((shape.area(level - step), shape.area(level), shape.area(level + step)))
    assert around[0] * (1 - 1e-4) <= slope <= around[-1] * (1 + 1e-4)


@given(NAMES, st.floats() | st.sampled_from([5e-324, -0.0, 1e308, math.inf, -math.inf, math.nan]))
def test_no_number_at_all_raises(name: str, level: float) -> None:
    """Levels outside count as the bottom or the top; what is no number gives none, or an end."""
    shape = SHAPES[name]
    for value in (shape.volume(level), shape.area(level)):
        assert math.isnan(value) or -1e-12 <= value < 100
    back = shape.level(level)
    assert math.isnan(back) or 0 <= back <= shape.height


def test_a_hemisphere_is_the_deepest_ellipsoid_and_a_torisphere_of_equal_radii() -> None:
    """Three ways to say the same."""
    same: tuple[Head, Head] = (Ellipsoid(1.0, 1.0), Torisphere(1.0, 1.0, 1.0))
    for level in (0.1, 0.5, 0.9, 1.0):
        assert same[1].volume(level) == pytest.approx(same[0].volume(level), rel=1e-12)
        assert same[1].area(level) == pytest.approx(same[0].area(level), rel=1e-12)


@pytest.mark.parametrize(
    ("levels", "volumes", "said"),
    [
        ((0.0,), (0.0,), "two pairs or more"),
        ((0.1, 1.0), (0.0, 1.0), "begins with the lowest inside point"),
        ((0.0, 1.0), (0.2, 1.0), "begins with the lowest inside point"),
        ((0.0, 1.0, 0.9), (0.0, 1.0, 1.1), "the pair at 0.9 m"),
        ((0.0, 1.0, 2.0), (0.0, 1.0, 1.0), "the pair at 2 m"),
    ],
)
def test_a_table_that_does_not_rise_is_refused(
    levels: tuple[float, ...], volumes: tuple[float, ...], said: str
) -> None:
    """Naming the pair."""
    with pytest.raises(ValueError, match=said):
        Strapping(levels, volumes)


def test_heads_that_cannot_be_are_refused() -> None:
    """With a sentence each."""
    with pytest.raises(ValueError, match=r"bottom alone is 0\.8 m deep"):
        vertical_cylinder(1.0, 0.7, Cone(0.5, 0.8))
    with pytest.raises(ValueError, match="needs its `depth`"):
        head_of("conical", 1.0, None, None, None)
    with pytest.raises(ValueError, match="knuckle radius"):
        head_of("torispherical", 1.0, None, 0.3, 0.06)
    assert head_of("flat", 1.0, None, None, None) is None
