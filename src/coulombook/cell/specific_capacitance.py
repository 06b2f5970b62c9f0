"""Specific capacitance of smooth materials, from the shipped table."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

_FROM_UF_PER_CM2 = 1e-2  # to F/m^2


@dataclass(frozen=True, slots=True)
class SpecificCapacitance:
    """One value of the shipped table."""

    material: str
    electrolyte: str  # the kind: alkali, acid, bicarbonate
    farad_per_m2: float
    relative_uncertainty: float  # standard uncertainty, as a fraction
    source: str


@cache
def _table() -> tuple[dict[tuple[str, str], SpecificCapacitance], dict[str, str], dict[str, str]]:
    """Rows by material and kind of electrolyte; materials and kinds by every spelling."""
    text = files("coulombook").joinpath("data", "specific_capacitance.toml").read_text(encoding="utf-8")
    content = tomllib.loads(text)
    kinds = {
        spelling.casefold(): kind
        for kind, others in content["electrolyte"].items()
        for spelling in (kind, *others)
    }
    rows, materials = {}, {}
    for row in content["row"]:
        material = row["material"]
        for spelling in (material, *row.get("aliases", ())):
            materials[spelling.casefold()] = material
        source = content["source"][row["source"]]
        for kind in row["electrolytes"]:
            rows[material, kind] = SpecificCapacitance(
                material,
                kind,
                row["value"] * _FROM_UF_PER_CM2,
                row["relative_uncertainty"],
                f"{source['text']} ({source['mark']})",
            )
    return rows, materials, kinds


def known_materials() -> tuple[str, ...]:
    """Materials of the table, in its order."""
    return tuple(dict.fromkeys(material for material, _ in _table()[0]))


def known_electrolytes(material: str | None = None) -> tuple[str, ...]:
    """Kinds of electrolyte of the table, or those it has for a material."""
    found = [kind for own, kind in _table()[0] if material is None or own == find_material(material)]
    return tuple(dict.fromkeys(found))


def find_material(text: str) -> str | None:
    """The material of the table called ``text``, or None."""
    return _table()[1].get(" ".join(text.split()).casefold())


def find_electrolyte(text: str) -> str | None:
    """The kind of electrolyte of a name or a recipe such as "0.1 mol/L KHCO3", or None.

    Examples
    --------
    >>> find_electrolyte("0.1 mol/L KHCO3, CO2-saturated")
    'bicarbonate'
    """
    kinds = _table()[2]
    whole = " ".join(text.split()).casefold()
    found = {kinds[whole]} if whole in kinds else {
        kinds[word] for word in re.findall(r"[a-z0-9]+", whole) if word in kinds
    }  # fmt: skip
    # a mixture of kinds is none of them
    return found.pop() if len(found) == 1 else None


def specific_capacitance(material: str, electrolyte: str) -> SpecificCapacitance | None:
    """The value for a material and an electrolyte, or None where the table has none."""
    own, kind = find_material(material), find_electrolyte(electrolyte)
    return None if own is None or kind is None else _table()[0].get((own, kind))
