"""The search for causes on days of ten to two thousand runs; prints JSON: seconds by number of runs.

    python -m tests.benchmarks.explaining FOLDER REPEATS

What chance alone can do is judged on every day, also on one that closes so well that nobody would ask.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

import numpy as np
from tests.benchmarks.days import CALIBRATIONS, write_day
from tests.benchmarks.measure import in_turns, timed

from coulombook.balance.causes import candidate_causes
from coulombook.balance.explain import CauseModel, covariance_of_totals
from coulombook.balance.settle import Settled
from coulombook.findings import Findings
from coulombook.intake.day import open_day
from coulombook.tally import settle_day
from coulombook.uncertainty.linearised import nominal

RUNS = (10, 30, 100, 300, 1000, 2000)


def settled_day(folder: Path, runs: int) -> Settled:
    """A day made for the purpose."""
    write_day(folder, runs, 100)
    findings = Findings()
    settled = settle_day(open_day(folder, [CALIBRATIONS], findings), findings)
    if settled is None:
        raise RuntimeError(str(tuple(findings)))
    return settled


def search(settled: Settled) -> None:
    """Everything that `explain` does on a day whose balance is doubtful."""
    model = CauseModel(
        covariance_of_totals(settled, np.arange(len(settled.plan.runs))), candidate_causes(settled)
    )
    model.rank(nominal(settled.outcome.total) - 1.0)
    model.by_chance(0)


def measure(folder: Path, repeats: int) -> dict[str, float]:
    """Medians of seconds."""
    days = {str(runs): settled_day(folder / str(runs), runs) for runs in RUNS}
    sides = {runs: timed(lambda settled=settled: search(settled)) for runs, settled in days.items()}
    return {runs: cost.second for runs, cost in in_turns(sides, repeats).items()}


if __name__ == "__main__":
    print(json.dumps(measure(Path(sys.argv[1]), int(sys.argv[2]))))
