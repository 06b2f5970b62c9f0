"""Repeats pooled: mean, sample deviation, and the scatter that stated uncertainties leave unexplained."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.uncertainty.linearised import Linearised, sparse_map, standard_uncertainty
from coulombook.uncertainty.scatter import pool

VALUES = np.array([1.0, 2.0, 3.0, 5.0])
GROUP = np.array([0, 0, 0, 1])


def test_plain_repeats_leave_all_their_scatter_unexplained() -> None:
    pooled = pool(VALUES, GROUP, 2)
    assert pooled.mean.tolist() == [2.0, 5.0]
    assert pooled.deviation[0] == pytest.approx(1.0)  # sd of 1, 2, 3
    assert np.isnan(pooled.deviation[1])
    assert pooled.unexplained.tolist() == [1.0, 0.0]
    assert pooled.residual.tolist() == [-1.0, 0.0, 1.0, 0.0]


def test_independent_uncertainty_explains_scatter_up_to_its_size() -> None:
    # u = 0.6 each explains 0.36 of the variance 1 of the first three
    independent = Linearised(VALUES, sparse_map(range(4), range(4), 0.6, (4, 4)))
    pooled = pool(independent, GROUP, 2)
    assert pooled.unexplained[0] == pytest.approx(1.0 - 0.36)
    assert standard_uncertainty(pooled.mean)[0] == pytest.approx(0.6 / 3**0.5)


def test_shared_uncertainty_explains_no_scatter() -> None:
    shared = Linearised(VALUES, sparse_map(range(4), [0] * 4, 0.6, (4, 1)))
    pooled = pool(shared, GROUP, 2)
    assert pooled.unexplained[0] == pytest.approx(1.0)
    assert standard_uncertainty(pooled.mean)[0] == pytest.approx(0.6)


def test_scatter_smaller_than_stated_is_not_taken_off() -> None:
    wide = Linearised(VALUES, sparse_map(range(4), range(4), 2.0, (4, 4)))
    assert pool(wide, GROUP, 2).unexplained[0] == 0.0
