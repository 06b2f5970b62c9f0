"""Standard uncertainties taken for what nobody declared, so that no balance is judged by an uncertainty of zero.

Readings fall into groups: gas, liquid, charge. A group about which the day declares nothing at all gets its defaults;
one with any declaration is taken as fully declared, so that a stated zero stays zero. The values are common practice,
no source; each one taken is a finding.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from coulombook.balance.readings import DaySettings, OutletFlow
from coulombook.findings import Findings
from coulombook.uncertainty.errors import DAY, READING, Declaration
from coulombook.units import written


@dataclass(frozen=True, slots=True)
class Group:
    """Quantities that are thought of together, and what is assumed when none of them is declared.

    ``assumed`` holds quantity, relative standard uncertainty and sharing.
    """

    name: str
    quantities: frozenset[str]
    assumed: tuple[tuple[str, float, str], ...]


_OR_SCATTER = ", or the scatter of a reading about its curve where that is larger"


def groups(outlet_flow: OutletFlow) -> tuple[Group, ...]:
    """The groups of a day that finds its outlet flow in this way."""
    gas = frozenset(
        {
            "inlet flow",
            "outlet flow",
            "tracer flow",
            "peak area",
            "mole fraction",
            "headspace",
            "carbonate uptake",
        }
    )
    return (
        # one meter for the day, and the integration of each peak
        Group("gas", gas, ((outlet_flow.entered, 0.01, DAY), ("peak area", 0.01, READING))),
        # baseline and phase of each spectrum, one weighed stock, volumes read off, one pipetting per tube
        Group(
            "liquid",
            frozenset({"integral", "standard amount", "compartment volume", "aliquot", "t1"}),
            (
                ("integral", 0.02, READING),
                ("standard amount", 0.01, DAY),
                ("compartment volume", 0.01, READING),
                ("aliquot", 0.005, READING),
            ),
        ),
        # gain of the potentiostat's current range
        Group("charge", frozenset({"i"}), (("i", 0.002, DAY),)),
    )


def assumed_declarations(settings: DaySettings) -> tuple[Declaration, ...]:
    """What is assumed for the groups that the day declares nothing about."""
    declared = {one.quantity for one in settings.declared}
    return tuple(
        Declaration(quantity, relative, None, shared)
        for group in groups(settings.outlet_flow)
        if not declared & group.quantities
        for quantity, relative, shared in group.assumed
    )


def report_assumed(settings: DaySettings, moved: Sequence[bool], findings: Findings) -> None:
    """One finding for each assumed uncertainty that moved anything; ``moved`` as in `Inputs`."""
    assumed = assumed_declarations(settings)
    for one, moves in zip(assumed, moved[len(settings.declared) :], strict=True):
        if moves and one.relative is not None:
            findings.add(
                "assumed-uncertainty",
                f"day.toml, {written(one.quantity)}",
                f"no uncertainty is declared for it or its kind; a relative standard uncertainty of "
                f"{one.relative * 100:g} %, shared by the {one.shared}, was taken"
                f"{_OR_SCATTER if one.quantity in ('peak area', 'integral') else ''}",
                "declare your own in a section [[uncertainty]]; '0 %' if it is to count as exact",
            )
