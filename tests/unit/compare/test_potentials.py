"""Series at common potentials: inside the range, monotone, and with the uncertainty of both axes."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator
from tests.unit.compare.compared_runs import numbers, stacked

from coulombook.compare.potentials import common_potentials, interpolate, ranges
from coulombook.compare.replicates import Series, pool_series
from coulombook.uncertainty.linearised import standard_uncertainty

E = [-0.75, -0.85, -0.95, -1.05, -1.15]
FE = [0.10, 0.28, 0.45, 0.52, 0.47]


def _series(
    y: list[float] = FE, e: list[float] = E, own: float = 0.01, u_e: float = 0.004, shared_e: float = 0.0
) -> Series:
    x, potential = stacked(numbers(y, own), numbers(e, u_e, shared_e, relative=False))
    return pool_series(x, potential, ["a"] * len(y), [f"{one}" for one in e], ["m"] * len(y))


@pytest.mark.parametrize("logarithm", [False, True])
@pytest.mark.parametrize("at", [-0.80, -0.95, -1.07, -1.149])
def test_the_value_and_its_uncertainty_are_those_of_draws(at: float, logarithm: bool) -> None:
    found = interpolate(_series(shared_e=0.003), at, logarithm=logarithm)
    generator = np.random.default_rng(11)
    drawn = []
    for _ in range(4000):
        y = np.array(FE) * (1 + 0.01 * generator.standard_normal(5))
        e = np.array(E) + 0.004 * generator.standard_normal(5) + 0.003 * generator.standard_normal()
        order = np.argsort(e)
        cubic = PchipInterpolator(e[order], (np.log(y) if logarithm else y)[order])(at)
        drawn.append(np.exp(cubic) if logarithm else cubic)
    exact = PchipInterpolator(E[::-1], np.log(FE)[::-1] if logarithm else FE[::-1])(at)
    assert found.mean.value[0] == pytest.approx(np.exp(exact) if logarithm else exact)
    straight = np.interp(at, E[::-1], np.log(FE)[::-1] if logarithm else FE[::-1])
    between = abs(found.mean.value[0] - (np.exp(straight) if logarithm else straight)) / 3**0.5
    u = np.hypot(np.std(drawn), between)
    # 4,000 draws know a deviation to 1.1 %; the cubic bends over 4 mV by a few per cent of its slope
    assert standard_uncertainty(found.mean)[0] == pytest.approx(u, rel=0.05)


def test_a_straight_series_is_interpolated_without_a_doubt_about_the_way() -> None:
    found = interpolate(
        _series([0.1, 0.2, 0.3], [-0.8, -0.9, -1.0], own=0.0, u_e=0.004), -0.95, logarithm=False
    )
    assert found.mean.value[0] == pytest.approx(0.25)
    # slope 1/V times u(E) of two points, half each: 0.004/sqrt(2); the third has a say through the slope of the cubic,
    # in which it cancels for a straight line but for its derivative: at most 1.5 times
    assert 0.004 / 2**0.5 <= standard_uncertainty(found.mean)[0] <= 1.5 * 0.004 / 2**0.5


def test_nothing_is_extrapolated() -> None:
    assert interpolate(_series(), -0.749, logarithm=False).owners == ()
    assert interpolate(_series(), -1.151, logarithm=False).owners == ()
    assert interpolate(_series(), -0.75, logarithm=False).owners == ("a",)


def test_a_monotone_series_stays_monotone_between_its_points() -> None:
    steep = _series([0.001, 0.002, 0.5, 0.51], [-0.8, -0.9, -1.0, -1.1])
    values = [interpolate(steep, at, logarithm=False).mean.value[0] for at in np.linspace(-1.1, -0.8, 61)]
    assert (np.diff(values) <= 1e-12).all()
    assert min(values) >= 0.001 - 1e-15  # rounding


def test_a_series_with_a_point_not_above_zero_is_interpolated_as_it_is() -> None:
    zero = _series([0.0, 0.2, 0.4], [-0.8, -0.9, -1.0])
    found = [interpolate(zero, -0.85, logarithm=one).mean.value[0] for one in (True, False)]
    assert found[0] == found[1] > 0


def test_a_single_level_has_no_range() -> None:
    assert ranges(_series([0.1], [-0.8])) == {}


@pytest.mark.parametrize(
    ("spans", "expected"),
    [
        ([(-1.113, -0.735), (-1.142, -0.743), (-1.077, -0.740)], (-1.0, -0.9, -0.8)),
        # the third has nothing in common with the others: it is left out of the common stretch
        ([(-1.0, -0.8), (-1.0, -0.8), (-0.5, -0.3)], (-1.0, -0.9, -0.8)),
        ([(-0.90, -0.69), (-0.88, -0.64)], (-0.85, -0.8, -0.75, -0.7)),
        ([(-0.853, -0.851), (-0.9, -0.8)], (-0.852,)),
        ([(-0.856, -0.847), (-0.9, -0.8)], (-0.85,)),
        ([(-2.0, 0.0), (-2.0, 0.0)], (-2.0, -1.6, -1.0, -0.4, 0.0)),
        ([(-1.0, -0.9)], ()),
        ([(-1.0, -0.9), (-0.9, -0.8)], ()),
        ([], ()),
    ],
)
def test_common_potentials_are_round_and_inside_what_most_have(
    spans: list[tuple[float, float]], expected: tuple[float, ...]
) -> None:
    assert common_potentials(spans) == pytest.approx(expected)
