"""A machine that fails while a day is tallied: results are whole or absent, inputs as they were, the answer is clear.

The faults are made in forks of one process (tests/reliability); `python -m tests.reliability` makes many more of them.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).parents[2]
NUMBERS = {
    "moments": 6,
    "calls": 12,
    "gone": 8,
    "flicker": 10,
    "looked-at": 10,
    "room": 5,
    "full": 5,
    "limited": 4,
    "read-only": 1,
    "forbidden": 1,
    "at-once": 2,
    "without-locks": 2,
    "held": 2,
    "open": 3,
}

pytestmark = pytest.mark.skipif(not hasattr(os, "fork"), reason="needs processes that fork")


@pytest.fixture(scope="module")
def told() -> dict[str, dict[str, Any]]:
    """What became of every kind of fault."""
    asked = [f"{kind}={number}" for kind, number in NUMBERS.items()]
    environment = {**os.environ, "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    done = subprocess.run(
        [sys.executable, "-m", "tests.reliability.faults", *asked],
        cwd=ROOT, env=environment, capture_output=True, encoding="utf-8", check=False,
    )  # fmt: skip
    assert done.stdout.startswith("{"), done.stderr
    found: dict[str, dict[str, Any]] = json.loads(done.stdout)
    return found


@pytest.mark.parametrize("kind", NUMBERS)
def test_results_are_whole_or_absent_and_inputs_as_they_were(
    kind: str, told: dict[str, dict[str, Any]]
) -> None:
    one = told[kind]
    if one["skipped"]:
        pytest.skip(one["skipped"])
    assert one["tried"] >= NUMBERS[kind]
    assert one["failures"] == []


def test_the_document_tells_of_every_kind_of_fault_and_of_nothing_lost(
    told: dict[str, dict[str, Any]],
) -> None:
    document = (ROOT / "docs" / "reliability.md").read_text(encoding="utf-8")
    rows = [
        [cell.strip() for cell in line.strip("| ").split("|")]
        for line in document.splitlines()
        if line[:1] == "|"
    ]
    for kind, one in told.items():
        (row,) = (row for row in rows if row[0] == one["what"])
        assert row[1] == row[2], kind
        assert int(row[1].replace(",", "")) >= NUMBERS[kind]
