"""Fuzz one target, or all in turn: `python -m tests.fuzz tables --seconds 600`.

Needs the package `atheris` (coverage-guided fuzzing by libFuzzer), which is not among the test packages because it is
not built for every system. An input that breaks a target is kept in tests/fuzz/finds, where the tests find it. What
was run is added to tests/fuzz/log.csv.
"""

from __future__ import annotations

import argparse
import csv
import hashlib
import re
import subprocess
import sys
import tempfile
from datetime import date
from pathlib import Path

import coulombook

HERE = Path(__file__).resolve().parent
LOG = HERE / "log.csv"
HEADS = ("date", "version", "target", "seconds", "executions", "crashes")


def main() -> int:
    """Run the targets asked for; the number of those that broke."""
    parser = argparse.ArgumentParser(prog="python -m tests.fuzz", description=__doc__)
    parser.add_argument("target", nargs="*", help="targets; none: all of them")
    parser.add_argument("--seconds", type=int, default=60, help="for each target (default: 60)")
    parser.add_argument("--inside", help=argparse.SUPPRESS)
    options = parser.parse_args()
    if options.inside:
        return _fuzz(options.target[0], options.inside, options.seconds)
    from tests.fuzz.targets import TARGETS

    broken = 0
    for name in options.target or list(TARGETS):
        executions, crashes = _run(name, options.seconds)
        broken += crashes > 0
        print(f"{name}: {executions} executions in {options.seconds} s, {crashes} crashes", flush=True)
        _write_down(name, options.seconds, executions, crashes)
    return broken


def _run(name: str, seconds: int) -> tuple[int, int]:
    """Executions and crashes of one target; after a crash it goes on for the time that is left."""
    from tests.fuzz.targets import seeds

    executions = crashes = 0
    with tempfile.TemporaryDirectory() as place:
        corpus = Path(place)
        for number, one in enumerate(seeds(name)):
            (corpus / f"seed{number}").write_bytes(one)
        left = seconds
        while left > 0:
            done = subprocess.run(
                [sys.executable, "-m", "tests.fuzz", name, "--seconds", str(left), "--inside", place],
                cwd=HERE.parents[1], capture_output=True, encoding="utf-8", errors="replace", check=False,
            )  # fmt: skip
            told = [int(one) for one in re.findall(r"^#(\d+)", done.stderr, re.MULTILINE)]
            executions += max(told, default=0)
            spent = re.search(r"Done \d+ runs in (\d+) second", done.stderr)
            if spent:
                break
            crashes += 1
            _keep(name, corpus, done.stderr)
            took = re.findall(r"stat::elapsed_seconds: (\d+)", done.stderr)
            left -= max(int(took[-1]) if took else 0, 30)
    return executions, crashes


def _keep(name: str, corpus: Path, said: str) -> None:
    for path in corpus.glob("crash-*"):
        data = path.read_bytes()
        target = HERE / "finds" / name
        target.mkdir(parents=True, exist_ok=True)
        (target / hashlib.sha256(data).hexdigest()[:16]).write_bytes(data)
        path.unlink()
    print(said[-3000:], file=sys.stderr, flush=True)


def _write_down(name: str, seconds: int, executions: int, crashes: int) -> None:
    fresh = not LOG.exists()
    with open(LOG, "a", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        if fresh:
            writer.writerow(HEADS)
        writer.writerow([date.today(), coulombook.__version__, name, seconds, executions, crashes])


def _fuzz(name: str, corpus: str, seconds: int) -> int:
    import atheris

    with atheris.instrument_imports(include=["coulombook"]):
        from tests.fuzz.targets import TARGETS
    dictionary = HERE / "words.txt"
    atheris.Setup(
        [
            "fuzz", corpus, f"-max_total_time={seconds}", "-max_len=8192", "-timeout=20", "-rss_limit_mb=4096",
            f"-artifact_prefix={corpus}/", f"-dict={dictionary}", "-print_final_stats=1", "-verbosity=1",
        ],
        TARGETS[name],
    )  # fmt: skip
    atheris.Fuzz()
    return 0


if __name__ == "__main__":
    sys.exit(main())
