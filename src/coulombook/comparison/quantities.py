"""What catalysts are compared by: Faradaic efficiencies, C2+/C1, and partial current densities on either area."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.comparison.runs import TOTALS, ComparedRuns
from coulombook.uncertainty.linearised import Linearised, nominal

GEOMETRIC, REAL = "geometric", "real"
BASES = (GEOMETRIC, REAL)
EFFICIENCY, DENSITY, RATIO = "FE", "j", "C2+/C1"
KINDS = (EFFICIENCY, RATIO, DENSITY)
UNWANTED = ("H2", "hydrogen")  # of which the least is the best

_PERCENT = 100.0
_MA_PER_CM2 = 0.1  # from A/m^2


@dataclass(frozen=True, slots=True)
class Quantity:
    """One quantity of comparison. ``basis`` is empty for what no area enters."""

    product: str
    kind: str
    basis: str = ""

    @property
    def words(self) -> str:
        """Its name in a sentence: such as C2+ FE, or C2+ current density."""
        if self.kind == RATIO:
            return self.kind
        return f"{self.product} {'current density' if self.kind == DENSITY else self.kind}"

    @property
    def head(self) -> str:
        """Its name with its unit, as the head of a column would carry it."""
        unit = {EFFICIENCY: "FE / %", DENSITY: "j / mA cm^-2"}
        return self.kind if self.kind == RATIO else f"{self.product} {unit[self.kind]}"

    @property
    def lowest_first(self) -> bool:
        """Whether the smallest is the best."""
        return self.product in UNWANTED and self.kind != RATIO

    @property
    def logarithm(self) -> bool:
        """Whether it spans decades along a series."""
        return self.kind != EFFICIENCY

    def of(self, runs: ComparedRuns) -> Linearised:
        """Its value in each run, in the unit of its head; NaN where it cannot be had."""
        if self.kind == RATIO:
            return runs.ratio
        efficiency = runs.efficiency[self.product]
        if self.kind == EFFICIENCY:
            return efficiency * _PERCENT
        density = efficiency * runs.current_density_ampere_per_m2 * _MA_PER_CM2
        return density if self.basis == GEOMETRIC else density / runs.roughness_factor


def quantities(products: Sequence[str], kinds: Sequence[str], bases: Sequence[str]) -> tuple[Quantity, ...]:
    """The quantities of comparison, the one that decides first: efficiency, then C2+/C1, then current densities."""
    found = []
    for product in products[:1]:
        if EFFICIENCY in kinds:
            found.append(Quantity(product, EFFICIENCY))
    if RATIO in kinds:
        found.append(Quantity("", RATIO))
    if EFFICIENCY in kinds:
        found.extend(Quantity(product, EFFICIENCY) for product in products[1:])
    if DENSITY in kinds:
        wanted = [one for one in products if one not in UNWANTED] or products
        found.extend(Quantity(product, DENSITY, basis) for product in wanted for basis in bases)
    return tuple(found)


def leading_products(runs: ComparedRuns) -> tuple[str, ...]:
    """Products to compare by if nobody says which: C2+ or, where none was found, the largest carbon product; and H2."""
    if (nominal(runs.efficiency["C2+"]) > 0).any():
        return ("C2+", "H2")
    made = {
        name: float(np.nanmax(nominal(x)))
        for name, x in runs.efficiency.items()
        if name not in TOTALS and name not in UNWANTED and np.isfinite(nominal(x)).any()
    }
    return (max(made, key=lambda name: made[name]), "H2") if made else ("H2",)
