"""Shapes against the fluids library and solid geometry."""

from typing import Any

import pytest
from fluids.geometry import TANK, V_from_h
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.shapes import Shape
from gateway.measure.shapes.heads import Cone, Ellipsoid, Torisphere
from gateway.measure.shapes.horizontal import horizontal_cylinder
from gateway.measure.shapes.prism import rectangular, vertical_cylinder
from gateway.measure.shapes.round import Frustum, Sphere
from gateway.measure.shapes.strapping import Strapping

# V in m3 at 10, 25, 50, 75 and 100 % of the height. Source: fluids 1.3 `TANK(...).V_from_h`, re-computed by slice
# integrals; the prism from solid geometry.
CYLINDER = {0.3: 0.942478, 0.75: 2.356194, 1.5: 4.712389, 2.25: 7.068583, 3.0: 9.424778}  # D 2.0, L 3.0
BOX = {0.15: 0.36, 0.375: 0.9, 0.75: 1.8, 1.125: 2.7, 1.5: 3.6}  # 2.0 by 1.2, height 1.5


@pytest.mark.parametrize("level", CYLINDER)
def test_an_upright_cylinder(level: float) -> None:
    """The table's volume at the table's level, and back."""
    tank = vertical_cylinder(2.0, 3.0)
    assert tank.volume(level) == pytest.approx(CYLINDER[level], rel=1e-6)
    assert tank.level(CYLINDER[level]) == pytest.approx(level, rel=1e-6)


@pytest.mark.parametrize("level", BOX)
def test_a_box(level: float) -> None:
    """The table's volume at the table's level, and back."""
    tank = rectangular(2.0, 1.2, 1.5)
    assert tank.volume(level) == pytest.approx(BOX[level], rel=1e-6)
    assert tank.level(BOX[level]) == pytest.approx(level, rel=1e-6)


@given(diameter=st.floats(0.1, 50), height=st.floats(0.1, 50), share=st.floats(0, 1))
def test_any_upright_cylinder_as_the_library_has_it(diameter: float, height: float, share: float) -> None:
    """Source: fluids `V_from_h`, after D. Jones, Compute Fluid Volumes in Vertical Tanks, 2003."""
    expected = V_from_h(h=share * height, D=diameter, L=height, horizontal=False)
    assert vertical_cylinder(diameter, height).volume(share * height) == pytest.approx(expected, rel=1e-9, abs=1e-12)


def test_the_whole_tank_as_the_library_has_it() -> None:
    """Source: fluids `TANK.V_total`."""
    tank = vertical_cylinder(1.6, 2.2)
    assert tank.volume(tank.height) == pytest.approx(TANK(D=1.6, L=2.2, horizontal=False).V_total, rel=1e-9)


# ---- every shape ----------------------------------------------------------------------------------------------------

SHAPES: dict[str, tuple[Shape, dict[str, Any]]] = {
    "vertical, conical bottom": (
        vertical_cylinder(2.0, 3.8, Cone(1.0, 0.8)),
        {"D": 2.0, "L": 3.0, "horizontal": False, "sideA": "conical", "sideA_a": 0.8},
    ),
    "vertical, 2:1 ellipsoidal bottom": (
        vertical_cylinder(2.0, 3.5, Ellipsoid(1.0, 0.5)),
        {"D": 2.0, "L": 3.0, "horizontal": False, "sideA": "ellipsoidal", "sideA_a": 0.5},
    ),
    "vertical, hemispherical bottom": (
        vertical_cylinder(2.0, 4.0, Ellipsoid(1.0, 1.0)),
        {"D": 2.0, "L": 3.0, "horizontal": False, "sideA": "spherical", "sideA_a": 1.0},
    ),
    "vertical, torispherical bottom": (
        vertical_cylinder(2.0, 3.0 + Torisphere(1.0, 2.0, 0.12).depth, Torisphere(1.0, 2.0, 0.12)),
        {"D": 2.0, "L": 3.0, "horizontal": False, "sideA": "torispherical", "sideA_f": 1.0, "sideA_k": 0.06},
    ),
    "horizontal, flat ends": (horizontal_cylinder(1.5, 4.0), {"D": 1.5, "L": 4.0, "horizontal": True}),
    "horizontal, conical ends": (
        horizontal_cylinder(1.5, 4.0, Cone(0.75, 0.4)),
        {
            "D": 1.5, "L": 4.0, "horizontal": True, "sideA": "conical", "sideB": "conical",
            "sideA_a": 0.4, "sideB_a": 0.4,
        },
    ),
    "horizontal, 2:1 ellipsoidal ends": (
        horizontal_cylinder(1.5, 4.0, Ellipsoid(0.75, 0.375)),
        {
            "D": 1.5, "L": 4.0, "horizontal": True, "sideA": "ellipsoidal", "sideB": "ellipsoidal",
            "sideA_a": 0.375, "sideB_a": 0.375,
        },
    ),
    "horizontal, hemispherical ends": (
        horizontal_cylinder(1.5, 4.0, Ellipsoid(0.75, 0.75)),
        {
            "D": 1.5, "L": 4.0, "horizontal": True, "sideA": "spherical", "sideB": "spherical",
            "sideA_a": 0.75, "sideB_a": 0.75,
        },
    ),
    "horizontal, torispherical ends": (
        horizontal_cylinder(1.5, 4.0, Torisphere(0.75, 1.5, 0.09)),
        {
            "D": 1.5, "L": 4.0, "horizontal": True, "sideA": "torispherical", "sideB": "torispherical",
            "sideA_f": 1.0, "sideA_k": 0.06, "sideB_f": 1.0, "sideB_k": 0.06,
        },
    ),
}  # fmt: skip
FIFTY = [k / 50 for k in range(1, 51)]


