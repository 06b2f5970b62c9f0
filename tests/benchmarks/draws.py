"""Monte Carlo of a day of 3,000 products, against the least that could be done for it; prints JSON.

    python -m tests.benchmarks.draws FOLDER REPEATS

The least is to draw the normals and to sort the outputs, on as many threads: a generator of the same kind, and the same
sort, on memory that is used again. How many normals that are depends on how errors are counted that runs share:
``once`` draws every error of the day once, however many runs share it; ``by run`` draws for each run the errors it
depends on, as one must who keeps none of them.
"""

from __future__ import annotations

import json
import resource
import sys
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
from tests.benchmarks.days import CALIBRATIONS, write_day
from tests.benchmarks.measure import in_turns, timed

from coulombook.balance.draws import THREADS, Record, draw_day
from coulombook.balance.settle import Settled
from coulombook.findings import Findings
from coulombook.intake.day import open_day
from coulombook.tally import settle_day

RUNS = 375  # of eight products, and of a total, C2+ and C2+/C1 each
DRAWS = 100_000
SEED = 20430518


def settled_day(folder: Path) -> Settled:
    """A day made for the purpose."""
    write_day(folder, RUNS, 100)
    findings = Findings()
    settled = settle_day(open_day(folder, [CALIBRATIONS], findings), findings)
    if settled is None:
        raise RuntimeError(str(tuple(findings)))
    return settled


def counts(settled: Settled) -> dict[str, int]:
    """Outputs, and the errors they depend on."""
    record, runs = Record(settled), np.arange(len(settled.plan.runs))
    return {
        "outputs": sum(len(rows) for _, rows in record.outputs(runs)),
        "once": len(record.columns(runs)),
        "by run": sum(len(record.columns(runs[[run]])) for run in runs),
    }


def normals_and_sort(normals: int, outputs: int) -> Callable[[], None]:
    """Draw so many rows of normals, and sort so many of them."""

    def share(thread: int) -> None:
        generator = np.random.Generator(np.random.SFC64([SEED, thread]))
        row = np.empty(DRAWS)
        for number in range(thread, normals, THREADS):
            generator.standard_normal(out=row)
            if number < outputs:
                row.sort()

    def all_of_it() -> None:
        with ThreadPoolExecutor(THREADS) as pool:
            list(pool.map(share, range(THREADS)))

    return all_of_it


def measure(folder: Path, repeats: int) -> dict[str, float]:
    """Seconds of all sides, and the peak memory of this process after ours."""
    settled = settled_day(folder)
    found = counts(settled)
    ours = timed(lambda: list(draw_day(settled, DRAWS, SEED)))
    ours()
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
    sides = {name: timed(normals_and_sort(found[name], found["outputs"])) for name in ("once", "by run")}
    costs = in_turns({"ours": ours, **sides}, repeats, warm_up=sides)
    return {name: cost.second for name, cost in costs.items()} | {
        "peak": peak,
        "outputs": found["outputs"],
        "errors": found["once"],
    }


if __name__ == "__main__":
    print(json.dumps(measure(Path(sys.argv[1]), int(sys.argv[2]))))
