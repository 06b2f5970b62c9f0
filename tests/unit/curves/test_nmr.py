"""Saturation and agreement of NMR signals."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.curves.nmr import saturation_factor, signal_agreement
from coulombook.uncertainty.linearised import Linearised, sparse_map


def test_a_relaxed_signal_is_whole() -> None:
    assert float(saturation_factor(1e3, 1.0, math.pi / 2)) == pytest.approx(1.0, rel=1e-15)
    assert float(saturation_factor(1e3, 1.0, math.radians(30.0))) == pytest.approx(0.5, rel=1e-15)


def test_ninety_degree_pulses_wait_for_the_exponential() -> None:
    repetition = np.array([1.0, 3.0, 5.0])
    np.testing.assert_allclose(
        saturation_factor(repetition, 1.0, math.pi / 2), 1.0 - np.exp(-repetition), rtol=1e-15
    )


def test_steady_state_is_what_a_train_of_pulses_settles_to() -> None:
    angle, decay = math.radians(40.0), math.exp(-0.8)
    z = 1.0
    for _ in range(200):
        z = 1.0 - (1.0 - z * math.cos(angle)) * decay
    assert float(saturation_factor(0.8, 1.0, angle)) == pytest.approx(z * math.sin(angle), rel=1e-14)


def test_strongest_signal_is_at_the_ernst_angle() -> None:
    angles = np.linspace(0.01, math.pi / 2, 2001)
    best = angles[np.argmax(saturation_factor(1.0, 1.0, angles))]
    assert best == pytest.approx(math.acos(math.exp(-1.0)), abs=angles[1] - angles[0])


def test_errors_of_the_times_are_carried() -> None:
    # one error for each of the two times; slopes by central differences
    def number(value: float, column: int) -> Linearised:
        return Linearised(np.array([value]), sparse_map([0], [column], [1.0], (1, 2)))

    angle = math.radians(60.0)
    found = saturation_factor(number(4.0, 0), number(2.0, 1), angle)
    assert isinstance(found, Linearised)
    step = 1e-5
    for column, (up, down) in enumerate((((4 + step, 2), (4 - step, 2)), ((4, 2 + step), (4, 2 - step)))):
        difference = (saturation_factor(*up, angle) - saturation_factor(*down, angle)) / (2.0 * step)
        assert found.jacobian.toarray()[0, column] == pytest.approx(float(difference), rel=1e-8)


def test_agreeing_signals_worked_by_hand() -> None:
    # weights 1, 1, 4: mean (1 + 3 + 4 x 2)/6 = 2; chi^2 = 1 + 1 + 0; p = exp(-1) with 2 degrees of freedom
    found = signal_agreement([1.0, 3.0, 2.0], [1.0, 1.0, 0.5])
    assert found.mean == pytest.approx(2.0, rel=1e-15)
    assert found.u_mean == pytest.approx(1.0 / math.sqrt(6.0), rel=1e-14)
    assert (found.chi_square, found.degrees_of_freedom) == (pytest.approx(2.0, rel=1e-14), 2)
    assert found.p == pytest.approx(math.exp(-1.0), rel=1e-12)
    # 1 against the mean of the others, (3 + 8)/5 = 2.2 with variance 1/5
    assert found.deviation[0] == pytest.approx((1.0 - 2.2) / math.sqrt(1.2), rel=1e-12)


def test_odd_signal_is_named() -> None:
    found = signal_agreement([1.00, 1.02, 1.50, 0.99], [0.02, 0.02, 0.02, 0.02])
    assert found.p < 1e-6
    assert found.odd == 2


def test_of_two_signals_neither_is_odd() -> None:
    found = signal_agreement([1.0, 2.0], [0.1, 0.1])
    assert found.p < 1e-6
    assert found.odd is None
    # chi^2 = d^2/(u1^2 + u2^2)
    assert found.chi_square == pytest.approx(1.0 / 0.02, rel=1e-12)


def test_single_signal_agrees_with_itself() -> None:
    found = signal_agreement([1.0], [0.1])
    assert (found.p, found.odd, found.chi_square) == (1.0, None, 0.0)


def test_what_signals_share_does_not_set_them_apart() -> None:
    values, own = [1.0, 1.1, 0.95], np.diag([0.01, 0.02, 0.01])
    alone, shared = (signal_agreement(values, own + part) for part in (0.0, 0.5))
    assert shared.chi_square == pytest.approx(alone.chi_square, rel=1e-9)
    assert shared.u_mean == pytest.approx(math.sqrt(alone.u_mean**2 + 0.5), rel=1e-9)
    np.testing.assert_allclose(shared.deviation, alone.deviation, atol=1e-12)


def test_disagreement_is_found_no_more_often_than_chance_allows() -> None:
    rng = np.random.default_rng(112)
    u = np.array([0.1, 0.2, 0.15, 0.1])
    p = np.array([signal_agreement(u * rng.standard_normal(4), u).p for _ in range(2000)])
    # 2000 draws know 5 % to 0.5 %
    assert 0.035 < np.mean(p < 0.05) < 0.065


@pytest.mark.parametrize(
    ("values", "u", "message"),
    [
        ([], [], "no signals"),
        ([1.0, 2.0], [0.1, 0.0], "an uncertainty above zero"),
        ([1.0, float("nan")], [0.1, 0.1], "a finite value"),
    ],
)
def test_signals_that_cannot_be_compared_are_refused(
    values: list[float], u: list[float], message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        signal_agreement(values, u)
