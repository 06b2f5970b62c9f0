"""Gas: flows to moles, peak areas to charge rates. Formulas only; every argument may be an array or `Linearised`.

Sources: ideal-gas law with R = 8.314462618 J/(mol K) (CODATA 2018, exact since the SI of 2019); Faraday's law.
The compressibility of CO2 at 25 degC and 101.325 kPa is 0.995 (Span & Wagner 1996), so an actual volume flow of CO2
carries an error of 0.5 % by the ideal law; standard flows of meters are defined by it and carry none.
"""

from __future__ import annotations

from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT
from coulombook.uncertainty.linearised import Number


def molar_density(pressure_pascal: Number, temperature_kelvin: Number) -> Number:
    """Amount of ideal gas per volume, p / (R T). [mol/m^3]"""
    density: Number = pressure_pascal / (GAS_CONSTANT * temperature_kelvin)
    return density


def dry_share(water_vapour_pascal: Number, pressure_pascal: Number) -> Number:
    """Share of a gas saturated with water that is not water, 1 - p_w / p. [1]"""
    return 1.0 - water_vapour_pascal / pressure_pascal


def outlet_from_tracer(tracer_mol_per_s: Number, tracer_mole_fraction: Number) -> Number:
    """Outlet molar flow from an inert tracer added at a known rate, n_tracer / x_tracer. [mol/s]"""
    return tracer_mol_per_s / tracer_mole_fraction


def outlet_from_carbon_balance(
    inlet_mol_per_s: Number,
    carbon_to_liquid_mol_per_s: Number,
    carbonate_uptake_mol_per_s: Number,
    net_gas_made: Number,
) -> Number:
    """Outlet molar flow from a balance of moles around the cell. [mol/s]

    n_out = (n_in - sum over liquid products of c_k n_k - carbonate uptake)
    / (1 - sum over gas products of (1 - c_i) x_i), c being the CO2 molecules used per molecule of product.

    ``net_gas_made`` is the sum in the denominator: a product that uses one CO2 leaves the flow as it is.
    """
    return (inlet_mol_per_s - carbon_to_liquid_mol_per_s - carbonate_uptake_mol_per_s) / (1.0 - net_gas_made)


def mixing_time_second(headspace_m3: Number, outlet_mol_per_s: Number, density_mol_per_m3: Number) -> Number:
    """Time constant of a well-mixed gas volume, V_h over the actual outlet volume flow. [s]"""
    return headspace_m3 * density_mol_per_m3 / outlet_mol_per_s


def charge_rate_ampere(electrons: Number, rate_mol_per_s: Number) -> Number:
    """Current that a rate of formation takes up, n F dn/dt (Faraday's law). [A]"""
    return electrons * FARADAY_CONSTANT * rate_mol_per_s
