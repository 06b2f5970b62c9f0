"""Where the carbon went. Formulas only; every argument may be an array or `Linearised`."""

from __future__ import annotations

from coulombook.constants import FARADAY_CONSTANT
from coulombook.uncertainty.linearised import Number

# 2 OH- + CO2 -> CO3^2- + H2O
HYDROXIDE_PER_CARBONATE = 2.0


def carbon_efficiency(product_mol: Number, carbon: Number, dioxide_mol: Number) -> Number:
    """Share of an amount of CO2 that ended in one product, c n / n(CO2). [1]

    Parameters
    ----------
    product_mol : (n,) numbers
        Amount of the product. [mol]
    carbon : (n,) numbers
        CO2 molecules in one of its molecules. [1]
    dioxide_mol : (n,) numbers
        CO2 fed, or CO2 converted, meanwhile. [mol]
    """
    share: Number = product_mol * carbon / dioxide_mol
    return share


def carbonate_bound(current_ampere: Number, dioxide_mol_per_s: Number) -> Number:
    """Share of the CO2 fed that could at most be lost to carbonate, I / (2 F n(CO2)). [1]

    Every electron that reduces CO2 or water leaves one OH- at the cathode, and two of them bind one CO2; a product that
    is an anion, or bicarbonate in place of carbonate further from the electrode, changes what is lost in the end
    (common practice, no source). Above 1 the alkali made could bind more than is fed.

    Parameters
    ----------
    current_ampere : (n,) numbers
        Positive for reduction. [A]
    dioxide_mol_per_s : (n,) numbers
        CO2 fed. [mol/s]
    """
    bound: Number = current_ampere / (HYDROXIDE_PER_CARBONATE * FARADAY_CONSTANT * dioxide_mol_per_s)
    return bound
