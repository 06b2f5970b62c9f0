"""Many curves at once are the curves one by one."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.curves import FORMS, fit_curve, fit_many
from coulombook.curves.basis import orthonormal

CURVES, LEVELS = 40, 8
CLOSED_WEIGHTS = ("equal", "1/x", "1/x^2")


def standards(form: str, seed: int = 20430418) -> tuple[np.ndarray, np.ndarray]:
    """Mole fractions of 1e-6 to 1e-2 against areas up to 1e6, each curve with its own levels."""
    rng = np.random.default_rng(seed)
    x = np.sort(10.0 ** rng.uniform(-6.0, -2.0, (CURVES, LEVELS)), axis=1)
    slope = 10.0 ** rng.uniform(6.0, 8.0, (CURVES, 1))
    bend = -5.0 if form == "quadratic" else 0.0
    offset = 0.0 if form == "line through zero" else 3.0
    return x, (offset + slope * x * (1.0 + bend * x)) * (1.0 + 0.01 * rng.standard_normal(x.shape))


@pytest.mark.parametrize("weights", CLOSED_WEIGHTS)
@pytest.mark.parametrize("form", FORMS)
def test_every_curve_is_the_one_fitted_alone(form: str, weights: str) -> None:
    x, y = standards(form)
    found = fit_many(x, y, form, weights)
    ends = np.stack((x.min(axis=1), x.max(axis=1)))
    rising = (found.coefficients[:, 1] + 2.0 * found.coefficients[:, 2] * ends > 0.0).all(axis=0)
    assert np.count_nonzero(rising) > CURVES // 2  # a single curve that does not rise is refused
    for number in np.flatnonzero(rising).tolist():
        alone = fit_curve(x[number], y[number], form, weights)
        u = np.sqrt(np.diag(alone.covariance))
        # 1e-12 of the coefficient; one that is lost in its own uncertainty has fewer digits to be held against
        np.testing.assert_array_less(
            np.abs(found.coefficients[number] - alone.coefficients),
            1e-12 * (np.abs(alone.coefficients) + u) + 1e-300,
        )
        size = np.outer(u, u)
        np.testing.assert_array_less(
            np.abs(found.covariance[number] - alone.covariance), 1e-12 * size + 1e-300
        )
        assert found.residual_sd[number] == pytest.approx(alone.residual_sd, rel=1e-12)
        assert found.r_squared[number] == pytest.approx(alone.r_squared, rel=1e-12)
        assert found.degrees_of_freedom == alone.degrees_of_freedom


def test_a_line_is_that_of_numpy() -> None:
    """np.polyfit with its covariance, weights 1/x^2 being the square of its own."""
    x, y = standards("line")
    found = fit_many(x, y, "line", "1/x^2")
    for number in range(CURVES):
        (slope, offset), covariance = np.polyfit(x[number], y[number], 1, w=1.0 / x[number], cov=True)
        assert found.coefficients[number, 1] == pytest.approx(slope, rel=1e-9)
        u = np.sqrt(covariance[1, 1])
        assert found.coefficients[number, 0] == pytest.approx(offset, abs=1e-8 * u)
        np.testing.assert_allclose(found.covariance[number, :2, :2], covariance[::-1, ::-1], rtol=1e-8)


def test_one_row_of_levels_serves_all_curves() -> None:
    x, y = standards("line")
    shared = np.tile(x[0], (CURVES, 1))
    one, other = fit_many(x[0], y, "line"), fit_many(shared, y, "line")
    np.testing.assert_array_equal(one.coefficients, other.coefficients)


def test_without_degrees_of_freedom_nothing_is_known_of_the_scatter() -> None:
    found = fit_many([1.0, 3.0], [[2.0, 8.0]])
    assert found.coefficients[0].tolist() == pytest.approx([-1.0, 3.0, 0.0])
    assert found.degrees_of_freedom == 0
    assert not found.covariance.any()


@pytest.mark.parametrize("powers", [(0, 1), (1,), (0, 1, 2), (0, 1, 2, 3, 4, 5), (1, 2)])
def test_basis_is_orthonormal_and_made_of_the_powers(powers: tuple[int, ...]) -> None:
    x, _ = standards("line")
    root = np.sqrt(1.0 / x)
    q, back = orthonormal(x, root, powers)
    product = q.transpose(0, 2, 1) @ q
    np.testing.assert_allclose(product, np.broadcast_to(np.eye(len(powers)), product.shape), atol=1e-13)
    if len(powers) < 4:  # of high powers the plain coefficients themselves cancel
        made = root[..., None] * (x[..., None] ** np.array(powers) @ back)
        np.testing.assert_allclose(made, q, atol=1e-9)


@pytest.mark.parametrize(
    ("x", "y", "form", "weights", "said"),
    [
        ([1.0, 2.0], [[1.0, 2.0]], "cubic", "equal", "form 'cubic' is not available"),
        (
            [1.0, 2.0],
            [[1.0, 2.0]],
            "line",
            "replicates",
            "weights 'replicates' are not available for many curves",
        ),
        ([1.0], [[1.0]], "line", "equal", "1 point"),
        ([1.0, np.nan], [[1.0, 2.0]], "line", "equal", "not a finite number"),
        (
            [[1.0, 2.0], [2.0, 2.0]],
            [[1.0, 2.0], [1.0, 2.0]],
            "line",
            "equal",
            "different x; curve 1 has fewer",
        ),
        ([0.0, 0.0], [[0.0, 0.0]], "line through zero", "equal", "different x; curve 0"),
        ([0.0, 1.0], [[0.0, 2.0]], "line", "1/x", "need every x above zero"),
    ],
)
def test_what_cannot_be_fitted_is_said(
    x: list[float], y: list[list[float]], form: str, weights: str, said: str
) -> None:
    with pytest.raises(ValueError, match=said):
        fit_many(x, y, form, weights)
