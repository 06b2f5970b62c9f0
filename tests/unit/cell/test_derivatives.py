"""The formulas of the measurement function carry derivatives as well as numbers."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.sparse import csr_array

from coulombook.amounts.water import saturated_water_vapour_pascal
from coulombook.cell.headspace import filled_share
from coulombook.cell.potential import potential_rhe_volt, reference_potential_volt
from coulombook.curves.inverse import invert, response
from coulombook.uncertainty.linearised import Linearised

FORMULAS: dict[str, tuple[Callable[..., Any], tuple[float, ...]]] = {
    "response": (response, (3.0, 2e6, -1e7, 4e-3)),
    "inverse of a quadratic": (invert, (3.0, 2e6, -1e7, 7500.0)),
    "inverse of a line": (invert, (3.0, 2e6, 0.0, 7500.0)),
    "water vapour": (saturated_water_vapour_pascal, (298.15,)),
    "reference potential": (reference_potential_volt, (0.21, -7.3e-4, 293.0)),
    "potential against RHE": (potential_rhe_volt, (-1.5, 0.21, 6.8, 293.0, -0.012, 9.0, 0.85)),
    "filled share": (filled_share, (400.0, 130.0)),
}


@pytest.mark.parametrize("name", FORMULAS)
def test_derivative_with_respect_to_every_argument_agrees_with_differences(name: str) -> None:
    formula, values = FORMULAS[name]
    size = len(values)
    carried = [
        Linearised(np.array([value]), csr_array(np.eye(size)[[index]])) for index, value in enumerate(values)
    ]
    result = formula(*carried)
    assert result.value[0] == pytest.approx(formula(*values), rel=1e-14)
    slopes = result.jacobian.toarray()[0]
    for index, value in enumerate(values):
        h = 1e-5 * max(abs(value), 1e-3)
        up, down = ([*values] for _ in range(2))
        up[index] += h
        down[index] -= h
        difference = (formula(*up) - formula(*down)) / (2 * h)
        # h^2 of a curvature of order one, and the rounding of the difference over h
        scale = max(abs(difference), abs(formula(*values)) / max(abs(value), 1e-3))
        assert slopes[index] == pytest.approx(difference, abs=1e-7 * scale), f"argument {index}"


@pytest.mark.parametrize("name", FORMULAS)
def test_draws_give_what_single_numbers_give(name: str) -> None:
    formula, values = FORMULAS[name]
    rng = np.random.default_rng(80)
    draws = [value * (1.0 + 0.01 * rng.standard_normal((5, 3))) for value in values]
    result = formula(*draws)
    assert result.shape == (5, 3)
    single = [formula(*(float(draw[2, 1]) for draw in draws))]
    assert result[2, 1] == pytest.approx(single[0], rel=1e-13)
