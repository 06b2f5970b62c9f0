"""Run the benchmarks, print their table and, when all were run, rewrite docs/benchmarks.md."""

from __future__ import annotations

import argparse
import csv
import json
import math
import os
import platform
import subprocess
import sys
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from tests.benchmarks.days import BENCH, CALIBRATIONS, PLAIN, PROJECT, Dialect, copy_example
from tests.benchmarks.measure import Cost, Costs, in_turns, process

BY_HAND = Path(__file__).with_name("by_hand.py")
DOCUMENT = PROJECT / "docs" / "benchmarks.md"
GROWTH_RUNS = (10, 30, 100, 300, 1000, 2000)
GROWTH_TURNS = 3  # sizes hundreds of times apart need no finer measure
FEWEST_REPEATS = 7


@dataclass(frozen=True, slots=True)
class Row:
    """One line of the result table; ``ratio`` is to be at most ``target``."""

    what: str
    against: str
    target: float
    ratio: float
    ours: str
    other: str

    @property
    def verdict(self) -> str:
        return "pass" if self.ratio <= self.target else "miss"


@dataclass(frozen=True, slots=True)
class Bench:
    """Where the benchmarks write, and how often they measure."""

    folder: Path
    repeats: int

    @property
    def bytecode(self) -> Path:
        return self.folder / "bytecode"

    def python(self, *command: str | Path) -> Callable[[], Cost]:
        return process([sys.executable, *command], self.bytecode)

    def coulombook(self, *command: str | Path) -> Callable[[], Cost]:
        """The command as it is installed beside the interpreter."""
        return process([Path(sys.executable).with_name("coulombook"), *command], self.bytecode)

    def tally(self, day: Path) -> Callable[[], Cost]:
        told = ("--out", f"{day}-results", "--calibrations", CALIBRATIONS, "--quiet", "--tables-only")
        return self.coulombook("tally", day, *told)

    def by_hand(self, day: Path, dialect: Dialect) -> Callable[[], Cost]:
        told = (dialect.separator, dialect.decimal, str(dialect.head_lines), dialect.encoding)
        return self.python(BY_HAND, day, CALIBRATIONS, f"{day}-by-hand.csv", *told)

    def day(self, runs: int, rows: int) -> Path:
        """A day made for the purpose, by a process of its own: this one must stay small."""
        folder = self.folder / f"{runs}-runs-{rows}-rows"
        if not folder.exists():
            self.python("-m", "tests.benchmarks.days", folder, str(runs), str(rows))()
        return folder

    def worker(self, module: str) -> dict[str, Any]:
        """What a benchmark within one process found."""
        folder = self.folder / module
        folder.mkdir()
        command = [sys.executable, "-m", f"tests.benchmarks.{module}", folder / "work", str(self.repeats)]
        return json.loads(subprocess.run(command, check=True, stdout=subprocess.PIPE).stdout)


def assert_same_ledger(day: Path) -> None:
    """Both sides found the same products, Faradaic efficiencies and potentials."""

    def ledger(path: Path) -> dict[tuple[str, str], tuple[float, float]]:
        with path.open(encoding="utf-8", newline="") as stream:
            return {
                (row["run"], row["product"]): (float(row["FE / %"]), float(row["E vs RHE / V"]))
                for row in csv.DictReader(stream)
            }

    ours, other = ledger(Path(f"{day}-results") / "ledger.csv"), ledger(Path(f"{day}-by-hand.csv"))
    if ours.keys() != other.keys():
        raise AssertionError(f"products differ: {sorted(ours.keys() ^ other.keys())[:5]}")
    for key, pair in ours.items():
        for one, two in zip(pair, other[key], strict=True):
            # the script rounds the Faraday constant to ten digits
            if not math.isclose(one, two, rel_tol=1e-9):
                raise AssertionError(f"{key}: {one} against {two}")


