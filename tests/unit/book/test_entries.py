"""Cells of the summary that say nothing where nothing is known."""

from __future__ import annotations

from pathlib import Path

from tests.faults.day import swap, write_day

import coulombook


def test_a_sum_of_nothing_has_no_uncertainty(tmp_path: Path) -> None:
    # the peaks of ethylene, the one product of two carbons, taken out
    day = write_day(
        tmp_path,
        {"gas.csv": lambda text: "\n".join(one for one in text.splitlines() if "C2H4" not in one) + "\n"},
    )
    for row in coulombook.tally(day).tables["summary"].records():
        assert (row["C2+ FE / %"], row["u(C2+ FE) / %"]) == (0.0, None)
        assert (row["C2+/C1"], row["u(C2+/C1)"]) == (0.0, None)
        assert isinstance(row["u(total FE) / %"], float)


def test_a_sum_of_something_has_one(tmp_path: Path) -> None:
    day = write_day(tmp_path, {"gas.csv": swap("a1,1,1800,FID,C2H4,23\n", "a1,1,1800,FID,C2H4,23.5\n")})
    for row in coulombook.tally(day).tables["summary"].records():
        u = row["u(C2+ FE) / %"]
        assert isinstance(u, float)
        assert u > 0
