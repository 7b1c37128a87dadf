"""Shapes against the fluids library and solid geometry."""

import pytest
from fluids.geometry import TANK, V_from_h
from hypothesis import given
from hypothesis import strategies as st

from gateway.measure.shapes.prism import rectangular, vertical_cylinder

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
