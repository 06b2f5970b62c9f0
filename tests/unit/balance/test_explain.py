"""What the ranking of causes says about causes alike, and how large an estimate is of the thing entered."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.sparse import csr_array, diags_array, hstack
from scipy.stats import multivariate_normal

from coulombook.balance.causes import Cause
from coulombook.balance.explain import _SCATTERS, PRIOR_SD, Explanation, _of_the_quantity, rank
from coulombook.uncertainty.shared import SharedCovariance

GAS = np.array([0.7, 0.6, 0.8, 0.5, 0.0, 0.0])
LIQUID = np.array([0.2, 0.3, 0.1, 0.4, 0.9, 0.9])
V = np.eye(6) * 0.01**2


def cause(kind: str, pattern: np.ndarray, where: str = "", *, only_positive: bool = False) -> Cause:
    return Cause(kind, where, pattern[:, None], only_positive, f"test of {kind}")


def test_causes_of_different_pattern_are_told_apart() -> None:
    causes = [cause("outlet-flow", GAS), cause("internal-standard", LIQUID)]
    found = rank(0.1 * GAS, V, causes)
    assert not found.closes
    assert found.ranked[0].cause == "outlet-flow"
    assert found.ranked[0].estimate == pytest.approx(0.1, rel=1e-6)
    assert found.ranked[0].apart == ()


def test_causes_that_move_all_totals_in_one_proportion_are_never_told_apart() -> None:
    # a tenth of the size takes ten times the error, which is thought unlikely beforehand: the evidence parts them,
    # but no reading could
    causes = [cause("outlet-flow", GAS), cause("curve", 0.1 * GAS, "ethylene")]
    first, second = rank(0.1 * GAS, V, causes).ranked[:2]
    assert first.evidence - second.evidence > 2 * math.log(10.0)
    assert first.apart == ("curve (ethylene)",)
    assert second.apart == ("outlet-flow",)


def test_a_cause_with_nothing_to_say_is_not_told_in_one_breath_with_the_best() -> None:
    # the same pattern the other way round, but gas is never gained
    causes = [cause("outlet-flow", GAS), cause("gas-lost", -GAS, only_positive=True)]
    found = rank(0.1 * GAS, V, causes)
    assert found.ranked[0].apart == ()


def explanation(kind: str, estimate: float, where: str = "") -> Explanation:
    return Explanation(kind, where, estimate, 0.02, 9.0, (), "")


@pytest.mark.parametrize(
    ("kind", "where", "estimate", "size"),
    [
        # 1.25 times the flow leaves 0.25 / 1.25 of what was measured to be taken away
        ("outlet-flow", "", 0.20, 0.25),
        ("curve", "ethylene", -0.25, -0.20),
        # 20 % of the gas lost: 0.25 times what was measured is to be added
        ("gas-lost", "m2-4", 0.25, 0.20),
        ("crossover", "", 0.25, 0.20),
        # a share of the charge is one already
        ("crossover", "q1-150", 0.25, 0.25),
        ("unmeasured-product", "", 0.25, 0.25),
        ("none", "", 0.0, 0.0),
    ],
)
def test_estimate_is_of_what_was_entered_or_lost(kind: str, where: str, estimate: float, size: float) -> None:
    assert _of_the_quantity(explanation(kind, estimate, where)).estimate == pytest.approx(size)


@pytest.mark.parametrize(("kind", "estimate"), [("outlet-flow", 0.2), ("gas-lost", 0.25)])
def test_uncertainty_of_the_estimate_follows_its_slope(kind: str, estimate: float) -> None:
    step = 1e-6
    high, low = (_of_the_quantity(explanation(kind, estimate + one)).estimate for one in (step, -step))
    # a central difference of step 1e-6 is good to 1e-9 here
    assert _of_the_quantity(explanation(kind, estimate)).u == pytest.approx(
        0.02 * (high - low) / (2 * step), rel=1e-7
    )


def test_an_error_that_no_quantity_could_have_has_no_size() -> None:
    found = _of_the_quantity(explanation("curve", 1.2, "acetate"))
    assert math.isnan(found.estimate)
    assert math.isnan(found.u)


def long_day(runs: int) -> tuple[csr_array, list[Cause], np.ndarray]:
    """Derivatives of the totals by their errors, causes and residuals of a day: checks that ten runs share, a flow."""
    generator = np.random.default_rng(runs)
    gas = generator.uniform(0.4, 0.8, runs)
    checks = np.repeat(np.eye(-(-runs // 10)), 10, axis=0)[:runs] * 0.01 * gas[:, None]
    jacobian = hstack(
        [csr_array(checks), csr_array(0.01 * gas[:, None]), diags_array(np.full(runs, 0.01))]
    ).tocsr()
    one_run = []
    for run in range(runs):
        pattern = np.zeros(runs)
        pattern[run] = -gas[run]
        one_run.append(cause("gas-lost", pattern, f"r{run}", only_positive=True))
    growing = np.column_stack([np.ones(runs), np.linspace(-0.5, 0.5, runs)])
    causes = [
        cause("outlet-flow", gas),
        cause("internal-standard", 1.0 - gas),
        *one_run,
        Cause("unmeasured-product", "growing with potential", -growing, True, "look for it"),
    ]
    residual = 0.05 * gas + 0.01 * generator.standard_normal(runs)
    residual[runs // 2] -= 0.1
    return jacobian, causes, residual


@pytest.mark.parametrize("runs", [1, 7, 64, 65, 150])
def test_few_shared_errors_give_what_the_full_covariance_gives(runs: int) -> None:
    jacobian, causes, residual = long_day(runs)
    full = rank(residual, (jacobian @ jacobian.T).toarray(), causes)
    found = rank(residual, SharedCovariance.of_errors(jacobian, np.zeros(runs)), causes)
    assert [(one.cause, one.where, one.apart) for one in found.ranked] == [
        (one.cause, one.where, one.apart) for one in full.ranked
    ]
    assert (found.closes, found.scatter) == (full.closes, full.scatter)
    for one, other in zip(found.ranked, full.ranked, strict=True):
        assert (one.estimate, one.u, one.evidence) == pytest.approx(
            (other.estimate, other.u, other.evidence), rel=1e-9, abs=1e-12
        )


def test_evidence_is_the_ratio_of_the_normal_densities_with_and_without_the_cause() -> None:
    """Marginal likelihoods by scipy, each at its best scatter: an error of a cause adds its prior to the covariance."""
    jacobian, causes, residual = long_day(30)
    v = (jacobian @ jacobian.T).toarray()

    def density(prior: np.ndarray) -> float:
        return max(
            multivariate_normal.logpdf(residual, np.zeros(30), v + prior + scatter**2 * np.eye(30))
            for scatter in _SCATTERS
        )

    free = [one for one in causes if not one.only_positive]
    found = {one.cause: one.evidence for one in rank(residual, v, free).ranked}
    for one in free:
        expected = 2.0 * (density(PRIOR_SD**2 * one.pattern @ one.pattern.T) - density(np.zeros((30, 30))))
        assert found[one.kind] == pytest.approx(expected, rel=1e-9, abs=1e-9)


def test_estimate_is_that_of_generalised_least_squares() -> None:
    jacobian, causes, residual = long_day(30)
    v = (jacobian @ jacobian.T).toarray()
    flow = causes[0]
    found = next(one for one in rank(residual, v, [flow]).ranked if one.cause == "outlet-flow")
    fits = []
    for scatter in _SCATTERS:
        weights = np.linalg.inv(v + scatter**2 * np.eye(30))
        d = flow.pattern[:, 0]
        theta, u = d @ weights @ residual / (d @ weights @ d), (d @ weights @ d) ** -0.5
        left = residual - theta * d
        fits.append((left @ weights @ left - np.linalg.slogdet(weights)[1], theta, u))
    _, theta, u = min(fits)
    assert (found.estimate, found.u) == pytest.approx((theta, u), rel=1e-9)


def test_causes_of_one_run_alone_are_never_told_apart_from_each_other() -> None:
    pattern = np.eye(6)[2]
    causes = [
        cause("gas-lost", -GAS[2] * pattern, "r2", only_positive=True),
        cause("crossover", -pattern, "r2", only_positive=True),
        cause("gas-lost", -GAS[3] * np.eye(6)[3], "r3", only_positive=True),
    ]
    first, second = rank(-0.2 * pattern, V, causes).ranked[:2]
    assert {first.cause, second.cause} == {"gas-lost", "crossover"}
    assert first.apart[0].startswith(second.cause)
    assert second.apart[0].startswith(first.cause)
