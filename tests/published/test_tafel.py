"""Tafel slopes of textbook mechanisms, from currents that follow them.

2.303 R T/(alpha F): 118 mV for alpha 0.5 and 59 mV for alpha 1 at 25 degC (Bard & Faulkner, Electrochemical Methods,
2nd ed., section 3.4.3; printed digits from memory). Two electrons before the rate-limiting third, (2 + alpha) F: 24 mV
for alpha 0.5 (Bockris & Reddy, Modern Electrochemistry, chapter on electrodics; from memory).
"""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.compare.kinetics import STRAIGHT, tafel
from coulombook.compare.trend import Points
from coulombook.constants import FARADAY_CONSTANT, GAS_CONSTANT

NOTHING = np.zeros(0, dtype=bool)


@pytest.mark.parametrize(
    ("transfer", "millivolt", "half_digit"), [(0.5, 118.3, 0.05), (1.0, 59.16, 0.005), (2.5, 23.7, 0.05)]
)
def test_slope_of_a_mechanism_at_25_degrees(transfer: float, millivolt: float, half_digit: float) -> None:
    potential = np.linspace(-0.5, -0.9, 6)
    current = 1e-4 * np.exp(-transfer * FARADAY_CONSTANT * potential / (GAS_CONSTANT * 298.15))
    points = Points.of(potential, np.log(current), NOTHING)
    found = tafel(points, np.zeros(6, dtype=np.intp), np.arange(6), 1)
    assert found.verdict == (STRAIGHT,)
    assert 1e3 * found.slope_volt[0] == pytest.approx(millivolt, abs=half_digit)
