"""Make many faults, and write what became of them into docs/reliability.md: `python -m tests.reliability`.

Takes a few minutes of both cores. Kinds that need root or a fork are left out where these are not to be had, and the
document says so. Ends with the number of faults that were not survived.
"""

from __future__ import annotations

import argparse
import csv
import json
import os
import platform
import subprocess
import sys
import tempfile
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from datetime import date
from pathlib import Path

from tests.reliability import inputs
from tests.reliability.bench import Tally
from tests.reliability.load import Load, carry

import coulombook

ROOT = Path(__file__).parents[2]
DOCUMENT = ROOT / "docs" / "reliability.md"
FUZZED = ROOT / "tests" / "fuzz" / "log.csv"
MUTATED = ROOT / "tests" / "mutation" / "log.csv"
EVERY = 100_000  # more than a day has touches of files
NUMBERS = {
    "moments": 200,
    "calls": 400,
    "gone": EVERY,
    "flicker": EVERY,
    "looked-at": 100,
    "room": 100,
    "full": 60,
    "limited": 60,
    "read-only": 1,
    "forbidden": 1,
    "at-once": 25,
    "without-locks": 25,
    "held": 25,
    "open": 30,
}
DAMAGES = 1000
RUNS, ROWS = 200, 100_000

_HEAD = """\
# Reliability

What was done to a tally to break it, and what became of it. Written by `python -m tests.reliability`; the suite makes
the same faults, fewer of each. Here: {cores} cores ({machine}, {system}), CPython {python}, as {user}.

## The promise

- **Results are whole or absent.** Everything is written into a folder beside the results, flushed to the disk, and then
  takes their name. A process that is killed between the two steps of that exchange leaves the old results aside, and
  the next `tally`, `show` or `again` puts them back; `show` says so. On a medium that can only be read they are read
  where they stand.
- **Inputs are never changed.** Their SHA-256 is compared after every fault below.
- **One writer at a time.** A file `.results.lock` beside the results is locked by the system while a folder is written,
  which takes a second or two. A second tally waits up to 30 s for its turn, then ends with status 2 and names the
  process, the machine and the time. The lock ends with its process, however that ends: the file of a killed one is no
  obstacle. Where a file system knows no locks (some network drives) tallies go on without: each writes whole results,
  the last one wins, and the other may be told that it cannot write.
- **What a killed tally leaves** (`.results.*.new`, `.results.*.old`, beside the results) is removed by the next one
  that holds the lock. Until then it may be deleted by hand, but `.results.*.old` only when `results` is there.
- **A fault is told clearly**: status 1 or 2, with the file it is about, and never as a fault of ours.
"""

_FAULTS = """
## Faults of the machine

*Survived*: the results were whole (those of before, or the new ones) or, if there were none before, absent; no input
had changed; the answer named a place; and the next tally gave whole results and left nothing else lying. Kills
are SIGKILL. A single error of a drive is also held to give the same numbers or none: nothing that is there may be taken
for absent. `touch` is any way to a file: looking, opening, reading, writing, renaming. All of it was run on Linux;
under Windows nothing was, but renames refused as Windows refuses them were simulated.

| fault | injected | survived | date | version |
| --- | ---: | ---: | --- | --- |
"""

_INPUTS = """
## Bad inputs

*Answered clearly*: status 1 and nothing written for a fault, each with its place, what was found, what was expected and
what would mend it; else whole results.

| input | tried | answered clearly | date | version |
| --- | ---: | ---: | --- | --- |
"""

_FUZZ = """
## Fuzzing

Coverage-guided, by `python -m tests.fuzz`; what broke a target once is kept among the tests.

| target | seconds | executions | crashes | date | version |
| --- | ---: | ---: | ---: | --- | --- |
"""

_MUTANTS = """
## Mutants

Small changes of the core that a test must notice, by `python -m tests.mutation`: a random sample of all, with the 95 %
interval of the share that would be noticed.

| room | mutants | tried | killed | score | interval | date | version |
| --- | ---: | ---: | ---: | ---: | --- | --- | --- |
"""

_LOAD = """
## Load

A tally of tables only, in a process of its own; every run got its total, and no input changed. Memory is the largest
resident size of the process. Times depend on what else the machine does; [benchmarks](benchmarks.md) compare.

| runs | rows of logs | MB of files | peak memory | time | nothing lost | date | version |
| ---: | ---: | ---: | ---: | ---: | --- | --- | --- |
"""


