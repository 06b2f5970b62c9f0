"""Groups of replicates that leave nothing to test."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.compare.statistics import one_way


def test_groups_that_are_all_the_same_do_not_differ() -> None:
    # a product that no catalyst makes: nothing between groups and nothing within
    found = one_way([np.zeros(3), np.zeros(2), np.zeros(2)])
    assert (found.f, found.p) == (0.0, pytest.approx(1.0))
    assert math.isnan(found.r_squared)


def test_groups_without_scatter_that_differ_do_so_without_doubt() -> None:
    found = one_way([np.zeros(3), np.ones(2)])
    assert (found.f, found.p) == (math.inf, 0.0)
    assert found.r_squared == 1.0
