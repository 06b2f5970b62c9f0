"""Covariance of the standards."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves.certificates import standard_errors

X = np.array([1.0, 1.0, 2.0, 4.0])


def covariance(**stated: object) -> np.ndarray:
    errors = standard_errors(X, **stated)  # type: ignore[arg-type]
    return errors @ errors.T


def test_injections_of_one_standard_share_its_error() -> None:
    expected = np.diag([0.01, 0.01, 0.04, 0.09])
    expected[0, 1] = expected[1, 0] = 0.01
    np.testing.assert_allclose(covariance(u_x=[0.1, 0.1, 0.2, 0.3]), expected, rtol=1e-14)


def test_standards_of_one_parent_share_a_relative_error() -> None:
    # 1 % of a parent over the first three, and none of the last
    expected = np.zeros((4, 4))
    expected[:3, :3] = np.outer(0.01 * X[:3], 0.01 * X[:3])
    found = covariance(parent=["A", "A", "A", ""], u_parent=[0.01, 0.01, 0.01, 0.01])
    np.testing.assert_allclose(found, expected, rtol=1e-14)


def test_own_and_inherited_errors_add_as_variances() -> None:
    stated = {"parent": ["A", "A", "B", "B"], "u_parent": [0.01, 0.01, 0.02, 0.02]}
    both = covariance(u_x=[0.1, 0.1, 0.2, 0.3], **stated)
    np.testing.assert_allclose(both, covariance(u_x=[0.1, 0.1, 0.2, 0.3]) + covariance(**stated), rtol=1e-14)


def test_two_standards_of_the_same_content_but_different_parents_err_apart() -> None:
    found = covariance(u_x=[0.1, 0.1, 0.2, 0.3], parent=["A", "B", "A", "A"], u_parent=[0.0] * 4)
    assert found[0, 1] == 0.0


def test_nothing_stated_is_no_error() -> None:
    assert standard_errors(X).shape == (4, 0)
    assert standard_errors(X, [0.0] * 4, ["A"] * 4, [0.0] * 4).shape == (4, 0)


@pytest.mark.parametrize("wrong", [-0.1, float("nan"), float("inf")])
def test_an_uncertainty_that_is_none_is_refused(wrong: float) -> None:
    with pytest.raises(ValueError, match="a standard must be a number at or above zero"):
        standard_errors(X, [0.1, wrong, 0.1, 0.1])
    with pytest.raises(ValueError, match="a parent must be a number at or above zero"):
        standard_errors(X, None, ["A"] * 4, [0.1, wrong, 0.1, 0.1])
