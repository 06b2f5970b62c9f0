"""Budgets: errors of one source add in quadrature, and the sources make up the whole variance."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.uncertainty.budget import budget
from coulombook.uncertainty.errors import Source
from coulombook.uncertainty.linearised import Linearised, sparse_map, standard_uncertainty

FLOW, AREA = Source("outlet flow", "day"), Source("peak area", "reading")


def test_columns_of_one_source_are_summed_in_quadrature() -> None:
    # one error of the flow, two of peak areas
    x = Linearised(np.array([1.0]), sparse_map([0, 0, 0], [0, 1, 2], [0.12, 0.03, 0.04], (1, 3)))
    found = budget(x, [FLOW, AREA, AREA])
    assert found.sources == (FLOW, AREA)
    assert found.u[0] == pytest.approx([0.12, 0.05])
    # 0.12^2 + 0.05^2 = 0.13^2
    assert found.share[0] == pytest.approx([0.12**2 / 0.13**2, 0.05**2 / 0.13**2])


def test_contributions_make_up_the_standard_uncertainty() -> None:
    rng = np.random.default_rng(3)
    x = Linearised(np.ones(5), sparse_map(*np.indices((5, 8)).reshape(2, -1), rng.normal(size=40), (5, 8)))
    found = budget(x, [FLOW, AREA] * 4)
    np.testing.assert_allclose(np.sqrt((found.u**2).sum(axis=1)), standard_uncertainty(x), rtol=1e-12)
    np.testing.assert_allclose(found.share.sum(axis=1), 1.0, rtol=1e-12)


def test_entries_of_one_error_add_up_before_they_are_squared() -> None:
    # 3 - 3 of the same error is no error at all
    x = Linearised(np.array([1.0]), sparse_map([0, 0], [0, 0], [3.0, -3.0], (1, 1)))
    assert budget(x, [FLOW]).u.tolist() == [[0.0]]
    assert budget(x, [FLOW]).share.tolist() == [[0.0]]


def test_plain_numbers_have_an_empty_budget() -> None:
    found = budget(np.array([1.0, 2.0]), [FLOW, AREA])
    assert found.u.tolist() == [[0.0, 0.0], [0.0, 0.0]]
