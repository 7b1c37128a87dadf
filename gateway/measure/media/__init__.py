"""What is known of water and air. Pure functions of the temperature, in K; results in SI units.

Each file names its formula, its source and the temperatures it is good for. A temperature outside them is a ValueError
with a sentence: no value is made up.
"""

import math

ZERO_CELSIUS = 273.15  # K, exact by definition


def celsius(kelvin: float, lowest: float, highest: float, medium: str) -> float:
    """Return a temperature in degC; raise ValueError when it is outside `lowest` to `highest` degC."""
    found = kelvin - ZERO_CELSIUS
    if not lowest <= found <= highest:
        said = f"{found:.4g} degC" if math.isfinite(found) else "an unknown temperature"
        raise ValueError(f"{said} is outside {lowest:g} to {highest:g} degC, for which {medium} is known")
    return found
