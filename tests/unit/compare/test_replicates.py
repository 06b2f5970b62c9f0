"""Replicates pooled into points of series."""

from __future__ import annotations

import numpy as np
import pytest
from tests.unit.compare.compared_runs import numbers, stacked

from coulombook.compare.replicates import Series, pool_series
from coulombook.uncertainty.linearised import covariance, standard_uncertainty


def _series(values: list[float], own: float, level: str, electrode: str, shared: float = 0.0) -> Series:
    x, e = stacked(numbers(values, own, shared), numbers([-1.0] * len(values), 0.001))
    return pool_series(x, e, ["a"] * len(values), list(level), list(electrode))


def test_what_replicates_share_does_not_average_out() -> None:
    found = _series([0.5, 0.5], 0.0, "xx", "mn", shared=0.02)
    assert standard_uncertainty(found.mean)[0] == pytest.approx(0.01)
    assert standard_uncertainty(_series([0.5, 0.5], 0.02, "xx", "mn").mean)[0] == pytest.approx(0.01 / 2**0.5)


def test_disagreeing_replicates_widen_their_mean_by_what_is_not_explained() -> None:
    found = _series([0.40, 0.44], 0.0, "xx", "mn")
    # no stated uncertainty: s = 0.0283, s/sqrt(2) = 0.02
    assert found.deviation[0] == pytest.approx(0.0008**0.5)
    assert standard_uncertainty(found.mean)[0] == pytest.approx(0.02)


def test_agreement_is_the_chi_square_of_the_stated_uncertainties() -> None:
    found = _series([0.40, 0.44], 0.02, "xx", "mn")
    # s^2 = 0.0008 over (0.008^2 + 0.0088^2)/2 = 7.07e-5 is chi-square 11.31 with one degree of freedom
    assert found.agreement[0] == pytest.approx(7.7e-4, rel=0.02)


def test_an_electrode_that_gives_more_does_so_at_every_level() -> None:
    found = _series([0.40, 0.44, 0.40, 0.44], 0.0, "xxyy", "mnmn")
    c = covariance(found.mean)
    assert c[0, 1] == pytest.approx(c[0, 0])
    fresh = _series([0.40, 0.44, 0.40, 0.44], 0.0, "xxyy", "mnop")
    assert covariance(fresh.mean)[0, 1] == 0.0


def test_two_electrodes_compared_at_two_levels_are_one_comparison() -> None:
    assert _series([0.40, 0.44, 0.40, 0.44], 0.0, "xxyy", "mnmn").scatter.freedom[0] == pytest.approx(1.0)
    assert _series([0.40, 0.44, 0.40, 0.44], 0.0, "xxyy", "mnop").scatter.freedom[0] == pytest.approx(2.0)


def test_electrodes_count_by_the_comparisons_that_do_not_follow_from_others() -> None:
    def freedom(values: list[float], level: str, electrode: str) -> float:
        return float(_series(values, 0.0, level, electrode).scatter.freedom[0])

    pair = [0.40, 0.44]
    # an electrode that was used alone is compared with none
    assert freedom([*pair, *pair, 0.42], "xxyyz", "mnmno") == pytest.approx(1.0)
    # two pairs that never met, each at two levels
    assert freedom(pair * 4, "xxyyzzww", "mnmnopop") == pytest.approx(2.0)
    # m and n, n and o: m and o follow from that
    assert freedom(pair * 3, "xxyyzz", "mnnomo") == pytest.approx(2.0)


def test_runs_without_the_quantity_are_left_out() -> None:
    found = _series([0.40, float("nan"), 0.44], 0.01, "xxy", "mnm")
    assert [point.rows.tolist() for point in found.points] == [[0], [2]]
    assert found.electrodes.tolist() == [1, 1]


def test_points_of_a_catalyst_are_listed_by_potential() -> None:
    x, e = stacked(numbers([0.1, 0.2, 0.3], 0.01), numbers([-0.9, -1.1, -1.0], 0.001))
    found = pool_series(x, e, ["a"] * 3, ["x", "y", "z"], ["m"] * 3)
    assert found.of("a").tolist() == [1, 2, 0]
    assert np.isnan(found.deviation).all()
