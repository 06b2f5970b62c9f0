"""Current that an injection from an unflushed headspace belongs to."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.integrate import quad

from coulombook.cell.headspace import (
    MixedCurrent,
    filled_share,
    mixed_current_ampere,
    mixed_current_with_slope,
)


def _trace(samples: int = 81, seed: int = 30) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    time = np.concatenate(([0.0], np.cumsum(rng.uniform(0.1, 60.0, samples - 1))))
    return time, -1.0 - 0.3 * rng.standard_normal(samples)


def _by_quadrature(time: np.ndarray, current: np.ndarray, start: float, at: float, tau: float) -> float:
    """The defining integral, knot by knot, by adaptive quadrature."""
    knots = np.concatenate(([start], time[(time > start) & (time < at)], [at]))
    total = 0.0
    for a, b in itertools.pairwise(knots):
        low = max(a, b - 45.0 * tau)  # the rest is below exp(-45)
        total += quad(
            lambda s: -np.interp(s, time, current) * np.exp(-(at - s) / tau) / tau,
            low,
            b,
            epsabs=1e-15,
            epsrel=1e-13,
        )[0]
    return total


def test_constant_current_builds_up_as_one_minus_the_exponential() -> None:
    # I_k = I (1 - exp(-t/tau)) for a current I from the start; at t = tau ln 2 exactly half of it
    time, current = np.array([0.0, 7.0, 1000.0]), np.full(3, -0.08)
    seen = mixed_current_ampere(time, current, 0.0, [100.0 * np.log(2.0), 300.0], 100.0)
    np.testing.assert_allclose(seen, [0.04, 0.08 * (1 - np.exp(-3.0))], rtol=1e-14)
    assert filled_share(np.array([300.0]), np.array([100.0])) == pytest.approx(1 - np.exp(-3.0), rel=1e-15)


def test_rising_current_lags_by_tau() -> None:
    # x = c t from t = 0: the solution of tau m' + m = c t is m = c (t - tau + tau exp(-t/tau))
    time = np.array([0.0, 13.0, 400.0, 900.0])
    tau, at = 120.0, np.array([50.0, 400.0, 850.0])
    expected = 1e-4 * (at - tau + tau * np.exp(-at / tau))
    np.testing.assert_allclose(mixed_current_ampere(time, -1e-4 * time, 0.0, at, tau), expected, rtol=1e-13)


@pytest.mark.parametrize("tau", [0.5, 3.0, 30.0, 500.0, 2e4])
def test_irregular_steps_of_any_length_agree_with_quadrature(tau: float) -> None:
    # steps of 0.1 s to 60 s: from far shorter to far longer than tau
    time, current = _trace()
    at = [5.0, 100.0, 700.0, 700.0, 2000.0]
    expected = [_by_quadrature(time, current, 3.0, t, tau) for t in at]
    # the quadrature is asked for 1e-13 on each of up to 70 stretches
    np.testing.assert_allclose(mixed_current_ampere(time, current, 3.0, at, tau), expected, rtol=1e-11)


def test_steps_near_the_length_that_is_gathered_in_blocks_agree_with_quadrature() -> None:
    rng = np.random.default_rng(31)
    tau = 40.0
    steps = tau * rng.uniform(0.02, 0.2, 400)  # both sides of 0.1 tau, mixed
    time = np.concatenate(([0.0], np.cumsum(steps)))
    current = -1.0 - 0.3 * rng.standard_normal(time.size)
    at = [float(time[200]), float(time[-1])]
    expected = [_by_quadrature(time, current, 0.0, t, tau) for t in at]
    np.testing.assert_allclose(mixed_current_ampere(time, current, 0.0, at, tau), expected, rtol=1e-11)


@pytest.mark.parametrize("tau", [3.0, 30.0, 500.0])
def test_derivative_in_ln_tau_agrees_with_differences(tau: float) -> None:
    time, current = _trace()
    at = [50.0, 700.0, 2000.0]
    h = 1e-4
    up, down = (mixed_current_ampere(time, current, 3.0, at, tau * np.exp(s * h)) for s in (1, -1))
    _, slope = mixed_current_with_slope(time, current, 3.0, at, tau)
    # central differences: h^2 times a third derivative of the order of a few
    np.testing.assert_allclose(slope, (up - down) / (2 * h), atol=1e-7)


def test_injections_together_are_the_injections_one_by_one() -> None:
    time, current = _trace()
    at = [100.0, 650.0, 651.0, 1900.0]
    together = mixed_current_ampere(time, current, 0.0, at, 200.0)
    alone = [mixed_current_ampere(time, current, 0.0, [t], 200.0)[0] for t in at]
    np.testing.assert_allclose(together, alone, rtol=1e-13)


def test_order_of_the_injections_does_not_matter() -> None:
    time, current = _trace()
    at, order = np.array([100.0, 650.0, 651.0, 1900.0]), np.array([2, 0, 3, 1])
    for of_order in (
        lambda times: mixed_current_ampere(time, current, 0.0, times, 200.0),
        lambda times: MixedCurrent.of_trace(time, current, 0.0, times, 200.0).coefficients_ampere[0],
    ):
        np.testing.assert_array_equal(of_order(at[order]), of_order(at)[order])


def test_injection_at_the_start_finds_an_empty_headspace() -> None:
    time, current = _trace()
    value, slope = mixed_current_with_slope(time, current, 3.0, [3.0, 3.0, 90.0], 50.0)
    assert value[:2].tolist() == [0.0, 0.0]
    assert slope[:2].tolist() == [0.0, 0.0]
    assert value[2] > 0.0


@pytest.mark.parametrize(
    ("at", "tau", "message"),
    [
        ([1.0], 60.0, "before the start at 3 s"),
        ([1e9], 60.0, "outside the trace"),
        ([50.0, float("nan")], 60.0, "time nan s is before the start"),
        ([100.0], 0.0, "mixing time is 0 s"),
        ([100.0], float("nan"), "above zero"),
    ],
)
def test_impossible_times_are_refused(at: list[float], tau: float, message: str) -> None:
    time, current = _trace()
    with pytest.raises(ValueError, match=message):
        mixed_current_ampere(time, current, 3.0, at, tau)
    with pytest.raises(ValueError, match=message):
        MixedCurrent.of_trace(time, current, 3.0, at, tau)


@pytest.mark.parametrize("tau", [8.0, 60.0, 900.0])
@pytest.mark.parametrize("shape", ["steps", "noise", "pulses"])
def test_series_holds_1e_8_over_its_whole_range(tau: float, shape: str) -> None:
    time = np.arange(0.0, 3600.0, 0.5)
    rng = np.random.default_rng(32)
    current = {
        "steps": np.where(time < 1200.0, -0.1, -0.3),
        "noise": -0.1 + 0.02 * rng.standard_normal(time.size),
        "pulses": -0.1 * (np.floor(time / 30.0) % 2),
    }[shape]
    at = [20.0, 1210.0, 3500.0]
    series = MixedCurrent.of_trace(time, current, 0.0, at, tau)
    taus = tau * np.exp(np.linspace(-1.0, 1.0, 31) * np.log(1.5))
    exact = [mixed_current_with_slope(time, current, 0.0, at, float(one)) for one in taus]
    value, slope = series.value_and_slope(np.broadcast_to(taus[:, None], (31, 3)))
    np.testing.assert_allclose(value, [one[0] for one in exact], rtol=1e-8)
    # the derivative of a series loses about as many digits as it has terms
    scale = np.abs([one[0] for one in exact])
    assert np.abs(slope * taus[:, None] - np.array([one[1] for one in exact]) <= 1e-7 * scale).all()


@pytest.mark.parametrize("half_range", [0.8, 1.6, 3.0])
def test_series_reaches_as_far_as_is_asked_for(half_range: float) -> None:
    time = np.arange(0.0, 3600.0, 0.5)
    current = -0.1 * (np.floor(time / 30.0) % 2)
    at = [20.0, 1210.0, 3500.0]
    series = MixedCurrent.of_trace(time, current, 0.0, at, 100.0, half_range)
    taus = 100.0 * np.exp(np.linspace(-1.0, 1.0, 31) * half_range)
    value, _ = series.value_and_slope(np.broadcast_to(taus[:, None], (31, 3)))
    exact = [mixed_current_ampere(time, current, 0.0, at, float(one)) for one in taus]
    # the first coefficient is 0.03 or so, and the least value e^-20 of it or less
    np.testing.assert_allclose(value, exact, rtol=1e-8, atol=1e-9)
    assert series.covers(taus[:, None] * np.ones(3)).all()


def test_series_says_where_it_ends() -> None:
    time, current = _trace()
    series = MixedCurrent.of_trace(time, current, 0.0, [100.0, 500.0], 90.0)
    inside = series.covers(np.array([[60.0, 135.0], [59.9, 135.1], [90.0, np.nan]]))
    assert inside.tolist() == [[True, True], [False, False], [True, False]]


def test_series_of_several_runs_join_in_order() -> None:
    time, current = _trace()
    parts = [
        MixedCurrent.of_trace(time, current, 0.0, [100.0, 500.0], 90.0),
        MixedCurrent.of_trace(time, 2.0 * current, 0.0, [300.0], 400.0),
    ]
    joined = MixedCurrent.join(parts)
    assert len(joined) == 3
    tau = np.array([[80.0, 100.0, 450.0], [90.0, 90.0, 400.0]])
    value, slope = joined.value_and_slope(tau)
    for part, columns in zip(parts, (slice(0, 2), slice(2, 3)), strict=True):
        expected = part.value_and_slope(tau[:, columns])
        np.testing.assert_allclose(value[:, columns], expected[0], rtol=1e-14)
        np.testing.assert_allclose(slope[:, columns], expected[1], rtol=1e-12)
    assert len(MixedCurrent.join([])) == 0
