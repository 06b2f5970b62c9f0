"""Energy efficiencies, against figures worked by hand."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.cell.energy import cathodic_energy_efficiency, full_cell_energy_efficiency
from coulombook.uncertainty.linearised import Linearised, sparse_map, standard_uncertainty


def test_cathodic_efficiency_is_the_faradaic_one_without_overpotential() -> None:
    found = cathodic_energy_efficiency(np.array([0.6]), np.array([-0.1]), np.array([-0.1]), 1.23)
    assert found == pytest.approx([0.6])


def test_cathodic_efficiency_of_carbon_monoxide() -> None:
    # 0.8 (1.23 + 0.10) / (1.23 + 0.67) = 0.8 x 1.33 / 1.90
    found = cathodic_energy_efficiency(np.array([0.8]), np.array([-0.10]), np.array([-0.67]), 1.23)
    assert found == pytest.approx([0.56])


def test_full_cell_efficiency_divides_by_the_cell_voltage() -> None:
    # 0.8 x 1.33 / 2.8
    found = full_cell_energy_efficiency(np.array([0.8]), np.array([-0.10]), np.array([2.8]), 1.23)
    assert found == pytest.approx([0.38])


def test_uncertainty_of_the_cell_voltage_is_carried() -> None:
    voltage = Linearised(np.array([2.8]), sparse_map([0], [0], [0.028], (1, 1)))
    found = full_cell_energy_efficiency(np.array([0.8]), np.array([-0.10]), voltage, 1.23)
    # 1 % of U is 1 % of the efficiency
    assert standard_uncertainty(found) == pytest.approx([0.0038])
