"""What the reader of a comparison should know: findings."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coulombook.comparison.judge import LEVEL, POTENTIAL, Judged, Verdicts
from coulombook.comparison.quantities import REAL
from coulombook.comparison.runs import ComparedRuns
from coulombook.findings import Findings

# potentials of one level further apart than this compare potentials as well as catalysts (common practice, no source)
APART_VOLT = 0.02


def report_doubts(
    runs: ComparedRuns, verdicts: Sequence[Verdicts], potentials: Sequence[float], findings: Findings
) -> None:
    """Report what limits the comparison."""
    _report_replicates(verdicts, findings)
    _report_levels(verdicts[0], findings)
    _report_absent(runs, verdicts, potentials, findings)


def _report_replicates(verdicts: Sequence[Verdicts], findings: Findings) -> None:
    first = verdicts[0].series
    if all(len(point.rows) < 2 for point in first.points):
        findings.add(
            "no-replicates",
            "all catalysts",
            "no catalyst has two runs at one level, so that the intervals hold what is declared and nothing of how far "
            "electrodes differ",
            "repeat one level or more with fresh electrodes",
        )
    for one in verdicts:
        repeats = one.series.repeatability
        apart = [
            f"{point.catalyst} at {point.level}"
            for point, stands_apart in zip(one.series.points, repeats.apart, strict=True)
            if stands_apart
        ]
        if apart:
            findings.add(
                "scatter-apart",
                "; ".join(apart),
                f"replicates scatter more in {one.quantity.words} than those of the others, and are judged by "
                "their own scatter",
                "look at these runs: a leak, a missing vial, another electrode",
            )


def _report_levels(one: Verdicts, findings: Findings) -> None:
    spread = [(judged.point, _spread(judged)) for judged in one.at(LEVEL)]
    wide = [(name, volt) for name, volt in spread if volt > APART_VOLT]
    if wide:
        told = ", ".join(f"{volt * 1e3:.0f} mV at {name}" for name, volt in wide)
        findings.add(
            "levels-apart",
            "levels",
            f"catalysts at one level lie at different potentials once the ohmic drop is taken off ({told})",
            "compare at common potentials",
        )


def _spread(judged: Judged) -> float:
    return float(np.ptp([value.potential_volt for value in judged.values]))


def _report_absent(
    runs: ComparedRuns, verdicts: Sequence[Verdicts], potentials: Sequence[float], findings: Findings
) -> None:
    catalysts = list(dict.fromkeys(runs.catalyst))
    if not potentials and len(catalysts) > 1:
        findings.add(
            "not-compared",
            "potentials",
            "no two catalysts have a stretch of potential in common that two levels or more span, so that levels alone "
            "are compared",
            "measure both over one range",
        )
    for one in verdicts:
        there = {point.catalyst for point in one.series.points}
        absent = [name for name in catalysts if name not in there]
        if absent:
            why = "has no roughness factor" if one.quantity.basis == REAL else "does not report it"
            findings.add(
                "not-compared",
                "; ".join(absent),
                f"{one.quantity.words}{' on the real area' if one.quantity.basis == REAL else ''}: {why}",
                "scan the electrodes in the capacitive range" if one.quantity.basis == REAL else "",
            )
    for judged in verdicts[0].points:
        if judged.at == POTENTIAL:
            there = {value.owner for value in judged.values}
            outside = [name for name in catalysts if name not in there]
            if outside:
                findings.add(
                    "not-compared",
                    "; ".join(outside),
                    f"{judged.point} V lies outside what was measured; nothing is extrapolated",
                    "measure there, or choose another potential",
                )
