"""Species: composition, electrons, carbon group, aliases.

Electrons and groups are computed from the composition, never tabulated: n = 4x + y - 2z - q for C_x H_y O_z of
charge q made from CO2 and water.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

_ELEMENT = re.compile(r"([A-Z][a-z]?)(\d*)")
_CHARGE = re.compile(r"(\d*)([+-])$|\^(\d*)([+-])$")


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

        n = 4x + y - 2z - q, the oxidation-state balance of xCO2 + ... -> C_x H_y O_z^q.

        >>> Composition(2, 4, 0).electrons, Composition(1, 1, 2, -1).electrons
        (12, 2)
        """
        return 4 * self.carbon + self.hydrogen - 2 * self.oxygen - self.charge

    @property
    def group(self) -> str:
        """H2 for a product without carbon, else C followed by the number of carbon atoms."""
        return f"C{self.carbon}" if self.carbon else "H2"


def parse_formula(formula: str) -> Composition:
    """Composition of a formula such as ``C2H4``, ``HCOO-`` or ``CH3COO^-``.

    Raises ValueError when it holds anything but carbon, hydrogen and oxygen.

    >>> parse_formula("CH3CH2OH")
    Composition(carbon=2, hydrogen=6, oxygen=1, charge=0)
    """
    text = formula.strip().replace("\N{SUPERSCRIPT MINUS}", "-")
    charge = 0
    sign = re.search(r"\^?(\d*)([+-])$", text)
    if sign:
        charge = int(sign[1] or 1) * (1 if sign[2] == "+" else -1)
        # "C2H4-" style digits belong to the element, not to the charge, unless a caret parts them
        if sign[1] and "^" not in sign[0]:
            charge = 1 if sign[2] == "+" else -1
            text = text[: sign.end(1)]
        else:
            text = text[: sign.start()]
    counts = {"C": 0, "H": 0, "O": 0}
    position = 0
    while position < len(text):
        match = _ELEMENT.match(text, position)
        if match is None or match[1] not in counts:
            raise ValueError(f"formula '{formula}' must be made of C, H and O with an optional charge")
        counts[match[1]] += int(match[2] or 1)
        position = match.end()
    if not text:
        raise ValueError("the formula is empty")
    return Composition(counts["C"], counts["H"], counts["O"], charge)


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
    return " ".join(text.split()).casefold()


class SpeciesTable:
    """Species found by name, formula or alias, without regard to case or runs of blanks."""

    def __init__(self, species: Iterable[Species]) -> None:
        self._by_name = {one.name: one for one in species}
        self._by_key: dict[str, Species] = {}
        for one in self._by_name.values():
            for text in (one.name, one.formula, *one.aliases):
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
