"""Tafel slopes and onsets of drawn series: exact data, straight ranges, limits of transport, and how often intervals
hold."""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import partial

import numpy as np
import pytest
from tests.unit.compare.series_sample import points

from coulombook.compare.kinetics import (
    ABOVE,
    BELOW,
    BEND_CHANCE,
    BENT,
    FALLS,
    FEW,
    FLAT,
    RISES,
    STRAIGHT,
    WITHIN,
    Onset,
    Tafel,
    onset,
    tafel,
)
from coulombook.compare.trend import Points
from coulombook.uncertainty.linearised import FloatArray, Linearised, sparse_map

NOTHING = np.zeros(0, dtype=bool)
SLOPE = 0.118  # V per decade


def tafel_current(potential: FloatArray, slope: float = SLOPE) -> FloatArray:
    """0.1 at -0.6 V, and a tenfold current with each ``slope``."""
    return np.asarray(0.1 * 10.0 ** (-(potential + 0.6) / slope), dtype=np.float64)


def limited_current(potential: FloatArray, limit: float) -> FloatArray:
    """1/j = 1/j(kinetic) + 1/j(limit), as Koutecky and Levich (Bard & Faulkner, Electrochemical Methods, 9.3.4)."""
    return np.asarray(1.0 / (1.0 / tafel_current(potential) + 1.0 / limit), dtype=np.float64)


def levels(count: int, step: float = 0.1) -> FloatArray:
    return -0.6 - step * np.arange(count)


def one_series(potential: FloatArray, current: FloatArray, u_log: float = 0.0) -> Tafel:
    """A series with one run at each level, with a stated uncertainty of its log j or none."""
    n = len(potential)
    group = np.zeros(n, dtype=np.intp)
    y = np.log(current)
    stated = points(potential, y, group, (0.0, u_log), (0.0, 0.0))
    return tafel(stated if u_log else Points.of(potential, y, NOTHING), group, np.arange(n), 1)


# --- what is exact ---


@pytest.mark.parametrize("u_log", [0.0, 0.03])
def test_a_tafel_line_is_recovered(u_log: float) -> None:
    found = one_series(levels(5), tafel_current(levels(5)), u_log)
    assert found.slope_volt[0] == pytest.approx(SLOPE, rel=1e-12)
    assert found.verdict == (STRAIGHT,)
    assert found.levels[0] == 5


def test_the_interval_of_a_slope_is_that_of_its_inverse() -> None:
    # d ln j/dE = -ln 10/0.118 = -19.513 per V; Sxx = 0.1 V^2; u = 0.03/sqrt(0.1) = 0.09487, k = 1.95996
    found = one_series(levels(5), tafel_current(levels(5)), 0.03)
    b, u = math.log(10.0) / SLOPE, 0.03 / math.sqrt(0.1)
    assert found.u_slope_volt[0] == pytest.approx(SLOPE * u / b, rel=1e-9)
    assert found.low_volt[0] == pytest.approx(math.log(10.0) / (b + 1.959964 * u), rel=1e-6)
    assert found.high_volt[0] == pytest.approx(math.log(10.0) / (b - 1.959964 * u), rel=1e-6)


def test_the_unit_of_the_current_does_not_matter() -> None:
    potential = levels(6) + 0.003 * np.array([1, -1, 0, 2, -1, 0])
    one, other = (
        one_series(potential, factor * limited_current(potential, 30.0), 0.05) for factor in (1.0, 1e4)
    )
    assert one.slope_volt[0] == pytest.approx(other.slope_volt[0], rel=1e-9)
    assert one.u_slope_volt[0] == pytest.approx(other.u_slope_volt[0], rel=1e-9)
    assert one.verdict == other.verdict


def test_the_order_of_runs_does_not_matter() -> None:
    order = np.array([3, 0, 4, 1, 2])
    potential, group = levels(5), np.zeros(5, dtype=np.intp)
    y = np.log(tafel_current(potential)) + np.array([0.03, -0.02, -0.04, 0.02, 0.01])
    one = tafel(points(potential, y, group, (0.001, 0.02), (0.01, 0.3)), group, np.arange(5), 1)
    other = tafel(
        points(potential[order], y[order], group, (0.001, 0.02), (0.01, 0.3)), group, np.arange(5)[order], 1
    )
    assert one.slope_volt[0] == pytest.approx(other.slope_volt[0], rel=1e-9)
    assert one.levels[0] == other.levels[0]


def test_an_error_of_the_flow_or_the_reference_that_all_runs_share_does_not_widen_a_slope() -> None:
    potential, group = levels(5), np.zeros(5, dtype=np.intp)
    y = np.log(tafel_current(potential))
    narrow, wide = (
        tafel(points(potential, y, group, (0.002, 0.02), shared), group, np.arange(5), 1)
        for shared in ((0.0, 0.0), (0.03, 0.2))
    )
    assert wide.u_slope_volt[0] == pytest.approx(narrow.u_slope_volt[0], rel=1e-9)


