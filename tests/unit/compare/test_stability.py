"""Drift of a run over its injections: exact lines, times to 80 %, and how often intervals and verdicts hold."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.compare.adjustment import holm
from coulombook.compare.stability import BEYOND, EXTENDED, STEADY, WITHIN, Drift, drift
from coulombook.uncertainty.linearised import FloatArray, Linearised, sparse_map

NOTHING = np.zeros(0, dtype=bool)
HOURS = np.array([0.5, 1.0, 1.5, 2.0, 2.5])


def one_run(y: FloatArray, u: float = 0.0, shared: float = 0.0, time: FloatArray = HOURS) -> Drift:
    n = len(y)
    group = np.zeros(n, dtype=np.intp)
    if not u:
        return drift(time, y, group, 1, NOTHING, np.zeros(1, dtype=np.intp))
    rows, columns = [*range(n), *range(n)], [*range(n), *[n] * n]
    value = Linearised(y, sparse_map(rows, columns, [*u * y, *shared * y], (n, n + 1)))
    return drift(time, value, group, 1, np.array([True] * n + [False]), np.zeros(1, dtype=np.intp))


def test_a_straight_loss_is_recovered_with_its_time_to_80_percent() -> None:
    # 0.60 at the first injection, 0.02 less each hour: a fifth of it, 0.12, is lost after 6 h
    found = one_run(0.60 - 0.02 * (HOURS - 0.5))
    assert found.start[0] == pytest.approx(0.60)
    assert found.slope.value[0] == pytest.approx(-0.02)
    assert found.span[0] == pytest.approx(2.0)
    assert found.lost[0] == pytest.approx(6.0)
    assert found.mean.value[0] == pytest.approx(0.58)


@pytest.mark.parametrize(("per_hour", "verdict"), [(0.08, WITHIN), (0.03, EXTENDED), (0.01, BEYOND)])
def test_it_is_said_where_the_time_lies_beyond_the_run(per_hour: float, verdict: str) -> None:
    # lost after 1.5, 4 and 12 h, of a span of 2 h
    assert one_run(0.60 - per_hour * (HOURS - 0.5)).verdict == (verdict,)


def test_a_steady_run_has_an_earliest_time_and_no_latest_one() -> None:
    found = one_run(np.array([0.60, 0.61, 0.59, 0.60, 0.60]), u=0.02)
    assert found.verdict == (STEADY,)
    assert math.isnan(found.lost[0])
    assert math.isinf(found.latest[0])
    assert 2.0 < found.earliest[0] < 50.0


def test_a_rising_run_never_loses_a_fifth() -> None:
    found = one_run(0.30 + 0.05 * HOURS, u=0.001)
    assert found.verdict == (STEADY,)
    assert math.isinf(found.earliest[0])


def test_a_value_below_zero_has_no_share_to_lose() -> None:
    found = one_run(np.array([-0.001, 0.001, -0.002, 0.0, -0.001]))
    assert found.verdict == (STEADY,)
    assert math.isnan(found.earliest[0])


def test_the_interval_of_the_time_does_not_grow_with_an_error_that_all_injections_share() -> None:
    y = 0.60 - 0.05 * (HOURS - 0.5)
    narrow, wide = one_run(y, 0.01), one_run(y, 0.01, 0.2)
    assert wide.earliest[0] == pytest.approx(narrow.earliest[0], rel=1e-6)
    assert wide.latest[0] == pytest.approx(narrow.latest[0], rel=1e-6)
    assert wide.mean.u[0] > 0.1 > narrow.mean.u[0]


def drawn_days(
    days: int, runs: int, injections: int, undeclared: float, lost_per_hour: float
) -> tuple[Drift, ...]:
    """Days of five products in so many runs: 1.5 % of a reading and 2 % of a run are stated, the rest is not."""
    generator = np.random.default_rng(injections + runs)
    groups = runs * PRODUCTS
    group = np.repeat(np.arange(groups), injections)
    time = np.tile(np.linspace(0.3, 3.3, injections), groups)
    n, run = len(time), group // PRODUCTS
    rows, columns = np.tile(np.arange(n), 2), np.concatenate([np.arange(n), n + run])
    own = np.repeat([True, False], [n, runs])
    found = []
    for _ in range(days):
        level = generator.uniform(0.05, 0.5, groups)[group]
        truth = level * (1.0 - lost_per_hour * (time - 0.3))
        y = truth * (1.0 + np.hypot(0.015, undeclared) * generator.standard_normal(n))
        y *= 1.0 + 0.02 * generator.standard_normal(runs)[run]
        sizes = np.concatenate([0.015 * y, 0.02 * y])
        value = Linearised(y, sparse_map(rows, columns, sizes, (n, n + runs)))
        found.append(drift(time, value, group, groups, own, np.tile(np.arange(PRODUCTS), runs)))
    return tuple(found)


PRODUCTS = 5


@pytest.mark.parametrize("undeclared", [0.0, 0.015, 0.05])
@pytest.mark.parametrize(("days", "runs", "injections"), [(100, 10, 4), (100, 10, 6), (60, 6, 12)])
def test_intervals_of_the_time_to_80_percent_hold(
    days: int, runs: int, injections: int, undeclared: float
) -> None:
    found = drawn_days(days, runs, injections, undeclared, 0.04)
    # a fifth is lost after 5 h; 1800 lines and more know the share to 0.6 %
    covered = [np.mean((one.earliest <= 5.0) & (one.latest >= 5.0)) for one in found]
    assert 0.93 <= np.mean(covered) <= 0.97


@pytest.mark.parametrize("undeclared", [0.0, 0.015, 0.05])
@pytest.mark.parametrize(("days", "runs", "injections"), [(150, 10, 4), (150, 10, 6), (60, 30, 4)])
def test_steady_runs_have_no_drift_and_are_rarely_told_to(
    days: int, runs: int, injections: int, undeclared: float
) -> None:
    found = drawn_days(days, runs, injections, undeclared, 0.0)
    covered = [np.mean(np.abs(one.slope.value) <= one.slope.half_width(0.95)) for one in found]
    assert 0.93 <= np.mean(covered) <= 0.97
    told = [min(holm(run.tolist())) < 0.05 for one in found for run in one.slope.p.reshape(runs, PRODUCTS)]
    # 1500 runs and more know 5 % to 0.6 %
    assert np.mean(told) <= 0.05 + 0.012


def test_a_run_that_scatters_far_more_than_the_others_is_judged_by_itself() -> None:
    generator = np.random.default_rng(4)
    groups, injections = 12, 6
    group = np.repeat(np.arange(groups), injections)
    time = np.tile(np.linspace(0.0, 2.0, injections), groups)
    y = 0.5 + 0.005 * generator.standard_normal(len(time))
    quiet = drift(time, y, group, groups, NOTHING, np.zeros(groups, dtype=np.intp))
    y[group == 0] = 0.5 + 0.2 * np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])
    found = drift(time, y, group, groups, NOTHING, np.zeros(groups, dtype=np.intp))
    assert found.slope.degrees_of_freedom[0] == pytest.approx(4.0)
    assert found.slope.p[0] > 0.05
    # the others lose its four degrees of freedom and gain nothing of its scatter
    assert found.slope.degrees_of_freedom[1] == pytest.approx(44.0)
    assert found.slope.u[1] == pytest.approx(quiet.slope.u[1], rel=0.2)
