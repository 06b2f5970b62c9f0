"""Energy efficiencies by the Gibbs convention. Formulas only; every argument may be an array or `Linearised`.

The energy stored is the Gibbs energy of the cell reaction with oxygen evolution at the anode: per charge, the
equilibrium potential of O2/H2O less that of the product. (By the enthalpy convention it would be the heat of combustion
of the product; the two differ, and a figure must name the one it used.)
"""

from __future__ import annotations

from coulombook.uncertainty.linearised import Number


def cathodic_energy_efficiency(
    faradaic_efficiency: Number, equilibrium_volt: Number, potential_volt: Number, oxygen_volt: Number | float
) -> Number:
    """Share of the energy stored in one product, if the anode worked without overpotential. [1]

    FE (E_O2 - E_eq) / (E_O2 - E), all potentials on one scale.

    Parameters
    ----------
    faradaic_efficiency : (n,) numbers
        Of the product. [1]
    equilibrium_volt : (n,) numbers
        Equilibrium potential of making the product. [V]
    potential_volt : (n,) numbers
        Potential of the cathode, free of ohmic drop. [V]
    oxygen_volt : number
        Equilibrium potential of O2/H2O. [V]
    """
    efficiency: Number = (
        faradaic_efficiency * (oxygen_volt - equilibrium_volt) / (oxygen_volt - potential_volt)
    )
    return efficiency


def full_cell_energy_efficiency(
    faradaic_efficiency: Number,
    equilibrium_volt: Number,
    cell_voltage_volt: Number,
    oxygen_volt: Number | float,
) -> Number:
    """Share of the electrical energy that is stored in one product, FE (E_O2 - E_eq) / U. [1]

    Parameters
    ----------
    faradaic_efficiency : (n,) numbers
        Of the product. [1]
    equilibrium_volt : (n,) numbers
        Equilibrium potential of making the product. [V]
    cell_voltage_volt : (n,) numbers
        Voltage across the cell, above zero. [V]
    oxygen_volt : number
        Equilibrium potential of O2/H2O, on the scale of ``equilibrium_volt``. [V]
    """
    efficiency: Number = faradaic_efficiency * (oxygen_volt - equilibrium_volt) / cell_voltage_volt
    return efficiency
