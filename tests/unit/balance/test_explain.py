"""What the ranking of causes says about causes alike, and how large an estimate is of the thing entered."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.balance.causes import Cause
from coulombook.balance.explain import Explanation, _of_the_quantity, rank

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
