"""Least-squares adjustment against the same algebra with full matrices, and what it cannot move."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import csr_array
from scipy.stats import chi2

from coulombook.uncertainty import reconcile as module
from coulombook.uncertainty.linearised import Linearised
from coulombook.uncertainty.reconcile import global_test, reconcile

RNG = np.random.default_rng(11)
VALUE = RNG.uniform(5.0, 9.0, 7)
JACOBIAN = RNG.normal(size=(7, 9))
A = np.array([[1.0, 1, 1, 0, 0, 0, 0], [0, 0, 0, 1, 1, -1, 0]])
TARGET = np.array([20.0, 6.0])


@pytest.mark.parametrize("slack", [0.0, 0.7, np.array([0.0, 2.0])])
@pytest.mark.parametrize("chunk", [2, 3, 7, 2048])
def test_adjustment_is_that_of_the_full_matrices(
    slack: float | np.ndarray, chunk: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(module, "_CHUNK", chunk)
    found = reconcile(Linearised(VALUE, csr_array(JACOBIAN)), csr_array(A), TARGET, slack)
    s = JACOBIAN @ JACOBIAN.T
    v = A @ s @ A.T + np.diag(np.broadcast_to(np.square(slack), 2))
    residual = A @ VALUE - TARGET
    gain = s @ A.T @ np.linalg.inv(v)
    adjusted = s - gain @ A @ s
    np.testing.assert_allclose(found.value, VALUE - gain @ residual, rtol=1e-12)
    np.testing.assert_allclose(found.u, np.sqrt(np.diag(adjusted)), rtol=1e-10)
    np.testing.assert_allclose(found.residual, residual, rtol=1e-12)
    np.testing.assert_allclose(found.constraint_z, residual / np.sqrt(np.diag(v)), rtol=1e-12)
    np.testing.assert_allclose(found.z, gain @ residual / np.sqrt(np.diag(gain @ A @ s)), rtol=1e-10)
    assert found.dof == 2
    assert found.chi2 == pytest.approx(residual @ np.linalg.solve(v, residual), rel=1e-12)
    assert found.p == pytest.approx(chi2.sf(found.chi2, 2), rel=1e-12)
    alone = global_test(Linearised(VALUE, csr_array(JACOBIAN)), csr_array(A), TARGET, slack)
    assert (alone.chi2, alone.dof, alone.p) == (found.chi2, found.dof, found.p)
    np.testing.assert_array_equal(alone.residual, found.residual)
    np.testing.assert_array_equal(alone.z, found.constraint_z)
    if np.all(slack == 0.0):
        np.testing.assert_allclose(A @ found.value, TARGET, rtol=1e-12)


def test_a_value_that_shares_nothing_with_the_constraints_stays_and_is_not_tested() -> None:
    # the third value has errors of its own and stands in no constraint; the fourth has none at all
    jacobian = csr_array(np.diag([1.0, 2.0, 3.0, 0.0]))
    x = Linearised(np.array([1.0, 2.0, 5.0, 7.0]), jacobian)
    found = reconcile(x, csr_array(np.array([[1.0, 1.0, 0.0, 1.0]])), np.array([11.0]))
    assert found.value[2:].tolist() == [5.0, 7.0]
    assert found.u[2:].tolist() == [3.0, 0.0]
    assert np.isnan(found.z).tolist() == [False, False, True, True]
    # one is missing: a fifth of it is the first's, by their variances 1 and 4
    assert found.value[:2] == pytest.approx([1.2, 2.8])
    assert found.z[:2] == pytest.approx(np.full(2, -1.0 / 5.0**0.5))


def test_a_value_the_rounding_alone_would_move_is_not_tested() -> None:
    # what the constraint takes of the second value's variance is 1e-26 of it: less than rounding leaves
    jacobian = csr_array(np.array([[1.0, 0.0], [1e-13, 1.0]]))
    x = Linearised(np.array([1.0, 2.0]), jacobian)
    found = reconcile(x, csr_array(np.array([[1.0, 0.0]])), np.array([1.5]))
    assert np.isnan(found.z).tolist() == [False, True]
    more = Linearised(x.value, csr_array(np.array([[1.0, 0.0], [1e-11, 1.0]])))
    seen = reconcile(more, csr_array(np.array([[1.0, 0.0]])), np.array([1.5]))
    assert seen.z == pytest.approx([-0.5, -0.5])


def test_without_constraints_nothing_is_tested_and_nothing_moves() -> None:
    x = Linearised(VALUE, csr_array(JACOBIAN))
    found = reconcile(x, csr_array((0, 7)), np.zeros(0))
    assert (found.chi2, found.dof, found.p) == (0.0, 0, 1.0)
    np.testing.assert_array_equal(found.value, VALUE)
    np.testing.assert_allclose(found.u, np.sqrt((JACOBIAN**2).sum(axis=1)), rtol=1e-14)


def test_the_constraint_without_uncertainty_is_named() -> None:
    jacobian = csr_array(np.diag([1.0, 0.0]))
    x = Linearised(np.array([1.0, 2.0]), jacobian)
    with pytest.raises(ValueError, match="constraint 1 has no uncertainty"):
        global_test(x, csr_array(np.eye(2)), np.zeros(2))
    # with slack it may hold only so far, and is one to be adjusted with
    assert global_test(x, csr_array(np.eye(2)), np.zeros(2), 0.5).z == pytest.approx([1.0 / 1.25**0.5, 4.0])


def test_constraints_of_very_different_size_are_independent_all_the_same() -> None:
    x = Linearised(np.array([1.0, 2.0]), csr_array(np.eye(2)))
    scaled = csr_array(np.array([[1e-9, 0.0], [0.0, 1e9]]))
    assert global_test(x, scaled, np.array([0.0, 0.0])).chi2 == pytest.approx(5.0)