@pytest.mark.parametrize("name", SHAPES)
def test_every_shape_at_fifty_levels_as_the_library_has_it(name: str) -> None:
    """Within 1e-6. Source: fluids `TANK(...).V_from_h`, after D. Jones, Computing Fluid Tank Volumes."""
    shape, given_as = SHAPES[name]
    reference = TANK(**given_as)
    assert shape.height == pytest.approx(reference.h_max, rel=1e-9)
    for share in FIFTY:
        level = share * shape.height
        assert shape.volume(level) == pytest.approx(reference.V_from_h(level), rel=1e-6), share


# V in m3 at 10, 25, 50, 75 and 100 % of the height, computed beforehand with fluids 1.3.1, and again by slice integrals
# with scipy's quad; the sphere and the frustum from solid geometry.
TABLE = {
    "vertical, conical bottom": (0.089784, 1.308997, 4.293510, 7.278023, 10.262536),
    "vertical, 2:1 ellipsoidal bottom": (0.590096, 2.225295, 4.974188, 7.723082, 10.471976),
    "horizontal, flat ends": (0.367877, 1.381916, 3.534292, 5.686668, 7.068583),
    "horizontal, 2:1 ellipsoidal ends": (0.392618, 1.519974, 3.976078, 6.432182, 7.952156),
    "horizontal, torispherical ends": (0.382551, 1.463884, 3.807663, 6.151442, 7.615327),
    "horizontal, hemispherical ends": (0.417358, 1.658032, 4.417865, 7.177697, 8.835729),
    "sphere": (0.395841, 2.208932, 7.068583, 11.928235, 14.137167),
    "frustum": (0.052821, 0.142026, 0.319395, 0.536034, 0.795870),
}
ROUND: dict[str, Shape] = {"sphere": Sphere(3.0), "frustum": Frustum(0.8, 1.2, 1.0)}
ALL: dict[str, Shape] = {name: shape for name, (shape, _) in SHAPES.items()} | ROUND


@pytest.mark.parametrize("name", TABLE)
def test_volumes_worked_out_beforehand(name: str) -> None:
    """To the digits printed."""
    shape = ALL[name]
    for share, volume in zip((0.1, 0.25, 0.5, 0.75, 1.0), TABLE[name], strict=True):
        assert shape.volume(share * shape.height) == pytest.approx(volume, abs=6e-7)


INCH, GALLON = 0.0254, 0.003785411784
# D. Jones's own worked examples, in inches and US gallons, as the docstrings of fluids 1.3.1 print them.
JONES: dict[str, tuple[Shape, float, float]] = {
    "horizontal, conical": (horizontal_cylinder(108 * INCH, 156 * INCH, Cone(54 * INCH, 42 * INCH)), 36, 2041.19236),
    "horizontal, ellipsoidal": (
        horizontal_cylinder(108 * INCH, 156 * INCH, Ellipsoid(54 * INCH, 42 * INCH)), 36, 2380.95654,
    ),
    "horizontal, torispherical": (
        horizontal_cylinder(108 * INCH, 156 * INCH, Torisphere(54 * INCH, 108 * INCH, 6.48 * INCH)), 36, 2028.62667,
    ),
    "vertical, conical": (vertical_cylinder(132 * INCH, 200 * INCH, Cone(66 * INCH, 33 * INCH)), 24, 250.67461),
    "vertical, ellipsoidal": (
        vertical_cylinder(132 * INCH, 200 * INCH, Ellipsoid(66 * INCH, 33 * INCH)), 24, 783.35817,
    ),
    "vertical, torispherical": (
        vertical_cylinder(132 * INCH, 200 * INCH, Torisphere(66 * INCH, 132 * INCH, 7.92 * INCH)), 24, 904.06883,
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", JONES)
def test_the_worked_examples_of_jones(name: str) -> None:
    """To the digits printed."""
    shape, inches, gallons = JONES[name]
    assert shape.volume(inches * INCH) / GALLON == pytest.approx(gallons, rel=1e-6)


# The worst relative error of a 100-step strapping table with straight lines, from 10 % of the height on, in %.
STRAPPED = {
    "vertical, conical bottom": 0.680,
    "vertical, 2:1 ellipsoidal bottom": 0.080,
    "horizontal, flat ends": 0.073,
    "horizontal, 2:1 ellipsoidal ends": 0.081,
    "horizontal, torispherical ends": 0.078,
    "sphere": 0.193,
    "frustum": 0.012,
}


@pytest.mark.parametrize("name", STRAPPED)
def test_a_strapping_table_of_a_hundred_steps_is_as_good_as_it_can_be(name: str) -> None:
    """No worse than straight lines are, worked out beforehand."""
    shape = ALL[name]
    levels = [shape.height * k / 100 for k in range(101)]
    table = Strapping(tuple(levels), tuple(shape.volume(level) for level in levels))
    off = [
        abs(table.volume(level) / shape.volume(level) - 1) * 100
        for level in (shape.height * k / 1000 for k in range(100, 1001))
    ]
    assert max(off) == pytest.approx(STRAPPED[name], abs=0.01)
