"""Scatter that the errors of the standards leave unexplained."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.unexplained import components, unexplained_variance

Z = np.array([1.0, -2.0, 0.5, 3.0])
MEAN = (1.0 + 4.0 + 0.25 + 9.0) / 4.0


def test_without_certificates_it_is_the_mean_square() -> None:
    assert unexplained_variance(Z, np.zeros(4)) == (pytest.approx(MEAN, rel=1e-15), 4.0)


def test_small_errors_of_the_standards_are_subtracted() -> None:
    found, freedom = unexplained_variance(np.full(40, 1.0), np.full(40, 0.01))
    # forty components put zero out of reach
    assert found == pytest.approx(1.0 - 0.01, rel=1e-6)
    assert freedom == pytest.approx(40.0 * 0.99, rel=1e-6)


def test_no_scatter_at_all_leaves_two_over_n_of_the_errors() -> None:
    found, freedom = unexplained_variance(np.full(5, 1e-6), np.full(5, 2.0))
    assert found == pytest.approx(2.0 * 2.0 / 5.0, rel=1e-6)
    assert freedom == pytest.approx(5.0 * 0.8 / 2.8, rel=1e-6)


def test_equal_errors_follow_the_truncated_gamma_distribution() -> None:
    # 1/(v + e) is gamma distributed, a = n/2, b = n s^2/2, cut off at 1/e: its mean is (a/b) P(a + 1, b/e)/P(a, b/e)
    from scipy.special import gammainc

    for e in (0.3, 2.0, 20.0):
        a, b = 2.0, 2.0 * MEAN
        expected = 1.0 / (a / b * gammainc(a + 1.0, b / e) / gammainc(a, b / e)) - e
        assert unexplained_variance(Z, np.full(4, e))[0] == pytest.approx(expected, rel=1e-9)


def test_scale_of_the_residuals_does_not_matter() -> None:
    explained = np.array([0.1, 0.5, 2.0, 0.0])
    plain, scaled = (unexplained_variance(k * Z, k**2 * explained) for k in (1.0, 1e-7))
    assert scaled[0] == pytest.approx(1e-14 * plain[0], rel=1e-9)
    assert scaled[1] == pytest.approx(plain[1], rel=1e-9)


def test_points_on_the_curve_have_no_scatter() -> None:
    assert unexplained_variance(np.zeros(3), np.full(3, 1.0))[0] == 0.0


def test_component_that_certificates_explain_tells_little() -> None:
    _, freedom = unexplained_variance(Z, np.array([1e-9, 1e-9, 1e9, 1e9]))
    assert freedom == pytest.approx(2.0, rel=1e-6)


def test_components_carry_the_variance_they_are_said_to() -> None:
    rng = np.random.default_rng(120)
    x = np.array([1.0, 2.0, 4.0, 6.0, 8.0, 10.0])
    basis, moved = np.column_stack((np.ones(6), x)), 0.3 * x[:, None] * np.eye(6)
    draws = []
    for _ in range(4000):
        residual = basis @ [3.0, -2.0] + moved @ rng.standard_normal(6) + rng.standard_normal(6)
        draws.append(components(residual, basis, moved)[0])
    explained = components(np.zeros(6), basis, moved)[1]
    covariance = np.cov(np.array(draws).T)
    # 4000 draws know a variance to 2.2 %
    np.testing.assert_allclose(np.diag(covariance), 1.0 + explained, rtol=0.09)
    off = covariance - np.diag(np.diag(covariance))
    assert np.abs(off).max() < 0.09 * np.diag(covariance).max()


def test_errors_a_curve_can_follow_do_not_show_in_its_residuals() -> None:
    x = np.array([1.0, 2.0, 4.0])
    assert components(x, x[:, None], 0.1 * x[:, None])[1] == pytest.approx(0.0, abs=1e-15)
