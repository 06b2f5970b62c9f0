"""Carbon efficiency and the bound of carbonate, against figures worked by hand."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.amounts.carbon import carbon_efficiency, carbonate_bound
from coulombook.uncertainty.linearised import Linearised, nominal, sparse_map, standard_uncertainty


def test_carbon_efficiency_counts_the_carbon_of_the_product() -> None:
    # 3 umol of ethylene hold 6 umol of CO2: of 1200 umol fed that is 0.5 %
    assert carbon_efficiency(np.array([3e-6]), np.array([2.0]), np.array([1.2e-3])) == pytest.approx([0.005])


def test_carbonate_takes_at_most_one_dioxide_for_two_electrons() -> None:
    # 96485.33212 A make a mole of OH- a second, enough for half a mole of CO2 a second: half of what is fed
    assert carbonate_bound(np.array([96485.33212]), np.array([1.0])) == pytest.approx([0.5], rel=1e-9)


def test_bound_above_one_is_returned_as_it_is() -> None:
    assert carbonate_bound(np.array([1.0]), np.array([1e-6]))[0] == pytest.approx(5.182134, rel=1e-6)


def test_uncertainty_of_an_error_that_both_amounts_share_cancels() -> None:
    shared = sparse_map([0], [0], [0.01], (1, 1))
    product, fed = Linearised(np.array([1e-6]), 1e-6 * shared), Linearised(np.array([1e-3]), 1e-3 * shared)
    share = carbon_efficiency(product, np.array([1.0]), fed)
    assert nominal(share) == pytest.approx([1e-3])
    assert standard_uncertainty(share) == pytest.approx([0.0], abs=1e-18)
