"""Species: composition, electrons, carbon group, aliases, equilibrium potential.

Electrons and groups are computed from the composition, never tabulated: n = 4x + y - 2z - q for C_x H_y O_z
of charge q made from CO2 and water.
"""

from __future__ import annotations

import math
import re
import tomllib
import unicodedata
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT

_PIECE = re.compile(r"([A-Z][a-z]?)(\d*)")
_CHARGE = re.compile(r"(?:\^(\d*)|)([+-])$")
TABLE_TEMPERATURE_KELVIN = 298.15  # of every tabulated Gibbs energy


@dataclass(frozen=True, slots=True)
class Composition:
    """Atoms of one molecule or ion made of carbon, hydrogen and oxygen."""

    carbon: int
    hydrogen: int
    oxygen: int
    charge: int = 0

    @property
    def electrons(self) -> int:
        """Electrons taken up per molecule, counted from CO2 and water. [1]

        n = 4x + y - 2z - q, from the balance of xCO2 + (n + q)H+ + n e- -> C_x H_y O_z^q + (2x - z)H2O.

        >>> Composition(2, 4, 0).electrons, Composition(1, 1, 2, -1).electrons
        (12, 2)
        """
        return 4 * self.carbon + self.hydrogen - 2 * self.oxygen - self.charge

    @property
    def group(self) -> str:
        """H2 for a product without carbon, else C followed by the number of carbon atoms."""
        return f"C{self.carbon}" if self.carbon else "H2"


def _plain(text: str) -> str:
    """Sub- and superscripts as ordinary digits and signs."""
    return unicodedata.normalize("NFKC", text).replace("\N{MINUS SIGN}", "-")


def parse_formula(formula: str) -> Composition:
    """Composition of a condensed formula such as ``C2H4``, ``HCOO-``, ``CH3COO^-`` or ``C2O4^2-``.

    A charge above one needs the caret, for the 4 of ``C2O4-`` belongs to the oxygen.

    Raises
    ------
    ValueError
        The formula is empty or holds anything but carbon, hydrogen, oxygen and a charge.

    Examples
    --------
    >>> parse_formula("CH3CH2OH")
    Composition(carbon=2, hydrogen=6, oxygen=1, charge=0)
    """
    text = _plain(formula).strip()
    charge = 0
    sign = _CHARGE.search(text)
    if sign:
        charge = int(sign[1] or 1) * (1 if sign[2] == "+" else -1)
        text = text[: sign.start()]
    counts = {"C": 0, "H": 0, "O": 0}
    position = 0
    while position < len(text):
        piece = _PIECE.match(text, position)
        if piece is None or piece[1] not in counts:
            raise ValueError(f"formula '{formula}' must be made of C, H and O with an optional charge")
        counts[piece[1]] += int(piece[2] or 1)
        position = piece.end()
    if not text:
        raise ValueError("the formula is empty")
    return Composition(counts["C"], counts["H"], counts["O"], charge)


@dataclass(frozen=True, slots=True)
class GibbsEnergy:
    """Gibbs energy of formation at 298.15 K and 1 bar (aqueous: 1 mol/kg)."""

    state: str  # "g", "l", "aq", or the acid of an anion: "acid, aq", "acid, l"
    composition: Composition
    joule_per_mol: float
    source: str


@dataclass(frozen=True, slots=True)
class Species:
    """A species of the table.

    ``phase`` is the one it is usually measured in ("gas" or "liquid"); a ``carrier`` is never a product.
    """

    name: str
    formula: str
    phase: str
    aliases: tuple[str, ...] = ()
    carrier: bool = False
    composition: Composition | None = None  # None for a carrier that is not made of C, H, O
    gibbs: tuple[GibbsEnergy, ...] = ()  # the usual state first

    @property
    def electrons(self) -> int:
        """Electrons per molecule. [1] Raises ValueError for a carrier without composition."""
        if self.composition is None:
            raise ValueError(f"{self.name} is no product of CO2 and water")
        return self.composition.electrons

    @property
    def carbon(self) -> int:
        """CO2 molecules per molecule. [1]"""
        return self.composition.carbon if self.composition else 0

    @property
    def group(self) -> str:
        """Carbon group: H2, C1, C2, ..."""
        return self.composition.group if self.composition else ""


def _key(text: str) -> str:
    return " ".join(_plain(text).split()).casefold()


class SpeciesTable:
    """Species found by name, formula or alias, without regard to case or runs of blanks."""

    __slots__ = ("_by_key", "_by_name")

    def __init__(self, species: Iterable[Species]) -> None:
        self._by_name = {one.name: one for one in species}
        self._by_key: dict[str, Species] = {}
        # every name before any formula or alias: an alias must not hide a species that is called so
        for one in self._by_name.values():
            self._by_key.setdefault(_key(one.name), one)
        for one in self._by_name.values():
            for text in (one.formula, *one.aliases):
                self._by_key.setdefault(_key(text), one)

    def find(self, text: str) -> Species | None:
        """The species called ``text``, or None."""
        return self._by_key.get(_key(text))

    def __getitem__(self, name: str) -> Species:
        return self._by_name[name]

    def __iter__(self) -> Iterator[Species]:
        return iter(self._by_name.values())

    def names(self) -> tuple[str, ...]:
        """Every key that `find` answers to, for suggestions."""
        return tuple(self._by_key)

    def extended(self, more: Iterable[Species]) -> SpeciesTable:
        """A table in which ``more`` is known as well; its names win over the shipped ones."""
        fresh = list(more)
        taken = {one.name for one in fresh}
        return SpeciesTable([*fresh, *(one for one in self._by_name.values() if one.name not in taken)])


