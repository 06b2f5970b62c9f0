"""Days under one another: what they share is one error."""

from __future__ import annotations

import numpy as np
import pytest
from tests.unit.compare.compared_runs import numbers

from coulombook.compare.stacking import share_errors, stack
from coulombook.uncertainty.linearised import Linearised, covariance, standard_uncertainty


def test_days_are_independent_but_for_the_errors_known_by_the_same_key() -> None:
    day = numbers([0.5, 0.4], own=0.01, shared=0.1)  # errors: own, own, shared
    apart = stack([day, day], share_errors([[None, None, None]] * 2))
    shared = stack([day, day], share_errors([[None, None, "curve"]] * 2))
    assert (apart.jacobian.shape[1], shared.jacobian.shape[1]) == (6, 5)
    assert covariance(apart)[0, 2] == 0.0
    # the same run of both days: 0.5 x 0.5 x 0.1^2
    assert covariance(shared)[0, 2] == pytest.approx(0.0025)
    assert standard_uncertainty(shared)[:2] == pytest.approx(standard_uncertainty(day))


def test_several_errors_of_one_curve_are_matched_in_their_order() -> None:
    found = share_errors([["a", "a", None], [None, "a", "a"]])
    assert found.count == 4
    assert found.columns[0].tolist() == [0, 1, 2]
    assert found.columns[1].tolist() == [3, 0, 1]


def test_a_day_without_uncertainties_stands_beside_one_that_has_some() -> None:
    found = stack([np.array([1.0]), numbers([2.0], own=0.1)], share_errors([[], [None, None]]))
    assert isinstance(found, Linearised)
    assert found.value.tolist() == [1.0, 2.0]
    assert standard_uncertainty(found) == pytest.approx([0.0, 0.2])