def _ms(second: float) -> str:
    return f"{second * 1e3:.0f} ms" if second < 10 else f"{second:.1f} s"


def _cold(cost: Costs) -> str:
    return f"{_ms(cost.second)} (processor {_ms(cost.processor_second)})"


def _mb(byte: float) -> str:
    return f"{byte / 1e6:.0f} MB"


def run_help(bench: Bench) -> list[Row]:
    """The help against the bare interpreter."""
    costs = in_turns(
        {"ours": bench.coulombook("--help"), "bare": bench.python("-c", "pass")},
        3 * bench.repeats,
    )
    ours, bare = costs["ours"].second, costs["bare"].second
    return [Row("`coulombook --help`", "`python -c pass`", 2.5, ours / bare, _ms(ours), _ms(bare))]


def _against_hand(bench: Bench, day: Path, dialect: Dialect) -> dict[str, Costs]:
    sides = {"ours": bench.tally(day), "by hand": bench.by_hand(day, dialect)}
    costs = in_turns(sides, bench.repeats)
    assert_same_ledger(day)
    return costs


def _compared(what: str, target: float, costs: dict[str, Costs]) -> Row:
    ours, other = costs["ours"], costs["by hand"]
    return Row(what, "FE table by hand", target, ours.second / other.second, _cold(ours), _cold(other))


def run_example(bench: Bench) -> list[Row]:
    """The example day, cold."""
    day = bench.folder / "example"
    copy_example(day)
    costs = _against_hand(bench, day, BENCH)
    return [_compared("tally of the example day, cold", 1.5, costs)]


def run_large(bench: Bench) -> list[Row]:
    """Two hundred long traces, time and memory."""
    costs = _against_hand(bench, bench.day(200, 100_000), PLAIN)
    ours, other = costs["ours"], costs["by hand"]
    what = "200 runs of 100,000 rows"
    return [
        _compared(what, 0.8, costs),
        Row(
            f"{what}: peak memory",
            "FE table by hand",
            1.0,
            ours.peak_byte / other.peak_byte,
            _mb(ours.peak_byte),
            _mb(other.peak_byte),
        ),
    ]


def run_traces(bench: Bench) -> list[Row]:
    """One long trace in several dialects, warm."""
    return [
        Row(
            f"trace of 1,000,000 rows, all checks: {dialect}",
            "`pandas.read_csv` of it",
            1.5,
            cost["ours"] / cost["pandas"],
            f"{_ms(cost['ours'])}, {_ms(cost['integrated'])} integrated",
            _ms(cost["pandas"]),
        )
        for dialect, cost in bench.worker("traces").items()
    ]


def run_uncertainty(bench: Bench) -> list[Row]:
    """Propagation through the whole model."""
    cost = bench.worker("uncertainty")
    return [
        Row(
            f"uncertainty of {cost['outputs']:,} products, totals, ratios, covariances",
            "the model in `uncertainties`",
            0.1,
            cost["ours"] / cost["uncertainties"],
            _ms(cost["ours"]),
            _ms(cost["uncertainties"]),
        )
    ]


def run_workbook(bench: Bench) -> list[Row]:
    """The audit workbook of the example day."""
    cost = bench.worker("workbook")
    return [
        Row(
            f"workbook of {cost['cells']:,} cells, same bytes on rerun",
            "a bare loop of the same cells",
            1.5,
            cost["ours"] / cost["bare"],
            _ms(cost["ours"]),
            _ms(cost["bare"]),
        )
    ]


def run_page(bench: Bench) -> list[Row]:
    """The example day with all that people open, cold, and the size of its page."""
    cost = bench.worker("page")
    what = "tally of the example day with workbook and page, cold"
    return [
        Row(
            what,
            against,
            2.0,
            cost["whole"] / cost[side],
            f"{_ms(cost['whole'])} (processor {_ms(cost['whole processor'])})",
            f"{_ms(cost[side])} (processor {_ms(cost[f'{side} processor'])})",
        )
        for side, against in (
            ("drawn", "FE table by hand and the page's figures with matplotlib"),
            ("drawn with logs", "the same and the logs of the runs"),
        )
    ] + [
        Row(
            "size of that page",
            "1.5 MB",
            1.0,
            cost["bytes"] / 1.5e6,
            f"{cost['bytes'] / 1e6:.2f} MB",
            "1.5 MB",
        )
    ]


