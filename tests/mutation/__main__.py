"""Change the core at random, one small change at a time, and count the changes that a test notices.

    python -m tests.mutation --sample 60 --seed 1

Mutants are made by the package `cosmic-ray` (development only) in a copy of the project; of all that could be made of a
room a random sample is tried. A mutant is killed when the room's own tests fail, or take ten times as long as they did
without it; how many were killed by the clock alone is told. The score is given with its 95 % interval (Wilson, J. Am.
Stat. Assoc. 22 (1927) 209). Survivors are listed, for each is a check that is missing or a change that changes nothing.
The result is added to tests/mutation/log.csv.
"""

from __future__ import annotations

import argparse
import csv
import math
import os
import random
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import coulombook

ROOT = Path(__file__).resolve().parents[2]
LOG = Path(__file__).resolve().parent / "log.csv"
_LONGEST_SECOND = 3600.0  # for the tests without a change
HEADS = ("date", "version", "room", "mutants", "tried", "killed", "score / %", "low / %", "high / %")

# the tests that answer for a room, quick ones first: the first that fails ends the trial
TESTS = {
    "uncertainty": """
        tests/unit/uncertainty tests/unit/test_frozen.py tests/published/test_propagation.py
        tests/published/test_reconciliation.py tests/system/test_miniature_day.py
        tests/system/test_miniature_judgements.py tests/system/test_draws_agree.py
    """,
    "curves": """
        tests/unit/curves tests/unit/test_frozen.py tests/published/test_calibration_textbook.py
        tests/published/test_errors_in_both.py tests/published/test_inverse_of_a_line.py
        tests/published/test_limits_of_a_line.py tests/published/test_linearity.py
        tests/published/test_nist_strd.py tests/published/test_nmr.py tests/published/test_carbon_number.py
        tests/properties/test_curves.py
    """,
    "cell": """
        tests/unit/cell tests/unit/test_frozen.py tests/published/test_double_layer.py
        tests/published/test_carbonate_ph.py tests/published/test_reference_electrodes.py
        tests/published/test_flow_to_current.py tests/system/test_miniature_day.py
        tests/system/test_surface.py
    """,
    "amounts": """
        tests/unit/amounts tests/unit/test_frozen.py tests/published/test_water_vapour.py
        tests/published/test_flow_to_current.py tests/system/test_miniature_day.py
        tests/system/test_truth_returns.py
    """,
    "balance": """
        tests/system/test_miniature_day.py tests/unit/balance/test_explain.py tests/unit/balance/test_assumed.py
        tests/system/test_miniature_judgements.py tests/system/test_review.py tests/system/test_curves_in_a_day.py
        tests/unit/balance/test_draws.py tests/unit/balance/test_trace_picture.py tests/unit/balance/test_told.py
        tests/unit/test_frozen.py tests/system/test_surface.py tests/system/test_truth_returns.py
        tests/properties/test_whole_days.py tests/unit/balance/test_sources.py tests/faults/test_gas.py
        tests/faults/test_liquid.py tests/faults/test_scans.py
    """,
}


@dataclass(frozen=True, slots=True)
class Score:
    """Mutants of a room: how many there are, were tried, were killed, took too long; and those that lived."""

    room: str
    mutants: int
    tried: int
    killed: int
    by_clock: int
    survivors: tuple[str, ...]

    def interval(self) -> tuple[float, float]:
        """Of the share that would be killed of all, at 95 %."""
        n, share, z = self.tried, self.killed / self.tried, 1.959964
        middle = (share + z * z / (2 * n)) / (1 + z * z / n)
        half = z / (1 + z * z / n) * math.sqrt(share * (1 - share) / n + z * z / (4 * n * n))
        return middle - half, min(middle + half, 1.0)


def main() -> int:
    """Try a sample of each room asked for."""
    parser = argparse.ArgumentParser(prog="python -m tests.mutation", description=__doc__)
    parser.add_argument("room", nargs="*", help=f"of {', '.join(TESTS)}; none: all of them")
    parser.add_argument("--sample", type=int, default=60, help="mutants tried of each room (default: 60)")
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    for room in options.room or list(TESTS):
        score = try_room(room, options.sample, options.seed)
        low, high = score.interval()
        print(
            f"{room}: {score.killed} of {score.tried} killed, {100 * score.killed / score.tried:.0f} % "
            f"({100 * low:.0f} to {100 * high:.0f} %) of {score.mutants} mutants; {score.by_clock} by the clock",
            flush=True,
        )
        for one in score.survivors:
            print(one, flush=True)
        _write_down(score)
    return 0


