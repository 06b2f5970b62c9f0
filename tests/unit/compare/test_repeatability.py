"""Scatter between runs: common to all, or apart where one scatters more."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from coulombook.compare.repeatability import Groups, repeatability


def _groups(runs: list[np.ndarray], explained: float, owner: list[int] | None = None) -> Groups:
    mean = np.array([one.mean() for one in runs])
    return Groups(
        np.arange(len(runs)) if owner is None else np.array(owner),
        mean,
        np.array([one.var(ddof=1) if len(one) > 1 else np.nan for one in runs]),
        (explained * mean) ** 2,
        np.array([len(one) - 1.0 for one in runs]),
        np.ones(len(runs)),
    )


def test_the_unexplained_part_comes_back_with_its_degrees_of_freedom() -> None:
    generator = np.random.default_rng(5)
    runs = [
        size * (1 + 0.03 * generator.standard_normal(3) + 0.01 * generator.standard_normal(3))
        for size in np.linspace(0.1, 0.9, 200)
    ]
    found = repeatability(_groups(runs, 0.01))
    # sqrt(1/(2 x 400)) = 3.5 % is the standard uncertainty of a deviation from 400 degrees of freedom; the stated part
    # takes (0.001/0.0009)^2 of it more
    assert found.relative[0] == pytest.approx(0.03, rel=3 * 0.035 * 1.11)
    # 0.0009^2/0.001^2 of the 400
    assert found.freedom[0] == pytest.approx(400 * 0.81, rel=0.1)


def test_scatter_that_the_uncertainties_explain_is_not_counted_again() -> None:
    # standard deviation 0.01 sqrt(2), stated 0.02
    found = repeatability(_groups([np.array([0.99, 1.01]), np.array([0.98, 1.0])], 0.02))
    assert found.relative[0] == 0.0
    assert found.deviation.tolist() == [0.0, 0.0]


def test_a_catalyst_that_scatters_more_stands_apart_and_leaves_the_others_alone() -> None:
    generator = np.random.default_rng(4)
    quiet = [0.5 * (1 + 0.01 * generator.standard_normal(3)) for _ in range(12)]
    loud = [0.5 * (1 + 0.15 * generator.standard_normal(3)) for _ in range(3)]
    found = repeatability(_groups([*quiet, *loud], 0.0, [*np.repeat(range(4), 3), 4, 4, 4]))
    assert found.estimate[12:].tolist() == [1, 1, 1]
    # one of twelve groups is set apart by chance now and then
    assert (found.estimate[:12] == 0).sum() >= 11
    assert found.relative[0] == pytest.approx(0.01, rel=0.35)
    # 24 and 6 degrees of freedom: three standard uncertainties of a deviation are 3/sqrt(2 x 6) = 87 %
    assert found.relative[1] == pytest.approx(0.15, rel=0.87)


def test_setting_apart_is_cochrans_test() -> None:
    # largest of k = 8 variances of three runs each, on either side of its critical value at 5 %,
    # C = 1/(1 + (k - 1)/F), F the upper quantile at 0.05/k with 2 and 14 degrees of freedom
    f = stats.f.ppf(1 - 0.05 / 8, 2, 14)
    for factor, apart in ((0.99, 0), (1.01, 1)):
        variance = np.ones(8)
        variance[3] = f * factor
        groups = Groups(np.arange(8), np.ones(8), variance, np.zeros(8), np.full(8, 2.0), np.ones(8))
        assert (repeatability(groups).estimate > 0).sum() == apart


def test_of_two_catalysts_each_scatters_by_itself_and_those_without_replicates_as_the_louder() -> None:
    mean, variance = np.array([0.5, 0.4, 0.3, 0.0]), np.array([1e-4, 16e-4, np.nan, 0.0])
    groups = Groups(np.arange(4), mean, variance, np.zeros(4), np.array([2.0, 1.0, 0.0, 1.0]), np.ones(4))
    found = repeatability(groups)
    # 0.01/0.5 = 2 %, 0.04/0.4 = 10 %; a mean of nothing tells nothing of how far runs scatter
    assert found.relative[found.estimate] == pytest.approx([0.02, 0.1, 0.1, 0.1])
    assert found.freedom[found.estimate][:2] == pytest.approx([2.0, 1.0])
    # neither is told to scatter more than others do
    assert not found.apart.any()


def test_a_group_of_nothing_is_left_where_it_is() -> None:
    groups = Groups(
        np.arange(4),
        np.array([0.0, 0.5, 0.4, 0.5]),
        np.array([0.0, 1e-4, 1e-4, 1e-4]),
        np.zeros(4),
        np.ones(4),
        np.ones(4),
    )
    found = repeatability(groups)
    assert found.deviation[0] == 0.0
    assert found.relative[0] == pytest.approx(np.sqrt((2e-4 / 0.25 + 1e-4 / 0.16) / 3))


def test_single_runs_alone_tell_nothing_of_scatter() -> None:
    found = repeatability(_groups([np.array([0.5]), np.array([0.4])], 0.01))
    assert found.relative.tolist() == [0.0]
    assert np.isinf(found.freedom[0])


def test_a_product_that_a_catalyst_does_not_make_says_nothing_of_how_others_scatter() -> None:
    generator = np.random.default_rng(2)
    apart = 0
    for _ in range(300):
        runs = [0.5 * (1 + 0.03 * generator.standard_normal(3)) for _ in range(4)]
        groups = _groups([*runs, *[np.zeros(3)] * 4], 0.0)
        apart += repeatability(groups).apart.any()
    # the test is one at 5 %: 15 of 300, and three standard deviations of that count
    assert apart <= 15 + 3 * 3.8
