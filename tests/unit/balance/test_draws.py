"""Draws of a day: the replayed record against the measurement function itself, and what the streams promise."""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import numpy as np
import pytest

from coulombook.balance import draws
from coulombook.balance.draws import BLOCK, Record, draw_day
from coulombook.balance.evaluate import evaluate
from coulombook.balance.settle import Settled
from coulombook.findings import Findings
from coulombook.intake.day import open_day
from coulombook.tally import settle_day
from coulombook.uncertainty.linearised import Linearised, nominal, sparse_map, standard_uncertainty
from coulombook.uncertainty.recorded import Recorded, UnitErrors
from coulombook.uncertainty.replay import Needs, Program, aligned

ROOT = Path(__file__).parents[3]
CHUNK = 128


@pytest.fixture(scope="module", params=["2043-05-18-mesh-foil-foam", "2043-06-02-gas-diffusion"])
def settled(request: pytest.FixtureRequest) -> Settled:
    findings = Findings()
    source = open_day(ROOT / "example_experiments" / request.param, [ROOT / "calibrations"], findings)
    account = settle_day(source, findings, for_draws=True)
    assert account is not None
    return account


def test_the_record_is_the_measurement_function(settled: Settled) -> None:
    """For the same normals and some of the runs, as evaluated for plain arrays over the whole day."""
    record = Record(settled)
    runs = np.array([1, 2])
    outputs = [(number, rows) for number, rows in record.outputs(runs) if isinstance(number, Recorded)]
    assert len(outputs) == 4
    needs = Needs(outputs)
    columns = needs.rows[id(record.errors)]
    normals = aligned(len(columns), CHUNK)
    program = Program(outputs, needs, record.errors, np.arange(len(columns)), normals)
    drawn = np.random.default_rng(20430602).standard_normal((len(settled.inputs.sources), CHUNK))
    normals[...] = drawn[columns]
    program.run()
    scatter = [nominal(one) for one in (settled.scatter, settled.liquid_scatter)]
    for place, one in enumerate((settled.scatter, settled.liquid_scatter)):
        if isinstance(one, Linearised):
            scatter[place] = (one.jacobian @ drawn).T
    plain = evaluate(
        settled.plan, settled.inputs.draw(drawn.T), settled.weights, settled.detection.counted, *scatter
    )
    names = ("faradaic_efficiency", "total", "c2_plus", "ratio")
    for name, (_, rows), found in zip(names, outputs, program.results, strict=True):
        np.testing.assert_allclose(found, getattr(plain, name).T[rows], rtol=1e-12, err_msg=name)


def test_draws_agree_with_propagation(settled: Settled) -> None:
    count = 20_000
    outcome = settled.outcome
    seen = []
    for part in draw_day(settled, count, 3):
        seen += part.day_runs.tolist()
        for found, number, rows in (
            (part.efficiency, outcome.faradaic_efficiency, part.products),
            (part.total, outcome.total, part.day_runs),
            (part.c2_plus, outcome.c2_plus, part.day_runs),
        ):
            u = standard_uncertainty(number)[rows]
            # within the 5 % that two digits allow (JCGM 101:2008, 8), and four standard deviations of 20,000 draws
            np.testing.assert_allclose(found.deviation, u, rtol=0.05 + 0.02)
            assert (found.low <= nominal(number)[rows]).all()
            assert (found.high >= nominal(number)[rows]).all()
    assert seen == list(range(len(settled.plan.runs)))


def deviations(settled: Settled, seed: int, count: int = 1000) -> np.ndarray:
    return np.concatenate([part.efficiency.deviation for part in draw_day(settled, count, seed)])


def test_a_seed_gives_the_same_draws(settled: Settled) -> None:
    first = deviations(settled, 7)
    np.testing.assert_array_equal(first, deviations(settled, 7))
    assert not np.allclose(first, deviations(settled, 8), rtol=1e-6)


def test_room_for_shared_errors_changes_no_draw(settled: Settled, monkeypatch: pytest.MonkeyPatch) -> None:
    """An error that runs share is the same draw in every turn, whether it was kept or is drawn again."""
    monkeypatch.setattr(draws, "_RUNS_OF_A_TURN", 3)
    kept = deviations(settled, 7, 2 * BLOCK)
    monkeypatch.setattr(draws, "_SHARED_BYTE", 0)
    np.testing.assert_array_equal(kept, deviations(settled, 7, 2 * BLOCK))


def test_one_run_alone_spreads_as_it_does_among_others(
    settled: Settled, monkeypatch: pytest.MonkeyPatch
) -> None:
    together = deviations(settled, 7, 20_000)
    monkeypatch.setattr(draws, "_RUNS_OF_A_TURN", 1)
    np.testing.assert_allclose(together, deviations(settled, 7, 20_000), rtol=0.05)


def test_shared_errors_are_dropped_after_their_last_turn() -> None:
    shared = draws._SharedErrors(Counter({4: 2, 5: 1}), BLOCK + 1, 1)
    assert 4 in shared
    assert 5 not in shared
    first, second = shared.take(4), shared.take(4)
    drawn = [next(first), next(first)]
    assert shared._kept
    # as a turn does it: nobody asks for a third block
    np.testing.assert_array_equal(drawn, [next(second), next(second)])
    assert not shared._kept


def test_the_callers_treatment_of_floating_point_errors_is_left_alone(settled: Settled) -> None:
    with np.errstate(all="raise"):
        wanted = np.geterr()
        for _ in draw_day(settled, 500, 1):
            assert np.geterr() == wanted


def test_a_quantity_near_zero_is_lognormal_with_its_mean_and_deviation() -> None:
    """JCGM 101:2008, 6.4: what cannot be negative is not drawn from a distribution that reaches below zero."""
    errors = UnitErrors(3)
    value = np.array([2.0, 5.0])
    jacobian = sparse_map([0, 0, 1], [0, 1, 2], [0.6, 0.8, 0.1], (2, 3))  # u = 1 and 0.1
    number = draws._recorded(Linearised(value, jacobian), errors, positive=True)
    assert isinstance(number, Recorded)
    outputs = [(number, np.arange(2))]
    needs = Needs(outputs)
    normals = aligned(3, 400_000)
    program = Program(outputs, needs, errors, np.arange(3), normals)
    normals[...] = np.random.default_rng(5).standard_normal(normals.shape)
    program.run()
    near, far = program.results[0]
    assert near.min() > 0.0
    assert near.mean() == pytest.approx(2.0, rel=0.005)
    assert near.std() == pytest.approx(1.0, rel=0.02)
    # ln x is normal: its skewness is that of 400,000 normals, zero within six standard deviations
    z = np.log(near) - np.log(near).mean()
    assert abs((z**3).mean() / z.std() ** 3) < 6 * np.sqrt(6 / 400_000)
    np.testing.assert_allclose(far, 5.0 + 0.1 * normals[2], rtol=1e-14)