# --- the straight range ---


def test_fewer_than_three_levels_tell_nothing() -> None:
    found = one_series(levels(2), tafel_current(levels(2)), 0.02)
    assert found.verdict == (FEW,)
    assert math.isnan(found.slope_volt[0])


def test_three_levels_without_uncertainty_tell_nothing() -> None:
    found = one_series(levels(3), tafel_current(levels(3)) * [1.0, 1.2, 1.0])
    assert found.verdict == (FEW,)


def test_a_current_that_may_not_rise_has_only_a_lower_bound_of_its_slope() -> None:
    found = one_series(levels(4), np.array([1.0, 1.01, 0.99, 1.0]), 0.03)
    assert found.verdict == (FLAT,)
    assert math.isnan(found.slope_volt[0])
    assert math.isinf(found.high_volt[0])
    # slope -0.02 +- 0.26 per V at the 95 % level: ln 10/0.28 V per decade at least
    assert 5.0 < found.low_volt[0] < 15.0


# --- how often it holds ---


def drawn(
    series: int,
    n_levels: int,
    runs: int,
    law: Callable[[FloatArray], FloatArray],
    undeclared: float,
    seed: int = 11,
) -> Tafel:
    """Series of ``runs`` replicates at each level, with errors stated, shared and not declared at all."""
    generator = np.random.default_rng(seed)
    level = np.tile(np.repeat(np.arange(n_levels), runs), series)
    group = np.repeat(np.arange(series), n_levels * runs)
    n = len(level)
    truth = levels(n_levels)[level]
    # 2 mV and 3 % of each run, 10 mV and 5 % of the day, and what nobody has declared
    x = truth + 0.002 * generator.standard_normal(n) + 0.01 * generator.standard_normal(series)[group]
    y = (
        np.log(law(truth))
        + 0.03 * generator.standard_normal(n)
        + 0.05 * generator.standard_normal(series)[group]
    )
    y += undeclared * generator.standard_normal(n)
    return tafel(points(x, y, group, (0.002, 0.03), (0.01, 0.05)), group, level, series)


@pytest.mark.parametrize(
    ("n_levels", "runs", "undeclared"),
    [
        *((n_levels, 1, undeclared) for n_levels in (5, 7) for undeclared in (0.0, 0.03)),
        # only replicates tell of a scatter that is larger than what is stated
        *(
            (n_levels, runs, undeclared)
            for n_levels, runs in ((4, 2), (5, 2), (6, 3))
            for undeclared in (0.0, 0.03, 0.06)
        ),
    ],
)
def test_intervals_of_slopes_hold_as_often_as_they_say(n_levels: int, runs: int, undeclared: float) -> None:
    found = drawn(5000, n_levels, runs, tafel_current, undeclared)
    known = ~np.isnan(found.slope_volt)
    assert known.mean() > 0.98
    covered = (found.low_volt <= SLOPE) & (found.high_volt >= SLOPE)
    # 5000 series know it to 0.3 %
    assert 0.93 <= covered[known].mean() <= 0.97


@pytest.mark.parametrize("undeclared", [0.0, 0.03])
@pytest.mark.parametrize(("n_levels", "runs"), [(4, 2), (5, 1), (5, 2), (6, 3)])
def test_a_straight_series_is_rarely_told_to_bend(n_levels: int, runs: int, undeclared: float) -> None:
    found = drawn(5000, n_levels, runs, tafel_current, undeclared)
    # what is beyond the stated errors makes it twice as often at most, as long as it is no larger than they
    assert np.mean(found.bend_p < BEND_CHANCE) <= (1.0 if undeclared == 0 else 2.0) * BEND_CHANCE
    assert np.mean((found.bend_p < BEND_CHANCE) & (found.falls > 0)) <= BEND_CHANCE


# --- what bends ---


@pytest.mark.parametrize("runs", [1, 2])
@pytest.mark.parametrize(("limit", "too_high"), [(100.0, 0.03), (30.0, 0.06)])
def test_a_limit_of_transport_is_told_and_cut_off(limit: float, too_high: float, runs: int) -> None:
    found = drawn(1000, 5, runs, partial(limited_current, limit=limit), 0.0)
    assert np.mean((found.bend_p < BEND_CHANCE) & (found.falls > 0)) > 0.99
    assert np.mean([verdict in (FALLS, BENT) for verdict in found.verdict]) > 0.99
    known = ~np.isnan(found.slope_volt)
    assert known.mean() > 0.5
    assert found.levels[known].mean() < 4.0
    # what of the limit cannot be seen in the levels that are kept makes the slope too high, never too low
    assert 0.0 < np.median(found.slope_volt[known]) / SLOPE - 1.0 < too_high