def run_draws(bench: Bench) -> list[Row]:
    """Monte Carlo against the least it could cost."""
    cost = bench.worker("draws")
    what = f"100,000 draws of {cost['outputs']:,} outputs with intervals"
    return [
        Row(
            what,
            "normals, each run's errors drawn for it, and sort, as many threads",
            1.3,
            cost["ours"] / cost["by run"],
            _ms(cost["ours"]),
            _ms(cost["by run"]),
        ),
        Row(
            what,
            "the same with every error drawn once, kept for all runs",
            1.3,
            cost["ours"] / cost["once"],
            _ms(cost["ours"]),
            _ms(cost["once"]),
        ),
        Row(f"{what}: peak memory", "250 MB", 1.0, cost["peak"] / 250e6, _mb(cost["peak"]), "250 MB"),
    ]


def run_curves(bench: Bench) -> list[Row]:
    """Many calibration lines."""
    cost = bench.worker("curves")
    return [
        Row(
            f"{cost['curves']} curves of 8 levels with covariances",
            "a loop of `np.polyfit`",
            0.05,
            cost["ours"] / cost["polyfit"],
            f"{cost['ours'] * 1e3:.2f} ms",
            _ms(cost["polyfit"]),
        )
    ]


def run_search(bench: Bench) -> list[Row]:
    """The search for causes from ten to two thousand runs."""
    cost = bench.worker("explaining")
    runs, seconds = [int(one) for one in cost], list(cost.values())
    return [
        Row(
            f"search for causes: exponent of time in the number of runs, {first} to {runs[-1]:,}",
            "proportional growth",
            1.05,
            exponent(runs[place:], seconds[place:]),
            f"{_ms(seconds[place])} to {_ms(seconds[-1])}",
            "",
        )
        for place, first in ((0, runs[0]), (len(runs) - 2, f"{runs[-2]:,}"))
    ]


def run_growth(bench: Bench) -> list[Row]:
    """Time and memory from ten to two thousand runs."""
    sides = {str(runs): bench.tally(bench.day(runs, 100)) for runs in GROWTH_RUNS}
    costs = in_turns(sides, GROWTH_TURNS)
    rows = []
    for what, get, show in (
        ("time", lambda cost: cost.second, _ms),
        ("peak memory", lambda cost: cost.peak_byte, _mb),
    ):
        values = [get(costs[str(runs)]) for runs in GROWTH_RUNS]
        rows.append(
            Row(
                f"exponent of {what} in the number of runs, {GROWTH_RUNS[0]} to {GROWTH_RUNS[-1]:,}",
                "proportional growth",
                1.05,
                exponent(GROWTH_RUNS, values),
                f"{show(values[0])} to {show(values[-1])}",
                "",
            )
        )
        # the start-up hides growth in the first numbers of runs; the last step does not
        rows.append(
            Row(
                f"the same from {GROWTH_RUNS[-2]:,} to {GROWTH_RUNS[-1]:,}",
                "proportional growth",
                1.05,
                exponent(GROWTH_RUNS[-2:], values[-2:]),
                f"{show(values[-2])} to {show(values[-1])}",
                "",
            )
        )
    return rows


def exponent(x: Sequence[float], y: Sequence[float]) -> float:
    """Slope of ln y against ln x by least squares."""
    lx, ly = [math.log(one) for one in x], [math.log(one) for one in y]
    mx, my = sum(lx) / len(lx), sum(ly) / len(ly)
    return sum((a - mx) * (b - my) for a, b in zip(lx, ly, strict=True)) / sum((a - mx) ** 2 for a in lx)


