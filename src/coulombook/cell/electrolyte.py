"""pH of a hydrogencarbonate electrolyte saturated with CO2, as a help in choosing the pH of a run.

Constants at 25 degC: Plummer & Busenberg, Geochim. Cosmochim. Acta 46 (1982) 1011 (CO2 solubility and
carbonic acid, from memory), ion product of water 10^-13.995; activity coefficients by Davies, Ion
Association (1962), A = 0.509.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

HENRY_MOL_PER_LITRE_BAR = 0.034
PK1 = 6.352
PK2 = 10.329
PKW = 13.995
DAVIES_A = 0.509
_STEPS = 50  # of the ionic strength; each gains two digits or more


def davies_log10_activity(charge: int, ionic_strength_mol_per_litre: float) -> float:
    """Decimal logarithm of an ion's activity coefficient at 25 degC. [1]

    -A z^2 (sqrt(I)/(1 + sqrt(I)) - 0.3 I), z the charge, I the ionic strength. Meant for ionic
    strengths up to about 0.5 mol/L.
    """
    root = math.sqrt(ionic_strength_mol_per_litre)
    return -DAVIES_A * charge**2 * (root / (1.0 + root) - 0.3 * ionic_strength_mol_per_litre)


@dataclass(frozen=True, slots=True)
class _Ions:
    """Concentrations at a pH. [mol/L]"""

    proton: float
    hydrogencarbonate: float
    carbonate: float
    hydroxide: float


def _ions(ph: float, dissolved_mol_per_litre: float, ionic_strength_mol_per_litre: float) -> _Ions:
    single, double = (
        10.0 ** davies_log10_activity(charge, ionic_strength_mol_per_litre) for charge in (1, 2)
    )
    activity = 10.0**-ph
    return _Ions(
        activity / single,
        10.0**-PK1 * dissolved_mol_per_litre / (activity * single),
        10.0 ** -(PK1 + PK2) * dissolved_mol_per_litre / (activity**2 * double),
        10.0**-PKW / (activity * single),
    )


def bicarbonate_ph(
    concentration_mol_per_litre: float, co2_pressure_bar: float = 1.01325 - 0.03169, *, activity: bool = True
) -> float:
    """pH (-lg of the proton's activity) of KHCO3 saturated with CO2 at 25 degC. [1]

    Charge balance c + [H+] = [HCO3-] + 2 [CO3^2-] + [OH-], with the ionic strength of all ions. Davies'
    equation is outside its range from 0.5 mol/L on and the salting-out of CO2 is left out: take +-0.2
    there. Near the cathode of a running cell the pH is higher than this.

    Parameters
    ----------
    concentration_mol_per_litre : float
        Concentration of KHCO3 before CO2 is bubbled. [mol/L]
    co2_pressure_bar : float
        Partial pressure of CO2; wet CO2 at 101.325 kPa by default. [bar]
    activity : bool
        False sets every activity coefficient to 1.

    Raises
    ------
    ValueError
        The concentration or the pressure is not above zero.

    Examples
    --------
    >>> round(bicarbonate_ph(0.1), 2), round(bicarbonate_ph(0.5), 2)
    (6.72, 7.39)
    """
    c = concentration_mol_per_litre
    # "not above" instead of "at or below", so that NaN is caught as well
    if not (c > 0.0 and co2_pressure_bar > 0.0):
        raise ValueError(
            f"the concentration ({c:g} mol/L) and the pressure of CO2 ({co2_pressure_bar:g} bar) must be "
            "above zero"
        )
    from scipy.optimize import brentq

    dissolved = HENRY_MOL_PER_LITRE_BAR * co2_pressure_bar

    def excess_charge(ph: float, strength: float) -> float:
        ions = _ions(ph, dissolved, strength)
        return c + ions.proton - ions.hydrogencarbonate - 2.0 * ions.carbonate - ions.hydroxide

    # at zero ionic strength every activity coefficient is 1
    strength, before = (c if activity else 0.0), math.inf
    for _ in range(_STEPS):
        ph = float(brentq(excess_charge, 0.0, 14.0, args=(strength,), xtol=1e-13))
        if not activity or abs(ph - before) < 1e-11:
            break
        ions = _ions(ph, dissolved, strength)
        strength = 0.5 * (c + ions.proton + ions.hydrogencarbonate + 4.0 * ions.carbonate + ions.hydroxide)
        before = ph
    return ph
