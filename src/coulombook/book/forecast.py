"""What a tally of a day would compute and what it lacks, in plain words."""

from __future__ import annotations

from coulombook.balance.readings import Day, OutletFlow
from coulombook.balance.settle import Settled

_OUTLET = {
    OutletFlow.INLET: "taken as the inlet flow",
    OutletFlow.MEASURED: "as measured",
    OutletFlow.TRACER: "from the tracer",
    OutletFlow.BALANCE: "from a balance of moles around the cell",
}


def _count(number: int, what: str) -> str:
    return f"{number} {what}{'' if number == 1 else 's'}"


def forecast(day: Day, settled: Settled | None) -> list[str]:
    """Lines for the reader; ``settled`` is None when faults stand in the way."""
    catalysts = list(dict.fromkeys(run.catalyst for run in day.runs))
    lines = [
        f"{_count(len(day.runs), 'run')} of {_count(len(catalysts), 'catalyst')}: {', '.join(catalysts)}"
    ]
    injections = {(peak.run, peak.injection) for peak in day.peaks}
    if injections:
        lines.append(
            f"{_count(len(injections), 'gas injection')} with {_count(len(day.peaks), 'peak')}; outlet flow "
            f"{_OUTLET[day.settings.outlet_flow]}"
        )
    else:
        lines.append("no gas injections: no gas products")
    samples = [vial for vial in day.vials if not vial.blank]
    if samples:
        blanks = len(day.vials) - len(samples)
        lines.append(f"{_count(len(samples), 'liquid sample')} and {_count(blanks, 'blank')}")
    else:
        lines.append("no vials: no liquid products")
    lines.append(
        f"{_count(len(day.checks), 'check injection')} for detector drift"
        if day.checks
        else "no check injections: detector drift is taken as none"
    )
    lines.append(
        f"{_count(len(day.scans), 'voltammogram')} for capacitance"
        if day.scans
        else "no scans: no real area, currents on the geometric area alone"
    )
    if not day.settings.declared:
        lines.append("no [[uncertainty]] declared: usual values stand in for yours")
    if settled is not None:
        products = sorted(set(settled.plan.products.species))
        lines.append(f"{_count(len(products), 'product')} would be reported: {', '.join(products)}")
    return lines
