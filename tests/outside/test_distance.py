"""A head above the water: distances that follow from the speed of sound, and the levels that follow from them."""

import math

import pytest

from gateway.measure.sensing.distance import Distance

FACE = 2.5  # m above the floor

# Echo in s, air in degC, level in m: c = 343.2·sqrt(T / 293.15) m/s, ISO 9613-1:1993 formula A.5, gap = c·t/2. The
# levels were worked out beforehand with `pyfar.constants.speed_of_sound_simple` of pyfar 0.8.1.
ECHOES = [
    (5.000e-3, 20, 1.64200),
    (5.000e-3, 0, 1.67179),
    (5.000e-3, 40, 1.61321),
    (2.000e-3, 20, 2.15680),
    (14.000e-3, 20, 0.09760),
]


@pytest.mark.parametrize(("echo", "celsius", "level"), ECHOES)
def test_the_level_is_the_height_of_the_face_less_the_gap(echo: float, celsius: float, level: float) -> None:
    """To the digits printed, and back."""
    gap = 343.2 * math.sqrt((celsius + 273.15) / 293.15) * echo / 2
    sensor = Distance(FACE)
    assert sensor.convert(gap).level == pytest.approx(level, abs=6e-6)
    assert sensor.raw(level) == pytest.approx(gap, abs=6e-6)
