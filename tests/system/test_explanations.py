"""An open balance is explained by its true cause, and a clean day is not accused.

A small part of the simulation behind docs/explanations.md; `python -m tests.benchmarks.causes` runs all of it.
"""

from __future__ import annotations

import numpy as np
import pytest
from tests.benchmarks.causes import example, simulate

from coulombook.balance.causes import Cause, candidate_causes
from coulombook.balance.explain import explain, rank
from coulombook.balance.settle import Settled

DAYS = 40


@pytest.fixture(scope="module")
def settled() -> Settled:
    return example()


@pytest.fixture(scope="module")
def causes(settled: Settled) -> list[Cause]:
    return candidate_causes(settled)


def test_a_day_without_a_cause_is_rarely_accused(settled: Settled, causes: list[Cause]) -> None:
    days = simulate(settled, causes, None, 0.0, 2 * DAYS, 11)
    # 5 % at most; of 80 days more than 9 would be accused in one test run of a hundred at exactly 5 %
    assert sum(one.accused for one in days) <= 9


@pytest.mark.parametrize("kind", ["outlet-flow", "gas-response", "internal-standard", "unmeasured-product"])
def test_a_cause_of_ten_per_cent_is_found_with_its_size(
    settled: Settled, causes: list[Cause], kind: str
) -> None:
    truth = next(cause for cause in causes if cause.kind == kind)
    days = simulate(settled, causes, truth, 0.10, DAYS, 12)
    if kind != "internal-standard":
        # the liquid products of this day are too small a share for a standard 10 % off to open every balance
        assert sum(one.found for one in days) >= 0.9 * DAYS
    # 95 % within 2 u; fewer than 34 of 40 in one test run of a hundred
    assert sum(abs(one.estimate - 0.10) <= 2 * one.u for one in days) >= 34


def test_the_leaking_run_of_the_example_is_named(settled: Settled) -> None:
    found = explain(settled)
    best = found.ranked[0]
    # the invented day was drawn with a leak in run m2-4
    assert (best.cause, best.where) == ("gas-lost", "m2-4")
    assert not found.closes


def test_causes_of_the_same_pattern_cannot_be_told_apart() -> None:
    pattern = np.array([[0.9], [0.8], [0.5], [0.6]])
    one = Cause("outlet-flow", "", pattern, False, "measure the outlet flow")
    other = Cause("gas-response", "FID", pattern, False, "inject check gas")
    found = rank(0.2 * pattern[:, 0], np.eye(4) * 1e-4, [one, other])
    assert found.ranked[0].apart == ("gas-response (FID)",)
    assert found.ranked[0].estimate == pytest.approx(0.2)


def test_lost_gas_does_not_explain_a_total_above_one() -> None:
    lost = Cause("gas-lost", "", -np.array([[0.9], [0.8], [0.7]]), True, "test for leaks")
    found = rank(np.array([0.09, 0.08, 0.07]), np.eye(3) * 1e-4, [lost])
    assert found.closes
    assert found.ranked[0].cause == "none"


def test_no_runs_need_no_explanation() -> None:
    assert rank(np.zeros(0), np.zeros((0, 0)), []).closes