def test_the_more_levels_are_limited_the_fewer_are_kept() -> None:
    laws = [partial(limited_current, limit=limit) for limit in (1e5, 1e3, 30.0)]
    found = [drawn(200, 7, 2, law, 0.0) for law in laws]
    kept = [float(np.mean(one.levels)) for one in found]
    assert kept[0] > kept[1] + 1.0 > kept[2] + 2.0


def test_a_series_bent_throughout_has_no_straight_range() -> None:
    # 0.3 is passed to 88 % before the third level
    found = drawn(200, 5, 3, partial(limited_current, limit=0.3), 0.0)
    assert np.mean([verdict == BENT for verdict in found.verdict]) > 0.9
    assert np.isnan(found.slope_volt[np.array(found.verdict) == BENT]).all()


def test_a_current_that_rises_away_is_told_as_such() -> None:
    def two_ways(potential: FloatArray) -> FloatArray:
        return tafel_current(potential, 0.3) + 1e-4 * tafel_current(potential, 0.06)

    found = drawn(200, 6, 2, two_ways, 0.0)
    assert np.mean([verdict == RISES for verdict in found.verdict]) > 0.7
    assert set(found.verdict) <= {RISES, BENT}
    assert not found.falls.any()
    # the slower law alone, where the faster adds less than 2 %
    assert np.nanmedian(found.slope_volt) == pytest.approx(0.3, rel=0.05)


# --- onset ---


def onset_of(potential: FloatArray, current: FloatArray, threshold: float) -> Onset:
    n = len(potential)
    return onset(potential, np.log(current), np.zeros(n, dtype=np.intp), np.arange(n), 1, math.log(threshold))


def test_an_onset_on_a_tafel_line_is_exact() -> None:
    # 1.0 is one decade above 0.1 at -0.6 V
    found = onset_of(levels(4), tafel_current(levels(4)), 1.0)
    assert found.potential_volt[0] == pytest.approx(-0.6 - SLOPE, rel=1e-12)
    assert found.verdict == (WITHIN,)


@pytest.mark.parametrize(("threshold", "verdict"), [(0.05, BELOW), (1e6, ABOVE)])
def test_an_onset_is_not_extrapolated(threshold: float, verdict: str) -> None:
    found = onset_of(levels(4), tafel_current(levels(4)), threshold)
    assert found.verdict == (verdict,)
    assert math.isnan(found.potential_volt[0])


def test_an_onset_is_the_first_passage_of_a_current_that_falls_again() -> None:
    found = onset_of(levels(4), np.array([0.1, 10.0, 0.1, 10.0]), 1.0)
    assert found.potential_volt[0] == pytest.approx(-0.65, rel=1e-12)


def test_replicates_of_a_level_count_as_one_point_of_an_onset() -> None:
    potential = np.array([-0.58, -0.62, -0.70])
    current = np.array([0.09, 0.09, 0.9])
    found = onset(
        potential, np.log(current), np.zeros(3, dtype=np.intp), np.array([0, 0, 1]), 1, math.log(0.3)
    )
    # between -0.60 V and -0.70 V, at log(0.3/0.09)/log(0.9/0.09) of the way
    share = math.log(0.3 / 0.09) / math.log(10.0)
    assert found.potential_volt[0] == pytest.approx(-0.60 - 0.10 * share, rel=1e-12)


def test_the_uncertainty_of_an_onset_is_that_of_draws() -> None:
    generator = np.random.default_rng(5)
    n, shared, u_x, u_y = 4, 0.01, 0.002, 0.05
    x, y = levels(n), np.log(tafel_current(levels(n)))
    every, group = np.arange(n), np.zeros(n, dtype=np.intp)
    rows = [*every, *every]
    e = Linearised(x, sparse_map(rows, [*every, *[2 * n] * n], [*[u_x] * n, *[shared] * n], (n, 2 * n + 1)))
    log = Linearised(y, sparse_map(every, n + every, u_y, (n, 2 * n + 1)))
    found = onset(e, log, group, every, 1, math.log(1.0))
    drawn_onsets = []
    for _ in range(20000):
        one = x + u_x * generator.standard_normal(n) + shared * generator.standard_normal()
        other = y + u_y * generator.standard_normal(n)
        drawn_onsets.append(np.interp(0.0, other[:3], one[:3]))
    # 20000 draws know a standard deviation to 0.5 %; the interpolation is nearly linear in its errors
    assert found.u_potential_volt[0] == pytest.approx(np.std(drawn_onsets), rel=0.02)
