"""The law of propagation and draws of the same measurement function agree on a whole day."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from coulombook.balance.evaluate import evaluate
from coulombook.balance.settle import Settled
from coulombook.findings import Findings
from coulombook.intake.day import open_day
from coulombook.tally import settle_day
from coulombook.uncertainty.linearised import Linearised, nominal, standard_uncertainty

ROOT = Path(__file__).parents[2]
DRAWS = 4000


@pytest.fixture(scope="module", params=["2043-05-18-mesh-foil-foam", "2043-06-02-gas-diffusion"])
def settled(request: pytest.FixtureRequest) -> Settled:
    findings = Findings()
    source = open_day(ROOT / "example_experiments" / request.param, [ROOT / "calibrations"], findings)
    account = settle_day(source, findings)
    assert account is not None
    return account


def test_propagated_uncertainty_agrees_with_draws(settled: Settled) -> None:
    plan, inputs = settled.plan, settled.inputs
    normals = np.random.default_rng(20430518).standard_normal((DRAWS, len(inputs.sources)))
    scatter, liquid_scatter = settled.scatter, settled.liquid_scatter
    assert isinstance(scatter, Linearised)
    assert isinstance(liquid_scatter, Linearised)
    drawn = evaluate(
        plan,
        inputs.draw(normals),
        settled.weights,
        settled.detection.counted,
        (scatter.jacobian @ normals.T).T,
        (liquid_scatter.jacobian @ normals.T).T,
    )
    for name in ("faradaic_efficiency", "total", "c2_plus", "ratio"):
        stated = getattr(settled.outcome, name)
        values = getattr(drawn, name)
        known = np.isfinite(nominal(stated)) & (nominal(stated) != 0)
        u = standard_uncertainty(stated)[known]
        # JCGM 101:2008, 8: the law of propagation is validated when it agrees within half a unit of the second
        # significant digit of u, 5 % at most; the sd of 4,000 draws is itself known to 1.1 %, four of which are added
        np.testing.assert_allclose(values.std(axis=0, ddof=1)[known], u, rtol=0.05 + 0.045, err_msg=name)
        # means agree with the nominal values within the second-order bias, far below u
        bias = (values.mean(axis=0)[known] - nominal(stated)[known]) / u
        assert np.abs(bias).max() < 0.15, name


def test_nominal_draw_reproduces_the_settled_account(settled: Settled) -> None:
    nothing = np.zeros((1, len(settled.inputs.sources)))
    single = evaluate(settled.plan, settled.inputs.draw(nothing), settled.weights, settled.detection.counted)
    np.testing.assert_allclose(single.total[0], nominal(settled.outcome.total), rtol=1e-12)
    np.testing.assert_allclose(
        single.electrical.potential_rhe_volt[0],
        nominal(settled.outcome.electrical.potential_rhe_volt),
        rtol=1e-12,
    )
