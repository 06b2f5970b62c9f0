"""Catalysts compared at one level: intervals, shared errors, and how often equal catalysts are told apart."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.compare.pairs import contest
from coulombook.uncertainty.linearised import Linearised, sparse_map


def _runs(values: list[float], own: float, shared: float) -> Linearised:
    """Runs with a relative error of their own each, and one that all share."""
    n = len(values)
    rows = [*range(n), *range(n)]
    sizes = [*(own * value for value in values), *(shared * value for value in values)]
    return Linearised(np.array(values), sparse_map(rows, [*range(n), *[n] * n], sizes, (n, n + 1)))


def test_the_interval_of_a_ratio_does_not_grow_with_the_error_both_share() -> None:
    names = ["a", "a", "b", "b"]
    narrow = contest(_runs([0.60, 0.601, 0.30, 0.3005], 0.01, 0.0), names).pairs[0]
    wide = contest(_runs([0.60, 0.601, 0.30, 0.3005], 0.01, 0.2), names).pairs[0]
    assert narrow.ratio == pytest.approx(2.0)
    assert wide.ratio_low == pytest.approx(narrow.ratio_low, rel=1e-12)
    assert wide.ratio_high == pytest.approx(narrow.ratio_high, rel=1e-12)
    assert wide.u > narrow.u  # the difference scales with the flow, the ratio does not


def test_a_difference_without_scatter_beyond_the_stated_is_normal() -> None:
    # means 0.6 and 0.3, u of each run 0.01: u of the difference sqrt(4 x 0.01^2 / 4) = 0.01, quantile 1.96
    x = Linearised(np.array([0.6, 0.6, 0.3, 0.3]), sparse_map(range(4), range(4), 0.01, (4, 4)))
    pair = contest(x, ["a", "a", "b", "b"]).pairs[0]
    assert pair.difference == pytest.approx(0.3)
    assert pair.u == pytest.approx(0.01)
    assert pair.high - pair.difference == pytest.approx(1.959964 * 0.01, rel=1e-6)


def test_undeclared_scatter_enters_with_its_degrees_of_freedom() -> None:
    # no stated uncertainty: s^2 = (0.02 + 0.02)/2 = 0.02 with 2 degrees of freedom, u = sqrt(0.02 (1/2 + 1/2))
    pair = contest(np.array([1.1, 0.9, 2.1, 1.9]), ["a", "a", "b", "b"]).pairs[0]
    assert (pair.one, pair.other) == ("b", "a")
    assert pair.u == pytest.approx(0.02**0.5)
    assert pair.degrees_of_freedom == pytest.approx(2.0)


def test_the_best_and_those_it_cannot_be_told_from_are_named() -> None:
    x = Linearised(np.array([0.60, 0.59, 0.30]), sparse_map(range(3), range(3), 0.01, (3, 3)))
    found = contest(x, ["a", "b", "c"])
    assert found.catalysts == ("a", "b", "c")
    assert found.tied_with_best(0.05) == ("b",)


@pytest.mark.parametrize("undeclared", [0.0, 0.02])
def test_intervals_cover_and_equal_catalysts_are_rarely_told_apart(undeclared: float) -> None:
    generator = np.random.default_rng(7)
    names = [name for name in "abcd" for _ in range(3)]
    truth = np.full(12, 0.5)
    own, shared, days = 0.01, 0.03, 200
    covered = pairs = false = 0
    for _ in range(days):
        run = own * truth * generator.standard_normal(12) + undeclared * generator.standard_normal(12)
        values = (truth + run) * (1 + shared * generator.standard_normal())
        found = contest(_runs(values.tolist(), own, shared), names)
        covered += sum(pair.low <= 0.0 <= pair.high for pair in found.pairs)
        pairs += len(found.pairs)
        false += any(pair.p_adjusted < 0.05 for pair in found.pairs)
    # pairs of a day share runs: 200 days of six pairs know the coverage to about 0.9 %
    assert 0.93 <= covered / pairs <= 0.97
    # at most 5 % of days; 1.5 % is the standard deviation of that count
    assert false / days <= 0.05 + 2 * 0.015
