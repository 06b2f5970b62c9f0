"""Covariances of values that share few errors, against the full matrices they stand for."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import csr_array, diags_array, hstack
from scipy.stats import multivariate_normal

from coulombook.uncertainty.shared import SharedCovariance

ADDED = np.array([0.0, 0.01, 0.3]) ** 2


def errors(n: int, *, shuffled: bool, wide: int = 3) -> csr_array:
    """Derivatives of n values: errors of their own, errors of six neighbours, errors of all."""
    generator = np.random.default_rng(n)
    near = np.zeros((n, n // 2))
    for column in range(n // 2):
        first = int(generator.integers(0, max(n - 6, 1)))
        near[first : first + 6, column] = 0.01 * generator.standard_normal(len(near[first : first + 6]))
    shared = 0.02 * generator.standard_normal((n, wide))
    own = diags_array(generator.uniform(0.005, 0.01, n))
    # a column that moves nothing is none
    found = hstack([csr_array(near), csr_array((n, 1)), csr_array(shared), own]).tocsr()
    return found[generator.permutation(n)] if shuffled else found


def full(jacobian: csr_array, variance: np.ndarray, added: float) -> np.ndarray:
    return (jacobian @ jacobian.T).toarray() + np.diag(variance + added)


CASES = [(n, shuffled) for n in (1, 2, 5, 64, 65, 100, 203) for shuffled in (False, True)]


@pytest.mark.parametrize(("n", "shuffled"), CASES)
def test_inverse_and_determinant_are_those_of_the_full_matrix(n: int, shuffled: bool) -> None:
    jacobian, variance = errors(n, shuffled=shuffled), np.linspace(0.0, 1e-6, n)
    inverse = SharedCovariance.of_errors(jacobian, variance).inverse(ADDED)
    r = np.random.default_rng(1).standard_normal((n, 3))
    for place, added in enumerate(ADDED):
        v = full(jacobian, variance, added)
        expected = np.linalg.solve(v, r)
        size = np.abs(expected).max()
        np.testing.assert_allclose(inverse.solve(place, r), expected, rtol=1e-9, atol=1e-10 * size)
        np.testing.assert_allclose(inverse.diagonal[place], np.diag(np.linalg.inv(v)), rtol=1e-10)
        assert inverse.logdet[place] == pytest.approx(np.linalg.slogdet(v)[1], rel=1e-11, abs=1e-11)


def test_density_agrees_with_that_of_scipy() -> None:
    """scipy.stats.multivariate_normal, which knows nothing of the parts."""
    jacobian, variance = errors(100, shuffled=True), np.zeros(100)
    inverse = SharedCovariance.of_errors(jacobian, variance).inverse(ADDED)
    r = 0.01 * np.random.default_rng(2).standard_normal(100)
    for place, added in enumerate(ADDED):
        square = float(r @ inverse.solve(place, r[:, None])[:, 0])
        density = -0.5 * (square + inverse.logdet[place] + 100 * np.log(2.0 * np.pi))
        expected = multivariate_normal.logpdf(r, np.zeros(100), full(jacobian, variance, added))
        assert density == pytest.approx(expected, rel=1e-9)


def test_draws_have_the_covariance() -> None:
    jacobian, variance = errors(70, shuffled=True), np.full(70, 1e-5)
    inverse = SharedCovariance.of_errors(jacobian, variance).inverse(ADDED)
    count = 40_000
    drawn = inverse.sample(1, np.random.default_rng(3), count)
    v = full(jacobian, variance, float(ADDED[1]))
    # the variance of a covariance is (v_ii v_jj + v_ij^2) / count; six standard deviations
    bound = 6.0 * np.sqrt((np.outer(np.diag(v), np.diag(v)) + v**2) / count)
    assert (np.abs(drawn @ drawn.T / count - v) < bound).all()


def test_neighbours_make_blocks_and_the_rest_a_few_directions() -> None:
    for shuffled in (False, True):
        found = SharedCovariance.of_errors(errors(400, shuffled=shuffled), np.zeros(400))
        assert found.own.shape[1] <= 32
        assert found.wide.shape[1] < 20


def test_errors_shared_by_values_far_apart_cost_more_and_stay_exact() -> None:
    generator = np.random.default_rng(4)
    loose = csr_array(np.where(generator.random((90, 60)) < 0.05, 0.01, 0.0))
    jacobian = hstack([loose, diags_array(np.full(90, 0.01))]).tocsr()
    inverse = SharedCovariance.of_errors(jacobian, np.zeros(90)).inverse(ADDED)
    r = generator.standard_normal((90, 1))
    expected = np.linalg.solve(full(jacobian, np.zeros(90), 0.0), r)
    np.testing.assert_allclose(inverse.solve(0, r), expected, rtol=1e-9, atol=1e-9 * np.abs(expected).max())


def test_a_matrix_is_taken_as_it_is() -> None:
    v = full(errors(20, shuffled=True), np.zeros(20), 0.0)
    inverse = SharedCovariance.of_matrix(v).inverse(ADDED)
    np.testing.assert_allclose(inverse.solve(0, np.eye(20)), np.linalg.inv(v), rtol=1e-9, atol=1e-6)


def test_a_matrix_that_is_none_is_refused() -> None:
    with pytest.raises(np.linalg.LinAlgError):
        SharedCovariance.of_matrix(np.array([[1.0, 2.0], [2.0, 1.0]])).inverse(ADDED[:1])
