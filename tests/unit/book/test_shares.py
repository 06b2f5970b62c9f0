"""Budgets put together over runs."""

from __future__ import annotations

import pytest

from coulombook.book import Cell, Table
from coulombook.book.shares import largest, outputs_of, runs_of, source_shares


def entry(run: str, output: str, source: str, u: float, share: float) -> dict[str, Cell]:
    return {"run": run, "output": output, "source": source, "shared": "day", "u / %": u, "share / %": share}


BUDGET = Table.of(
    "budget",
    [
        entry("a1", "ethylene", "outlet flow", 0.3, 90.0),
        entry("a1", "ethylene", "peak area", 0.1, 10.0),
        entry("a1", "total FE", "outlet flow", 1.0, 100.0),
        entry("a2", "total FE", "outlet flow", 1.0, 40.0),
        entry("a2", "total FE", "integral", 1.2, 60.0),
    ],
)


def test_shares_of_a_run_stand_with_their_uncertainty_largest_first() -> None:
    runs, shares = source_shares(BUDGET, "total FE", "a2")
    assert runs == 1
    assert [(one.source, one.share, one.u) for one in shares] == [
        ("integral", 0.6, 1.2),
        ("outlet flow", 0.4, 1.0),
    ]


def test_a_source_that_a_run_lacks_counts_as_nothing_in_the_mean() -> None:
    runs, shares = source_shares(BUDGET, "total FE")
    assert runs == 2
    # (100 + 40)/2 and (0 + 60)/2
    assert {one.source: one.share for one in shares} == pytest.approx({"outlet flow": 0.7, "integral": 0.3})
    assert {one.u for one in shares} == {None}


def test_runs_without_the_output_do_not_count() -> None:
    runs, shares = source_shares(BUDGET, "ethylene")
    assert runs == 1
    assert sum(one.share for one in shares) == pytest.approx(1.0)


def test_runs_and_outputs_are_listed_in_order() -> None:
    assert runs_of(BUDGET) == ("a1", "a2")
    assert outputs_of(BUDGET) == ("ethylene", "total FE")
    assert outputs_of(BUDGET, "a2") == ("total FE",)


def test_small_shares_are_parted_from_large_ones() -> None:
    _, shares = source_shares(BUDGET, "ethylene")
    shown, rest = largest(shares, 0.5)
    assert ([one.source for one in shown], [one.source for one in rest]) == (["outlet flow"], ["peak area"])
