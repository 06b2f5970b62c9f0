"""Catalysts compared at one point: intervals, shared errors, and how often equal catalysts are told apart."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import pytest
from tests.unit.compare.compared_runs import numbers, stacked

from coulombook.compare.pairs import Contest, contest, family
from coulombook.compare.potentials import common_potentials, interpolate, ranges
from coulombook.compare.replicates import Series, pool_series
from coulombook.compare.statistics import Sample, welch
from coulombook.uncertainty.linearised import Linearised, gather


def _series(x: Linearised, catalyst: Sequence[str], level: Sequence[str], electrode: Sequence[str]) -> Series:
    x, potential = stacked(x, numbers([-1.0] * len(x), 0.001))
    return pool_series(x, potential, catalyst, level, electrode)


def _one_level(x: Linearised, catalyst: Sequence[str]) -> Contest:
    """Every run with an electrode of its own."""
    series = _series(x, catalyst, ["level"] * len(x), [f"{one}{n}" for n, one in enumerate(catalyst)])
    return contest(series.mean, [point.catalyst for point in series.points], series.scatter)


def test_the_interval_of_a_ratio_does_not_grow_with_the_error_both_share() -> None:
    runs = [0.60, 0.601, 0.30, 0.3005]
    narrow, wide = (_one_level(numbers(runs, 0.01, shared), "aabb").pairs[0] for shared in (0.0, 0.2))
    assert narrow.ratio == pytest.approx(2.0)
    assert wide.ratio_low == pytest.approx(narrow.ratio_low, rel=1e-12)
    assert wide.ratio_high == pytest.approx(narrow.ratio_high, rel=1e-12)
    assert wide.p == pytest.approx(narrow.p, rel=1e-9)
    assert wide.u > narrow.u  # the difference scales with the flow, the ratio does not


def test_a_difference_without_scatter_beyond_the_stated_is_normal() -> None:
    # means 0.6 and 0.3, u of each run 0.01: u of the difference sqrt(4 x 0.01^2/4) = 0.01, quantile 1.96
    x = numbers([0.6, 0.6, 0.3, 0.3], [0.01 / 0.6] * 2 + [0.01 / 0.3] * 2)
    pair = _one_level(x, "aabb").pairs[0]
    assert (pair.one, pair.other) == ("a", "b")
    assert pair.difference == pytest.approx(0.3)
    assert pair.u == pytest.approx(0.01)
    assert pair.high - pair.difference == pytest.approx(1.959964 * 0.01, rel=1e-6)


def test_undeclared_scatter_of_equal_means_is_students_test() -> None:
    # equal means, so that a common relative scatter is a common one: s^2 = (0.02 + 0.08 + 0.02)/3 = 0.04 with three
    # degrees of freedom, u = sqrt(0.04 (1/2 + 1/2))
    pair = _one_level(numbers([1.1, 0.9, 1.2, 0.8, 1.1, 0.9], 0.0), "aabbcc").pairs[0]
    assert pair.u == pytest.approx(0.04**0.5)
    assert pair.degrees_of_freedom == pytest.approx(3.0)


def test_two_catalysts_alone_are_held_against_each_other_by_welchs_test() -> None:
    one, other = np.array([0.52, 0.48, 0.50, 0.51, 0.49, 0.50]), np.array([0.70, 0.50, 0.63])
    pair = _one_level(numbers([*one, *other], 0.0), "a" * 6 + "b" * 3).pairs[0]
    expected = welch(Sample.of(other), Sample.of(one))
    assert pair.u == pytest.approx(expected.u)
    assert (pair.low, pair.high) == pytest.approx((expected.low, expected.high))


@pytest.mark.parametrize(("scatters", "runs", "least"), [(0.1, 3, 0.93), (0.03, 3, 0.92), (0.01, 3, 0.93)])
def test_the_many_runs_of_one_catalyst_do_not_speak_for_the_few_of_another(
    scatters: float, runs: int, least: float
) -> None:
    # with one scatter common to both the intervals held the truth in 77, 86 and 95 % of 1500 days; Welch's own test of
    # normal samples of 6 and 3 holds 93 to 95 %; 400 days know a coverage to 1.1 %
    generator = np.random.default_rng(3)
    held, days = 0, 400
    for _ in range(days):
        quiet = 0.5 * (1 + np.hypot(0.01, 0.01) * generator.standard_normal(6))
        loud = 0.5 * (1 + np.hypot(scatters, 0.01) * generator.standard_normal(runs))
        pair = _one_level(numbers([*quiet, *loud], 0.01), "a" * 6 + "b" * runs).pairs[0]
        held += pair.low <= 0.0 <= pair.high
    assert held / days >= least - 0.01


def test_a_catalyst_that_stands_apart_is_held_against_the_others_by_welchs_test() -> None:
    # nothing declared, and every catalyst set apart or alone: what is left is Welch's test of two samples
    loud, quiet = np.array([0.9, 1.5, 1.2, 0.6]), np.array([0.500, 0.501, 0.499])
    third = np.array([0.7001, 0.7000, 0.6999])
    found = _one_level(numbers([*loud, *quiet, *third], 0.0), "aaaabbbccc")
    series = _series(
        numbers([*loud, *quiet, *third], 0.0), "aaaabbbccc", ["x"] * 10, [f"{n}" for n in range(10)]
    )
    assert series.repeatability.estimate[0] != series.repeatability.estimate[1]
    pair = next(one for one in found.pairs if (one.one, one.other) == ("a", "b"))
    expected = welch(Sample.of(loud), Sample.of(quiet))
    # b shares its scatter with c, which changes the last digits: its part of the variance is below 1e-4
    assert pair.u == pytest.approx(expected.u, rel=1e-4)
    assert pair.degrees_of_freedom == pytest.approx(expected.degrees_of_freedom, rel=1e-3)
    assert pair.low == pytest.approx(expected.low, rel=1e-2)


def test_a_mean_that_is_not_clear_of_zero_has_a_difference_and_no_ratio() -> None:
    pair = _one_level(numbers([0.5, 0.002], [0.01, 0.5]), "ab").pairs[0]
    assert np.isnan(pair.ratio)
    assert pair.difference == pytest.approx(0.498)
    assert pair.told_apart(0.95)


def test_two_that_found_nothing_are_not_told_apart() -> None:
    pair = _one_level(numbers([0.0, 0.0], 0.01), "ab").pairs[0]
    assert np.isnan(pair.p)
    assert not pair.told_apart(0.95)


def test_a_family_is_judged_together_over_all_its_points() -> None:
    x = numbers([0.60, 0.57, 0.50], [0.02, 0.02, 0.02])
    one = _one_level(x, "abc")
    together = family([one.pairs, one.pairs])
    # the smallest of six by Holm: six times its p instead of three times
    assert min(pair.p_holm for pair in together[0]) == pytest.approx(
        2 * min(pair.p_holm for pair in one.pairs)
    )


@dataclass(frozen=True)
class World:
    """How days are drawn: true means by catalyst and level, replicates, and errors relative to the value."""

    means: tuple[float, ...]
    levels: int
    replicates: int
    own: float
    shared: float
    undeclared: tuple[float, ...]

    def truth(self, catalyst: int, level: int) -> float:
        return self.means[catalyst] * (1 + 0.3 * level)

    def days(self, count: int, seed: int) -> Iterator[list[Contest]]:
        """Contests of all levels; an electrode is used at every level, and what is undeclared of it is its own."""
        generator = np.random.default_rng(seed)
        places = [
            (catalyst, level, replicate)
            for catalyst in range(len(self.means))
            for level in range(self.levels)
            for replicate in range(self.replicates)
        ]
        for _ in range(count):
            flow = 1 + self.shared * generator.standard_normal()
            electrode = generator.standard_normal((len(self.means), self.replicates))
            values = [
                self.truth(c, lv) * (1 + self.undeclared[c] * electrode[c, r] + self.own * generator.standard_normal())
                * flow
                for c, lv, r in places
            ]  # fmt: skip
            series = _series(
                numbers(values, self.own, self.shared),
                [str(c) for c, _, _ in places],
                [str(lv) for _, lv, _ in places],
                [f"{c}/{r}" for c, _, r in places],
            )
            contests = []
            for level in range(self.levels):
                at = [n for n, point in enumerate(series.points) if point.level == str(level)]
                contests.append(
                    contest(
                        gather(series.mean, np.array(at)),
                        [series.points[n].catalyst for n in at],
                        series.scatter,
                    )
                )
            yield contests


@pytest.mark.parametrize(
    ("levels", "replicates", "undeclared"),
    [(1, 3, 0.0), (1, 2, 0.01), (1, 3, 0.03), (3, 2, 0.0), (3, 2, 0.03), (3, 3, 0.02)],
)
def test_six_equal_catalysts_are_rarely_told_apart_and_their_intervals_cover(
    levels: int, replicates: int, undeclared: float
) -> None:
    world = World((0.5,) * 6, levels, replicates, 0.01, 0.03, (undeclared,) * 6)
    covered = ratios = pairs = false = 0
    days = 150
    for contests in world.days(days, seed=7):
        for pair in (pair for found in contests for pair in found.pairs):
            covered += pair.low <= 0.0 <= pair.high
            ratios += pair.ratio_low <= 1.0 <= pair.ratio_high
            pairs += 1
        judged = family([found.pairs for found in contests])
        false += any(pair.told_apart(0.95) for point in judged for pair in point)
    # pairs of a day share runs and scatter, so that 150 days know the coverage to about 1 %; it lies near 97.5 % where
    # nothing is undeclared, for chance can add scatter to what is stated and never take some away
    assert 0.93 <= covered / pairs <= 0.98
    assert 0.93 <= ratios / pairs <= 0.98
    # 5 % of days, and twice the standard deviation of a count of 150 at 5 %, 1.8 %
    assert false / days <= 0.05 + 2 * 0.018


def test_one_catalyst_that_scatters_ten_times_more_does_not_make_the_others_look_different() -> None:
    world = World((0.5,) * 6, 3, 3, 0.01, 0.03, (0.01,) * 5 + (0.1,))
    covered = pairs = false = 0
    for contests in world.days(150, seed=3):
        for pair in (pair for found in contests for pair in found.pairs):
            covered += pair.low <= 0.0 <= pair.high
            pairs += 1
        judged = family([found.pairs for found in contests])
        false += any(pair.told_apart(0.95) for point in judged for pair in point)
    assert 0.93 <= covered / pairs <= 0.98
    assert false / 150 <= 0.05 + 2 * 0.018


@pytest.mark.parametrize(("undeclared", "shared"), [(0.0, 0.0), (0.02, 0.03), (0.02, 0.2)])
def test_intervals_of_different_catalysts_hold_the_true_difference_and_ratio(
    undeclared: float, shared: float
) -> None:
    world = World((0.6, 0.5, 0.3, 0.1), 3, 3, 0.01, shared, (undeclared,) * 4)
    covered = ratios = pairs = 0
    for contests in world.days(200, seed=5):
        for level, found in enumerate(contests):
            for pair in found.pairs:
                a, b = (world.truth(int(name), level) for name in (pair.one, pair.other))
                covered += pair.low <= a - b <= pair.high
                ratios += pair.ratio_low <= a / b <= pair.ratio_high
                pairs += 1
    assert 0.93 <= ratios / pairs <= 0.98
    # the law of propagation takes u(flow) at the flow as measured: at 20 % it is short by the flow's own error
    assert (0.93 if shared < 0.1 else 0.91) <= covered / pairs <= 0.98


def test_intervals_at_common_potentials_hold_the_true_difference() -> None:
    """Bell-shaped series at potentials that are not those of the comparison, with errors in both axes."""
    generator = np.random.default_rng(3)

    def truth(catalyst: int, e: float) -> float:
        return float((0.5 - 0.06 * catalyst) * np.exp(-(((e + 1.0 + 0.02 * catalyst) / 0.22) ** 2)))

    levels, covered, ratios, pairs = [-0.75, -0.85, -0.95, -1.05, -1.15], 0, 0, 0
    for _ in range(100):
        reference, flow = 0.005 * generator.standard_normal(), 1 + 0.03 * generator.standard_normal()
        electrode = 0.02 * generator.standard_normal((3, 2))
        catalyst, level, made_with, y, e = [], [], [], [], []
        for c in range(3):
            for set_volt in levels:
                for r in range(2):
                    true_volt = set_volt + 0.01 * c + 0.003 * generator.standard_normal()
                    own = 1 + 0.01 * generator.standard_normal() + electrode[c, r]
                    y.append(truth(c, true_volt) * own * flow)
                    e.append(true_volt + reference + 0.002 * generator.standard_normal())
                    catalyst.append(str(c))
                    level.append(str(set_volt))
                    made_with.append(f"{c}/{r}")
        x, potential = stacked(numbers(y, 0.01, 0.03), numbers(e, 0.002, 0.005, relative=False))
        series = pool_series(x, potential, catalyst, level, made_with)
        for at in common_potentials(list(ranges(series).values())):
            there = interpolate(series, at, logarithm=False)
            for pair in contest(there.mean, there.owners, series.scatter).pairs:
                a, b = truth(int(pair.one), at), truth(int(pair.other), at)
                covered += pair.low <= a - b <= pair.high
                ratios += pair.ratio_low <= a / b <= pair.ratio_high
                pairs += 1
    # between the points the way of the cubic counts as unknown for each series by itself, though like series bend
    # alike: the intervals are a little too wide there, never too narrow
    assert 0.93 <= covered / pairs <= 0.985
    assert 0.93 <= ratios / pairs <= 0.995
