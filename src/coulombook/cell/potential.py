"""The potential scale: reference electrodes, pH and ohmic drop.

Source of the conversion: Bard & Faulkner, Electrochemical Methods, 2nd ed. (2001), chapters 1 and 2 (Nernst
equation, ohmic drop); signs as in the docstring of `potential_rhe_volt`.
"""

from __future__ import annotations

import math
import re
import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT
from coulombook.uncertainty.linearised import Number

TABLE_TEMPERATURE_KELVIN = 298.15  # of every tabulated reference potential


@dataclass(frozen=True, slots=True)
class ReferenceElectrode:
    """One reference electrode of the shipped table."""

    name: str
    potential_volt: float  # against SHE at 25 degC
    coefficient_volt_per_kelvin: float
    source: str
    coefficient_source: str
    note: str
    aliases: tuple[str, ...] = ()


def _key(text: str) -> str:
    """What two spellings of one electrode share: "Ag/AgCl (3 M KCl)" and "ag/agcl, 3 mol/L KCl"."""
    key = re.sub(r"mol\s*(/\s*(l|dm3|dm\^3)|\s*(l|dm)\^?-[13])|\bmolar\b", "m", text.casefold())
    key = re.sub(r"\b(saturated|satd|sat'd|sat)\b\.?", "sat", key)
    return re.sub(r"[\s,;()\[\]]+", "", key)


@cache
def _table() -> tuple[tuple[ReferenceElectrode, ...], dict[str, ReferenceElectrode]]:
    text = files("coulombook").joinpath("data", "reference_electrodes.toml").read_text(encoding="utf-8")
    electrodes = tuple(
        ReferenceElectrode(
            row["name"],
            float(row["potential_volt"]),
            float(row["coefficient_volt_per_kelvin"]),
            row["source"],
            row["coefficient_source"],
            row["note"],
            tuple(row["aliases"]),
        )
        for row in tomllib.loads(text)["electrode"]
    )
    return electrodes, {_key(name): one for one in electrodes for name in (one.name, *one.aliases)}


def reference_names() -> tuple[str, ...]:
    """Names of the shipped reference electrodes, in the order of the table."""
    return tuple(one.name for one in _table()[0])


def find_reference(name: str) -> ReferenceElectrode | None:
    """The reference electrode called ``name``, or None.

    Case, blanks, commas and brackets do not matter, and "mol/L" is read as "M". A bare "Ag/AgCl" is not
    found, for it may be any of five electrodes; nor is "RHE", whose potential against SHE moves with pH, so
    that the pH term would be counted twice.

    >>> find_reference("Ag/AgCl (3 M KCl)").potential_volt
    0.21
    """
    return _table()[1].get(_key(name))


def reference_potential_volt(
    potential_25_volt: Number, coefficient_volt_per_kelvin: Number, temperature_kelvin: Number
) -> Number:
    """Potential of a reference electrode against SHE, E(25 degC) + dE/dT (T - 25 degC). [V]

    Arguments may be floats, arrays or `Linearised`.
    """
    return potential_25_volt + coefficient_volt_per_kelvin * (temperature_kelvin - TABLE_TEMPERATURE_KELVIN)


def nernst_slope_volt(temperature_kelvin: Number) -> Number:
    """Shift of the RHE scale per unit of pH, R T ln 10 / F. [V]

    >>> round(nernst_slope_volt(298.15), 7)
    0.0591593
    """
    slope: Number = temperature_kelvin * (GAS_CONSTANT * math.log(10.0) / FARADAY_CONSTANT)
    return slope


def potential_rhe_volt(
    potential_volt: Number,
    reference_volt: Number,
    pH: Number,
    temperature_kelvin: Number,
    mean_current_ampere: Number,
    resistance_ohm: Number,
    compensated: Number,
) -> Number:
    """Potential against the reversible hydrogen electrode, free of ohmic drop. [V]

    E(RHE) = E + E_ref(T) + (R T ln 10 / F) pH - (1 - f) I R_u.

    Parameters
    ----------
    potential_volt : float, array or `Linearised`
        Potential against the reference electrode used. [V]
    reference_volt : float, array or `Linearised`
        Potential of that electrode against SHE, at the temperature (`reference_potential_volt`). [V]
    pH : float, array or `Linearised`
        Of the electrolyte at the cathode. [1]
    temperature_kelvin : float, array or `Linearised`
        Of the cell and the reference electrode. [K]
    mean_current_ampere : float, array or `Linearised`
        Signed, cathodic negative: the correction makes a cathode's potential less negative. [A]
    resistance_ohm : float, array or `Linearised`
        Solution resistance between the working and the reference electrode, the whole of it. [ohm]
    compensated : float, array or `Linearised`
        Fraction f of the ohmic drop that the potentiostat already removed. [1]

    Examples
    --------
    >>> round(potential_rhe_volt(-1.5, 0.210, 6.8, 298.15, -0.010, 10.0, 0.0), 5)
    -0.78772
    """
    ohmic_drop = (1.0 - compensated) * mean_current_ampere * resistance_ohm
    return potential_volt + reference_volt + nernst_slope_volt(temperature_kelvin) * pH - ohmic_drop