def main() -> int:
    """Make the faults and write the document; the number of those not survived."""
    parser = argparse.ArgumentParser(prog="python -m tests.reliability", description=__doc__)
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as place:
        # first and alone, for its time and memory are measured
        load = carry(Path(place), RUNS, ROWS)
    with ThreadPoolExecutor(os.cpu_count() or 1) as pool:
        found = {kind: pool.submit(_made, kind, NUMBERS[kind], options.seed) for kind in NUMBERS}
        bad = [pool.submit(inputs.known), pool.submit(_made, "damages", DAMAGES, options.seed)]
    faults = [one.result() for one in found.values()]
    answers = [one.result() for one in bad]
    DOCUMENT.write_text(_document(faults, answers, load), encoding="utf-8")
    failures = [f"{one.what}: {failure}" for one in (*faults, *answers) for failure in one.failures]
    for one in (*failures, *load.problems):
        print(one)
    return len(failures) + len(load.problems)


def _made(kind: str, number: int, seed: int) -> Tally:
    """Make faults of one kind, in a process that dies alone if it must."""
    environment = {**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    done = subprocess.run(
        [sys.executable, "-m", "tests.reliability.faults", f"{kind}={number}", "--seed", str(seed)],
        cwd=ROOT, env=environment, capture_output=True, encoding="utf-8", check=False,
    )  # fmt: skip
    try:
        told = Tally(**json.loads(done.stdout)[kind])
    except (ValueError, KeyError):
        raise RuntimeError(f"{kind} told nothing:\n{done.stderr}") from None
    print(f"{told.what}: {told.skipped or f'{told.tried - len(told.failures)} of {told.tried}'}", flush=True)
    return told


def _document(faults: Sequence[Tally], answers: Sequence[Tally], load: Load) -> str:
    user = "root" if hasattr(os, "geteuid") and os.geteuid() == 0 else "a user"
    text = _HEAD.format(
        cores=os.cpu_count(),
        machine=platform.machine(),
        system=platform.system(),
        python=platform.python_version(),
        user=user,
    )
    stamp = f"{date.today()} | {coulombook.__version__}"
    text += _FAULTS + "".join(map(_row, faults))
    text += _INPUTS + "".join(map(_row, answers))
    if FUZZED.exists():
        text += _FUZZ + "".join(_fuzzed(_rows(FUZZED)))
    if MUTATED.exists():
        text += _MUTANTS + "".join(_mutated(_rows(MUTATED)))
    text += _LOAD + (
        f"| {load.runs:,} | {load.rows:,} | {load.megabyte:,.0f} | {load.peak_megabyte:.0f} MB | {load.second:.1f} s | "
        f"{'no: ' + '; '.join(load.problems) if load.problems else 'yes'} | {stamp} |\n"
    )
    return text


def _row(told: Tally) -> str:
    survived = f"{told.tried - len(told.failures):,}"
    said = f"not tried: {told.skipped} | " if told.skipped else f"{told.tried:,} | {survived}"
    return f"| {told.what} | {said} | {date.today()} | {coulombook.__version__} |\n"


def _rows(log: Path) -> list[dict[str, str]]:
    with log.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def _fuzzed(rows: Sequence[dict[str, str]]) -> list[str]:
    """One line per target: all that was run, with the date of the last time; and their sum."""
    lines = []
    for target in (*dict.fromkeys(one["target"] for one in rows), None):
        own = [one for one in rows if target in (one["target"], None)]
        sums = " | ".join(
            f"{sum(int(one[what]) for one in own):,}" for what in ("seconds", "executions", "crashes")
        )
        lines.append(f"| {target or 'all'} | {sums} | {own[-1]['date']} | {own[-1]['version']} |\n")
    return lines


def _mutated(rows: Sequence[dict[str, str]]) -> list[str]:
    """One line per room: the newest."""
    newest = {one["room"]: one for one in rows}
    return [
        f"| {room} | {one['mutants']} | {one['tried']} | {one['killed']} | {one['score / %']} % | "
        f"{one['low / %']} to {one['high / %']} % | {one['date']} | {one['version']} |\n"
        for room, one in sorted(newest.items())
    ]


if __name__ == "__main__":
    sys.exit(min(main(), 99))
