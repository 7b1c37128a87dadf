"""Air: the speed of sound in it."""

import math

from gateway.measure.media import celsius

COLDEST, HOTTEST = -40.0, 70.0  # degC


def speed_of_sound(kelvin: float) -> float:
    """Return the speed of sound in m/s: c = 343.2 m/s · √(T / 293.15 K).

    Source: ISO 9613-1:1993, formula A.5; the standard is written for -20 to 50 degC. The square root is the law of any
    perfect gas, so it is used from -40 to 70 degC, where it keeps within 0.1 % of real dry air. Damp air is faster, by
    up to 0.4 % at 30 degC; gases other than air are another matter altogether.
    """
    celsius(kelvin, COLDEST, HOTTEST, "the speed of sound")
    return 343.2 * math.sqrt(kelvin / 293.15)