BENCHMARKS: dict[str, Callable[[Bench], list[Row]]] = {
    "help": run_help,
    "example": run_example,
    "large": run_large,
    "traces": run_traces,
    "uncertainty": run_uncertainty,
    "workbook": run_workbook,
    "page": run_page,
    "draws": run_draws,
    "curves": run_curves,
    "search": run_search,
    "growth": run_growth,
}

_TEXT = """\
# Benchmarks

Written by `python -m tests.benchmarks`. Both sides of a ratio ran in turns, {repeats} times each or more, after a
first time that does not count; the ratio is that of the medians, and so depends less on the machine than the times do.
Here: {machine}; {load}.

The other side of the tallies is [`tests/benchmarks/by_hand.py`](../tests/benchmarks/by_hand.py), the Faradaic
efficiencies alone as one writes them with pandas, without uncertainties, checks or units; both must have given the
same efficiencies and potentials to nine digits. Tallies and scripts start cold: a new process, its modules compiled
before, files in the page cache. Their processor time, of all threads together, stands beside the time. Traces are
read and uncertainties propagated in a running process, `pandas` being given the arguments the file needs. Peak memory
is the largest resident size of the process. Growth is measured in {growth} turns of six sizes.

Draws stand against the least they could cost: the normals and the sort of the outputs, alone. How many normals that is
depends on whether errors that runs share count once for the day or once for each run; both are shown.

{table}
"""


def table_of(rows: Sequence[Row]) -> str:
    """The results as a table in Markdown."""
    lines = [
        "| what | against | target | ratio | coulombook | other | |",
        "| --- | --- | ---: | ---: | --- | --- | --- |",
    ]
    lines += [
        f"| {row.what} | {row.against} | {row.target:g} | {row.ratio:.2f} | {row.ours} | {row.other} | {row.verdict} |"
        for row in rows
    ]
    return "\n".join(lines)


def machine() -> str:
    """The machine in words that name nobody's."""
    return (
        f"{os.cpu_count()} cores ({platform.machine()}, {platform.system()}), "
        f"{platform.python_implementation()} {'.'.join(platform.python_version_tuple()[:2])}"
    )


def main() -> int:
    """Measure what is asked for; 1 when a target is missed."""
    parser = argparse.ArgumentParser(prog="python -m tests.benchmarks", description=__doc__)
    parser.add_argument(
        "names", nargs="*", metavar="NAME", help=f"some of {', '.join(BENCHMARKS)}; all by default"
    )
    parser.add_argument("--repeats", type=int, default=FEWEST_REPEATS, help="turns of each side")
    options = parser.parse_args()
    unknown = sorted(set(options.names) - BENCHMARKS.keys())
    if unknown:
        parser.error(f"no benchmark is called {', '.join(unknown)}")
    rows: list[Row] = []
    # what others do on the machine falls on both sides, but not alike on one thread and on two
    load = (
        f"{os.getloadavg()[1]:.0f} other processes were busy"
        if os.getloadavg()[1] >= 0.5
        else "otherwise idle"
    )
    with tempfile.TemporaryDirectory() as folder:
        bench = Bench(Path(folder), options.repeats)
        for name in options.names or BENCHMARKS:
            print(f"{name} ...", file=sys.stderr, flush=True)
            found = BENCHMARKS[name](bench)
            print(table_of(found), file=sys.stderr, flush=True)
            rows += found
    print(table_of(rows))
    if not options.names and options.repeats >= FEWEST_REPEATS:
        DOCUMENT.write_text(
            _TEXT.format(
                repeats=options.repeats,
                machine=machine(),
                load=load,
                growth=GROWTH_TURNS,
                table=table_of(rows),
            ),
            encoding="utf-8",
        )
    return int(any(row.verdict == "miss" for row in rows))


if __name__ == "__main__":
    sys.exit(main())
