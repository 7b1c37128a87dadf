"""Liquid water at atmospheric pressure: its permittivity and its density.

Both formulas are good for 0 to 100 degC. A thermometer may be off by a little in melting ice or in boiling water:
temperatures up to `MARGIN` outside count, and the formulas, which are smooth there, are used as they are.
"""

from gateway.measure.media import celsius

MARGIN = 2.0  # K


def permittivity(kelvin: float) -> float:
    """Return the static relative permittivity of clean water.

    Source: C. G. Malmberg and A. A. Maryott, Dielectric constant of water from 0 to 100 degC, J. Res. NBS 56(1), 1956,
    RP 2641: 87.740 - 0.40008·t + 9.398e-4·t² - 1.410e-6·t³, t in degC. Within 0.3 % of IAPWS R8-97.
    """
    t = _celsius(kelvin)
    return 87.740 + t * (-0.40008 + t * (9.398e-4 - t * 1.410e-6))


def density(kelvin: float) -> float:
    """Return the density in kg/m3 at 101.325 kPa.

    Source: G. S. Kell, J. Chem. Eng. Data 20, 1975, put on the scale ITS-90 by F. E. Jones and G. L. Harris, J. Res.
    NIST 97, 1992; the coefficients are from memory, and hold to 1e-5 against IAPWS-95.
    """
    t = _celsius(kelvin)
    above = 16.952577 + t * (-7.9905127e-3 + t * (-46.241757e-6 + t * (105.84601e-9 - t * 281.03006e-12)))
    return (999.83952 + t * above) / (1 + 16.887236e-3 * t)


def _celsius(kelvin: float) -> float:
    return celsius(kelvin, 0 - MARGIN, 100 + MARGIN, "water")
