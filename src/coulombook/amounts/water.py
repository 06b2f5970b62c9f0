"""Water vapour in a gas that left an aqueous electrolyte."""

from __future__ import annotations

import numpy as np

from coulombook.uncertainty.linearised import Number

# Saturation-pressure equation of region 4, IAPWS-IF97 (IAPWS R7-97(2012), table 34); n[0] is not used, so
# that the numbers stand as printed. Valid from 273.15 K to 647.096 K.
SATURATION_COEFFICIENTS = (
    0.0,
    0.11670521452767e4,
    -0.72421316703206e6,
    -0.17073846940092e2,
    0.12020824702470e5,
    -0.32325550322333e7,
    0.14915108613530e2,
    -0.48232657361591e4,
    0.40511340542057e6,
    -0.23855557567849,
    0.65017534844798e3,
)


def saturated_water_vapour_pascal(temperature_kelvin: Number) -> Number:
    """Vapour pressure of pure water. [Pa]

    Saturation-pressure equation of IAPWS-IF97, valid from 273.15 K to 647.096 K; below 100 degC it differs
    from IAPWS-95 by less than 1e-4. The electrolyte's salt lowers it by about 0.3 % at 0.1 mol/L (Raoult,
    two ions per formula unit), which is left out.

    Parameters
    ----------
    temperature_kelvin : float, array or `Linearised`
        Temperature of the electrolyte or of the meter, whichever is the colder. [K]
    """
    _, a, b, c = saturation_terms(temperature_kelvin)
    megapascal = (2.0 * c / (np.sqrt(b**2 - 4.0 * a * c) - b)) ** 4
    return 1.0e6 * megapascal


def saturation_terms(temperature_kelvin: Number) -> tuple[Number, Number, Number, Number]:
    """What the saturation-pressure equation is made of: theta [K], and A, B, C of the same source."""
    n = SATURATION_COEFFICIENTS
    theta = temperature_kelvin + n[9] / (temperature_kelvin - n[10])
    return (
        theta,
        theta**2 + n[1] * theta + n[2],
        n[3] * theta**2 + n[4] * theta + n[5],
        n[6] * theta**2 + n[7] * theta + n[8],
    )