def try_room(room: str, sample: int, seed: int) -> Score:
    """Make the mutants of a room in a copy of the project, and try a sample of them."""
    with tempfile.TemporaryDirectory() as place:
        copy = Path(place) / "project"
        shutil.copytree(
            ROOT,
            copy,
            ignore=shutil.ignore_patterns(".git", "results", "__pycache__", ".*_cache", ".hypothesis"),
        )
        settings = copy / "mutation.toml"
        settings.write_text(_settings(room, _LONGEST_SECOND), encoding="utf-8")
        session = copy / "mutation.sqlite"
        _cosmic_ray(copy, "init", "mutation.toml", session.name)
        started = time.monotonic()
        # without a change the tests must pass, or nothing is told
        _cosmic_ray(copy, "baseline", "mutation.toml")
        settings.write_text(_settings(room, 10.0 * (time.monotonic() - started)), encoding="utf-8")
        mutants = _keep_sample(session, sample, seed)
        _cosmic_ray(copy, "exec", "mutation.toml", session.name)
        return _score(room, session, mutants)


def _settings(room: str, timeout_second: float) -> str:
    # the tests of the copy find the copy: its path comes before that of the installed package
    command = (
        f"{sys.executable} -m pytest -x -q -n 0 -p no:cacheprovider -n 0 {' '.join(TESTS[room].split())}"
    )
    return f"""\
[cosmic-ray]
module-path = "src/coulombook/{room}"
timeout = {timeout_second:.1f}
excluded-modules = ["src/coulombook/{room}/__init__.py"]
test-command = "{command}"

[cosmic-ray.distributor]
name = "local"
"""


def _cosmic_ray(copy: Path, *arguments: str) -> None:
    environment = {**os.environ, "PYTHONPATH": f"{copy / 'src'}{os.pathsep}{copy}", "OMP_NUM_THREADS": "1"}
    found = subprocess.run(
        [str(Path(sys.executable).with_name("cosmic-ray")), *arguments],
        cwd=copy, env=environment, check=False, capture_output=True, text=True,
    )  # fmt: skip
    if found.returncode:
        raise SystemExit(f"cosmic-ray {arguments[0]} failed:\n{found.stdout[-4000:]}{found.stderr[-2000:]}")


def _keep_sample(session: Path, sample: int, seed: int) -> int:
    """Leave a random sample of the mutants in the session; the number there was."""
    with sqlite3.connect(session) as connection:
        # the names of jobs are drawn anew each time; their places are not
        ordered = "module_path, start_pos_row, start_pos_col, operator_name, occurrence"
        jobs = [job for (job,) in connection.execute(f"SELECT job_id FROM mutation_specs ORDER BY {ordered}")]
        # a bar between types is gone when the code runs (annotations are not evaluated), and changes nothing
        idle = {
            job
            for (job,) in connection.execute(
                "SELECT job_id FROM mutation_specs WHERE operator_name LIKE '%BitOr_%'"
            )
        }
        jobs = [job for job in jobs if job not in idle]
        dropped = idle | set(jobs) - set(random.Random(seed).sample(jobs, min(sample, len(jobs))))
        for table in ("mutation_specs", "work_items"):
            connection.executemany(f"DELETE FROM {table} WHERE job_id = ?", [(job,) for job in dropped])
    return len(jobs)


def _score(room: str, session: Path, mutants: int) -> Score:
    with sqlite3.connect(session) as connection:
        results = connection.execute(
            "SELECT r.test_outcome, m.module_path, m.start_pos_row, m.operator_name, r.diff, r.output "
            "FROM work_results r JOIN mutation_specs m ON m.job_id = r.job_id"
        ).fetchall()
    # a trial that was broken off says nothing
    results = [one for one in results if any(word in str(one[0]).upper() for word in ("SURVIVED", "KILLED"))]
    late = sum(str(one[5]).strip() == "timeout" for one in results)
    lived = [one for one in results if "SURVIVED" in str(one[0]).upper()]
    told = tuple(f"  {path}:{row} {operator}\n{_changed(diff)}" for _, path, row, operator, diff, _ in lived)
    return Score(room, mutants, len(results), len(results) - len(lived), late, told)


def _changed(diff: str) -> str:
    lines = [line for line in diff.splitlines() if line[:1] in "+-" and line[:3] not in ("+++", "---")]
    return "\n".join(f"    {line}" for line in lines)


def _write_down(score: Score) -> None:
    fresh = not LOG.exists()
    low, high = score.interval()
    share = score.killed / score.tried
    with open(LOG, "a", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        if fresh:
            writer.writerow(HEADS)
        writer.writerow(
            [date.today(), coulombook.__version__, score.room, score.mutants, score.tried, score.killed,
             *(f"{100 * one:.1f}" for one in (share, low, high))]
        )  # fmt: skip


if __name__ == "__main__":
    sys.exit(main())