def _species(row: dict[str, Any]) -> Species:
    carrier = row.get("carrier", False)
    try:
        composition = parse_formula(row["formula"])
    except ValueError:
        # nitrogen, argon, helium; anything else of the table must be made of C, H and O
        if not carrier:
            raise
        composition = None
    return Species(
        row["name"],
        row["formula"],
        row["phase"],
        tuple(row["aliases"]),
        carrier,
        composition,
        tuple(
            GibbsEnergy(
                one["state"],
                parse_formula(one.get("formula", row["formula"])),
                1000.0 * one["kilojoule_per_mol"],
                one["source"],
            )
            for one in row.get("gibbs", ())
        ),
    )


@cache
def _data() -> dict[str, Any]:
    return tomllib.loads(files("coulombook").joinpath("data", "species.toml").read_text(encoding="utf-8"))


def group_rank(group: str) -> tuple[int, str]:
    """Order of carbon groups: H2 before C1, C2 before C10, what has no group last."""
    if group == "H2":
        return 0, ""
    return (int(group[1:]), "") if group[:1] == "C" and group[1:].isdecimal() else (10**6, group)


@cache
def load_species() -> SpeciesTable:
    """The shipped table of species.

    >>> load_species().find("Ethene").name
    'ethylene'
    """
    return SpeciesTable(_species(row) for row in _data()["species"])


def electrons_of(name: str) -> int:
    """Electrons per molecule of a species, called by its name, an alias, or its formula. [1]

    Raises ValueError for a name that is neither in the table nor a formula of C, H and O.

    >>> electrons_of("ethylene"), electrons_of("HCOO-"), electrons_of("C4H10O")
    (12, 2, 24)
    """
    known = load_species().find(name)
    return parse_formula(name).electrons if known is None else known.electrons


@cache
def _internal_standards() -> dict[str, str]:
    return {
        _key(text): row["name"]
        for row in _data()["internal_standard"]
        for text in (row["name"], *row["aliases"])
    }


def internal_standard_name(text: str) -> str:
    """Usual name of an internal standard, or ``text`` itself (blanks trimmed) where it is not known.

    >>> internal_standard_name("dimethyl  sulfoxide"), internal_standard_name("my own salt")
    ('DMSO', 'my own salt')
    """
    return _internal_standards().get(_key(text), " ".join(text.split()))


def equilibrium_potential_she_volt(species: Species, pH: float = 0.0, state: str | None = None) -> float:
    """Equilibrium potential of making a species from CO2 at 25 degC, against SHE. [V]

    E = -(G_product + (2x - z) G_water - x G_CO2) / (n F) - (n + q)/n (R T ln 10 / F) pH, for
    xCO2 + (n + q)H+ + n e- -> C_x H_y O_z^q + (2x - z)H2O, all at unit activity but the protons: CO2 gas at
    1 bar, liquid water, the product in its state. Source: Bard & Faulkner, Electrochemical Methods, 2nd ed.
    (2001), ch. 2.

    Parameters
    ----------
    species : Species
        A product with a Gibbs energy of formation.
    pH : float
        [1]
    state : str, optional
        State of the product, one of those in ``species.gibbs``; the first by default.

    Raises
    ------
    ValueError
        No Gibbs energy is known, for this state or at all, or the species is no product of CO2.
    """
    found = [one for one in species.gibbs if state is None or one.state == state]
    if not found or species.carrier:
        known = ", ".join(one.state for one in species.gibbs if not species.carrier) or "none"
        raise ValueError(f"no Gibbs energy of {species.name} in state {state or 'any'}; known: {known}")
    made = found[0].composition
    table = load_species()
    water, dioxide = table["water"].gibbs[0].joule_per_mol, table["carbon dioxide"].gibbs[0].joule_per_mol
    reaction = found[0].joule_per_mol + (2 * made.carbon - made.oxygen) * water - made.carbon * dioxide
    # every proton shifts G by RT ln a(H+)
    reaction += (made.electrons + made.charge) * GAS_CONSTANT * TABLE_TEMPERATURE_KELVIN * math.log(10.0) * pH
    return float(-reaction / (made.electrons * FARADAY_CONSTANT))


def equilibrium_potential_rhe_volt(species: Species, pH: float = 0.0, state: str | None = None) -> float:
    """Equilibrium potential of making a species from CO2 at 25 degC, against RHE at the same pH. [V]

    Of a neutral product it does not depend on pH; an anion takes up a proton less than electrons for each
    charge, so that formate moves by +29.6 mV and acetate by +7.4 mV a unit of pH. Parameters and errors as
    in `equilibrium_potential_she_volt`.

    >>> table = load_species()
    >>> round(equilibrium_potential_rhe_volt(table["ethylene"]), 3)
    0.079
    >>> round(equilibrium_potential_rhe_volt(table["formate"], 6.8), 3)
    -0.024
    """
    # the hydrogen electrode itself, -RT ln 10 pH / F against SHE
    hydrogen = -GAS_CONSTANT * TABLE_TEMPERATURE_KELVIN * math.log(10.0) * pH / FARADAY_CONSTANT
    return equilibrium_potential_she_volt(species, pH, state) - float(hydrogen)


def oxygen_potential_rhe_volt() -> float:
    """Equilibrium potential of O2/H2O at 25 degC against RHE, at any pH: -G(water) / (2 F). [V]

    >>> round(oxygen_potential_rhe_volt(), 4)
    1.2287
    """
    return float(-load_species()["water"].gibbs[0].joule_per_mol / (2.0 * FARADAY_CONSTANT))
