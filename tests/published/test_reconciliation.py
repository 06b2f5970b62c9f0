"""Data reconciliation against a published example.

Narasimhan & Jordache, Data Reconciliation and Gross Error Detection (Gulf, 2000), heat exchanger with bypass, Examples
1.1 and 7.1: reconciled flows to the printed two decimals, the global test with the bias (16.674 against 9.488). The
values without a printed counterpart are recomputed and say so.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.sparse import csr_array

from coulombook.uncertainty.linearised import Linearised
from coulombook.uncertainty.reconcile import reconcile

CASES = tomllib.loads((Path(__file__).parent / "reference_values.toml").read_text(encoding="utf-8"))["case"]


def _case(name: str) -> dict[str, Any]:
    return next(case for case in CASES if case["id"] == name)


@pytest.mark.parametrize("name", ["reconciliation_nj", "reconciliation_nj_bias"])
def test_exchanger_with_bypass(name: str) -> None:
    case = _case(name)
    # the biased case has the data of the first with +4 on stream 2 (its title)
    base = _case("reconciliation_nj")["in"]
    y = np.array(base["y"]) + np.array([0, 4.0 if name.endswith("bias") else 0.0, 0, 0, 0, 0])
    a = csr_array(np.array(base["A"], dtype=float))
    found = reconcile(Linearised(y, csr_array(np.eye(6))), a, np.zeros(4))
    actual = {"gamma": found.chi2, "dof": found.dof}
    actual |= {f"x{k + 1}": found.value[k] for k in range(6)}
    actual |= {f"u{k + 1}": found.u[k] for k in range(6)}
    actual |= {f"nodal{k + 1}": found.constraint_z[k] for k in range(4)}
    actual |= {f"z{k + 1}": found.z[k] for k in range(6)}
    checked = 0
    for expected in case["expect"]:
        if expected["name"] not in actual:
            continue
        checked += 1
        if "published" in expected:
            assert actual[expected["name"]] == pytest.approx(expected["published"], abs=expected["abs_tol"])
        if "recomputed" in expected:
            assert actual[expected["name"]] == pytest.approx(expected["recomputed"], rel=1e-9)
    assert checked >= 23


def _single(value: float, u: float) -> Linearised:
    return Linearised(np.array([value]), csr_array(np.array([[u]])))


def test_a_constraint_without_uncertainty_is_refused() -> None:
    with pytest.raises(ValueError, match="constraint 0 has no uncertainty"):
        reconcile(_single(1.0, 0.0), csr_array(np.eye(1)), np.array([2.0]))


def test_constraints_that_repeat_one_another_are_refused() -> None:
    with pytest.raises(ValueError, match="only 1 of 2 constraints are independent"):
        reconcile(_single(1.0, 0.5), csr_array(np.ones((2, 1))), np.array([2.0, 2.0]))


def test_slack_leaves_part_of_the_residual_standing() -> None:
    # S = 1, slack 1: V = 2, the value takes half of the residual
    found = reconcile(_single(3.0, 1.0), csr_array(np.eye(1)), np.array([1.0]), 1.0)
    assert found.value[0] == pytest.approx(2.0)
    assert found.chi2 == pytest.approx(2.0)
    assert found.u[0] == pytest.approx(0.5**0.5)
