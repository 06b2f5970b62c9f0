"""Propagation of distributions: the worked examples of JCGM 101:2008, 9.2 and 9.3.

The draws are those of the standard (1e6), with our intervals; tolerances beyond the printed digits are three sampling
errors of a quantile of 1e6 draws.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from tests.published.reference import case

from coulombook.uncertainty.coverage import (
    numerical_tolerance,
    propagation_validated,
    shortest_interval,
    symmetric_interval,
)
from coulombook.uncertainty.linearised import Linearised, sparse_map, standard_uncertainty

DRAWS = 1_000_000
LEVEL = 0.95
FloatArray = NDArray[np.float64]


def generator() -> np.random.Generator:
    return np.random.Generator(np.random.SFC64(101))


def validated(value: float, u: float, draws: FloatArray) -> bool:
    low, high = symmetric_interval(np.sort(draws)[None, :], LEVEL)
    return bool(propagation_validated(np.array([value]), np.array([u]), LEVEL, low, high, DRAWS)[0])


def test_sum_of_four_normals() -> None:
    data = case("jcgm101_922")
    draws = generator().standard_normal((4, DRAWS)).sum(axis=0)
    # the standard deviation of 1e6 draws is known to u / sqrt(2 M) = 0.0014
    assert draws.std() == pytest.approx(data.expected["u"].recomputed, abs=0.0042)
    low, high = shortest_interval(draws[None, :].copy(), LEVEL)
    # its width is flat about its minimum and scatters less than its ends: quantile error 2 x 0.0027 a side
    assert (high[0] - low[0]) / 2 == pytest.approx(data.expected["half_95"].published, abs=0.005 + 0.008)
    assert validated(0.0, 2.0, draws)


def test_sum_of_four_rectangulars_is_narrower_than_a_normal() -> None:
    data = case("jcgm101_923")
    draws = generator().uniform(-np.sqrt(3.0), np.sqrt(3.0), (4, DRAWS)).sum(axis=0)
    assert draws.std() == pytest.approx(data.expected["u"].recomputed, abs=0.0042)
    low, high = symmetric_interval(np.sort(draws)[None, :], LEVEL)
    half = (high[0] - low[0]) / 2
    assert half == pytest.approx(data.expected["half_95_exact"].published, abs=0.005 + 0.008)
    # 3.92 by propagation lies 0.04 off, within half of the second digit of u = 2.0
    assert numerical_tolerance(2.0) == 0.05
    assert validated(0.0, 2.0, draws)


def mass_draws(given: dict[str, Any]) -> FloatArray:
    """Correction of a mass against 100 g, in mg."""

    def number(name: str) -> float:
        return float(given[name])

    random = generator()
    mass = number("m_Rc") + number("u_m_Rc") * random.standard_normal(DRAWS)
    added = number("dm_Rc") + number("u_dm_Rc") * random.standard_normal(DRAWS)
    air, weight, reference = (random.uniform(*given[name], DRAWS) for name in ("rho_a", "rho_W", "rho_R"))
    return (mass + added) * (1.0 + (air - 1.2) * (1.0 / weight - 1.0 / reference)) - 100_000.0


def test_mass_calibration_by_draws() -> None:
    data = case("jcgm101_93")
    draws = mass_draws(data.inputs)
    assert draws.std() == pytest.approx(
        data.expected["u_exact"].published, abs=data.expected["u_exact"].abs_tol
    )
    low, high = shortest_interval(draws[None, :].copy(), LEVEL)
    width = data.expected["width95_mc"]
    assert high[0] - low[0] == pytest.approx(width.published, abs=width.abs_tol)


def test_mass_calibration_by_propagation_is_not_validated() -> None:
    data = case("jcgm101_93")
    given = data.inputs
    size = 5
    half = {
        name: (given[name][1] - given[name][0]) / 2 / np.sqrt(3.0) for name in ("rho_a", "rho_W", "rho_R")
    }
    middle = {name: sum(given[name]) / 2 for name in half}

    def one(place: int, value: float, u: float) -> Linearised:
        return Linearised(np.array([value]), sparse_map([0], [place], [u], (1, size)))

    mass, added = one(0, given["m_Rc"], given["u_m_Rc"]), one(1, given["dm_Rc"], given["u_dm_Rc"])
    air, weight, reference = (one(2 + place, middle[name], half[name]) for place, name in enumerate(half))
    found = (mass + added) * (1.0 + (air - 1.2) * (1.0 / weight - 1.0 / reference)) - 100_000.0
    u = float(standard_uncertainty(found)[0])
    data.expected["u_guf1"].check(u)
    # the sensitivities to the densities vanish at the estimate: first order misses a third of u, and says so
    assert not validated(float(found.value[0]), u, mass_draws(given))
