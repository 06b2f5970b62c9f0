"""What is assumed where a day declares nothing, and that a stated zero stays zero."""

from __future__ import annotations

import pytest

from coulombook.balance.assumed import assumed_declarations, groups, report_assumed
from coulombook.balance.readings import DaySettings, Declared, OutletFlow
from coulombook.findings import Findings, Origin

PLACE = Origin("day.toml", row=9)


def declared(*quantities: str, relative: float = 0.03) -> tuple[Declared, ...]:
    return tuple(Declared(one, relative, None, "day", PLACE) for one in quantities)


def assumed(
    *quantities: str, outlet_flow: OutletFlow = OutletFlow.INLET
) -> dict[str, tuple[float | None, str]]:
    settings = DaySettings(outlet_flow=outlet_flow, declared=declared(*quantities))
    return {one.quantity: (one.relative, one.shared) for one in assumed_declarations(settings)}


def test_a_day_that_declares_nothing_gets_the_usual_uncertainties() -> None:
    assert assumed() == {
        "inlet flow": (0.01, "day"),
        "peak area": (0.01, "reading"),
        "integral": (0.02, "reading"),
        "standard amount": (0.01, "day"),
        "compartment volume": (0.01, "reading"),
        "aliquot": (0.005, "reading"),
        "i": (0.002, "day"),
    }


@pytest.mark.parametrize(
    ("way", "quantity"),
    [
        (OutletFlow.INLET, "inlet flow"),
        (OutletFlow.MEASURED, "outlet flow"),
        (OutletFlow.TRACER, "tracer flow"),
        (OutletFlow.BALANCE, "inlet flow"),
    ],
)
def test_the_flow_in_use_is_the_uncertain_one(way: OutletFlow, quantity: str) -> None:
    flows = {one for one in assumed(outlet_flow=way) if one.endswith("flow")}
    assert flows == {quantity}


@pytest.mark.parametrize("name", ["gas", "liquid", "charge"])
def test_one_word_about_a_group_is_the_whole_word(name: str) -> None:
    of = {group.name: group for group in groups(OutletFlow.MEASURED)}
    others = {quantity for other in of.values() if other.name != name for quantity, _, _ in other.assumed}
    for quantity in of[name].quantities:
        assert assumed(quantity, outlet_flow=OutletFlow.MEASURED).keys() == others


def test_what_is_assumed_of_a_group_belongs_to_it() -> None:
    for way in OutletFlow:
        for group in groups(way):
            assert {name for name, _, _ in group.assumed} <= group.quantities


def test_an_assumed_uncertainty_that_moves_nothing_is_not_told() -> None:
    findings = Findings()
    settings = DaySettings(declared=declared("integral"))
    # of the declared one, then flow, areas and current: a day without gas
    report_assumed(settings, (True, False, False, True), findings)
    assert [(one.kind, one.where) for one in findings] == [("assumed-uncertainty", "day.toml, I")]
    assert "0.2 %, shared by the day" in next(iter(findings)).text
