"""A large day, and what its tally takes."""

from __future__ import annotations

import csv
import sys
from dataclasses import dataclass
from pathlib import Path

from tests.benchmarks.days import CALIBRATIONS, write_day
from tests.benchmarks.measure import process
from tests.reliability.bench import hashes


@dataclass(frozen=True, slots=True)
class Load:
    """A day and the cost of its tally."""

    runs: int
    rows: int  # of logs, all together
    megabyte: float  # of all files read
    peak_megabyte: float
    second: float
    problems: tuple[str, ...]


def carry(place: Path, runs: int, rows: int) -> Load:
    """Tally a day of some runs, each with a log of some rows, in a process of its own: tables only."""
    day, out = place / "large day", place / "large results"
    write_day(day, runs, rows)
    before = hashes(day)
    command = [
        Path(sys.executable).with_name("coulombook"), "tally", day, "--calibrations", CALIBRATIONS, "--tables-only",
        "--quiet", "--out", out,
    ]  # fmt: skip
    cost = process(command, place / "bytecode")()
    with (out / "summary.csv").open(encoding="utf-8", newline="") as stream:
        told = list(csv.DictReader(stream))
    problems = [] if len(told) == runs else [f"{len(told)} of {runs} runs in the summary"]
    problems += [f"{one['run']} has no total" for one in told if not one["total FE / %"]]
    problems += [] if hashes(day) == before else ["inputs changed"]
    size = sum(one.stat().st_size for one in day.rglob("*") if one.is_file())
    return Load(runs, runs * (rows + 1), size / 1e6, cost.peak_byte / 1e6, cost.second, tuple(problems))
