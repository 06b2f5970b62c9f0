"""Weights of calibration points."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.fit import fit_curve
from coulombook.curves.weights import ENOUGH_REPLICATES, point_weights, replicate_variance

LEVELS = np.array([0.0, 1.0, 3.0, 10.0, 30.0])


def _replicates(count: int, seed: int, additive: float, relative: float) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    x = np.repeat(LEVELS, count)
    return x, 5.0 * x + rng.standard_normal(x.size) * np.hypot(additive, relative * 5.0 * x)


def test_many_replicates_weigh_by_the_variance_of_their_own_level() -> None:
    x, y = _replicates(ENOUGH_REPLICATES, 60, 0.2, 0.05)
    expected = [np.var(y[x == level], ddof=1) for level in x]
    np.testing.assert_allclose(replicate_variance(x, y), expected, rtol=1e-12)
    weights = point_weights(x, y, "replicates")
    np.testing.assert_allclose(
        weights, (1.0 / np.array(expected)) / np.mean(1.0 / np.array(expected)), rtol=1e-12
    )


def test_few_replicates_share_one_variance_function() -> None:
    x, y = _replicates(3, 61, 0.2, 0.05)
    variance = replicate_variance(x, y)
    mean = np.array([y[x == level].mean() for level in x])
    # c0 + c1 mean^2 through any two levels predicts the others
    c1 = (variance[-1] - variance[0]) / (mean[-1] ** 2 - mean[0] ** 2)
    np.testing.assert_allclose(variance, variance[0] + c1 * (mean**2 - mean[0] ** 2), rtol=1e-9)
    assert (variance > 0.0).all()


def test_variance_function_finds_the_scatter_it_was_drawn_from() -> None:
    found = []
    for seed in range(200):
        x, y = _replicates(4, 1000 + seed, 0.2, 0.05)
        found.append(replicate_variance(x, y)[x == 30.0][0])
    # truth 0.04 + (0.05 x 150)^2 = 56.3 at the top; the median of a variance with 3 degrees of freedom alone would lie
    # at 79 % of it, a little more with what the other levels add
    assert 0.6 * 56.3 < np.median(found) < 1.1 * 56.3


def test_weights_from_few_replicates_do_not_spoil_the_slope() -> None:
    # weighting with single variances of three replicates would make the slope scatter more, not less, than it must
    slopes, single, known = [], [], []
    for seed in range(200):
        x, y = _replicates(3, 5000 + seed, 0.2, 0.05)
        slopes.append(fit_curve(x, y, "line", "replicates").coefficients[1])
        raw = np.array([np.var(y[x == level], ddof=1) for level in x])
        true = 0.2**2 + (0.05 * 5.0 * x) ** 2
        for weights, kept in ((1.0 / raw, single), (1.0 / true, known)):
            kept.append(np.polyfit(x, y, 1, w=np.sqrt(weights))[0])
    # within a third of the best that known weights could do, and better than single variances
    assert np.std(slopes) < 1.33 * np.std(known)
    assert np.std(slopes) < 0.9 * np.std(single)


def test_levels_without_replicates_get_the_variance_function_too() -> None:
    x = np.array([1.0, 1.0, 10.0, 10.0, 5.0])
    y = np.array([0.99, 1.01, 9.9, 10.1, 5.0])
    variance = replicate_variance(x, y)
    # the variances, 2e-4 and 2e-2, are exactly proportional to y^2: 2e-4 y^2, so 5e-3 at y = 5
    assert variance[4] == pytest.approx(2e-4 * 25.0, rel=1e-9)


def test_one_replicated_level_tells_no_slope_of_the_variance() -> None:
    x = np.array([1.0, 2.0, 3.0, 3.0])
    y = np.array([1.0, 2.0, 2.9, 3.1])
    np.testing.assert_allclose(replicate_variance(x, y), np.full(4, 0.02), rtol=1e-9)


def test_identical_replicates_at_one_level_do_not_get_infinite_weight() -> None:
    x = np.array([1.0, 1.0, 5.0, 5.0, 10.0, 10.0])
    y = np.array([1.0, 1.0, 4.9, 5.1, 9.8, 10.2])
    weights = point_weights(x, y, "replicates")
    assert np.isfinite(weights).all()
    assert (weights > 0.0).all()


def test_equal_weights_are_ones() -> None:
    assert point_weights(LEVELS, LEVELS, "equal").tolist() == [1.0] * 5
