"""Charging currents and capacitance from voltammograms."""

from __future__ import annotations

import numpy as np
import pytest

from coulombook.cell.capacitance import charging_current_ampere, fit_capacitance

CAPACITANCE, RATE = 1.0e-3, 0.05
CHARGING = CAPACITANCE * RATE


def _voltammogram(
    *,
    cycles: float = 2.0,
    begin: float = 0.0,
    low: float = -0.25,
    high: float = -0.15,
    per_sweep: int = 101,
    noise_volt: float = 0.0,
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Potential, current and cycle of a triangular scan; ``begin`` is where in the cycle it starts, 0 to 1.

    On top of the charging current: a leak that grows with potential and a current that both sweeps carry.
    """
    lap = 2.0 * (high - low)
    path = np.arange(0.0, cycles * lap + 1e-12, (high - low) / (per_sweep - 1))
    within = np.mod(path + begin * lap, lap)
    rising = within < high - low
    potential = np.where(rising, low + within, 2.0 * high - low - within)
    current = np.where(rising, CHARGING, -CHARGING) + 1e-4 * (potential + 0.2) + 3e-6
    noise = noise_volt * np.random.default_rng(40).standard_normal(path.size)
    return potential + noise, current, np.floor(path / lap + 1e-9) + 1.0


@pytest.mark.parametrize("begin", [0.0, 0.1, 0.25, 0.5, 0.6])
@pytest.mark.parametrize("with_column", [True, False])
def test_leak_and_common_current_cancel_wherever_the_scan_starts(begin: float, with_column: bool) -> None:
    potential, current, cycle = _voltammogram(cycles=3.3, begin=begin)
    found = charging_current_ampere(potential, current, cycle if with_column else None)
    # the same straight line is taken off on both sweeps: what is left is rounding
    assert found == pytest.approx(CHARGING, rel=1e-12)


def test_single_cycle_is_enough() -> None:
    potential, current, _ = _voltammogram(cycles=1.0, begin=0.3)
    assert charging_current_ampere(potential, current) == pytest.approx(CHARGING, rel=1e-12)


@pytest.mark.parametrize("with_column", [True, False])
def test_last_whole_cycle_is_taken_and_the_broken_one_is_not(with_column: bool) -> None:
    potential, current, cycle = _voltammogram(cycles=3.7)
    # every cycle has its own size; the fourth ends on its way down
    current = current * np.select([cycle == 1.0, cycle == 2.0, cycle == 3.0], [5.0, 3.0, 2.0], 7.0)
    found = charging_current_ampere(potential, current, cycle if with_column else None)
    # the leak is doubled on both sweeps alike
    assert found == pytest.approx(2.0 * CHARGING, rel=1e-12)


def test_chosen_cycle_is_taken() -> None:
    potential, current, cycle = _voltammogram(cycles=3.0)
    current = current * np.where(cycle == 2.0, 4.0, 1.0)
    assert charging_current_ampere(potential, current, cycle, 2.0) == pytest.approx(4.0 * CHARGING, rel=1e-12)
    # told from the turning points, cycles count from 1
    assert charging_current_ampere(potential, current, None, 2.0) == pytest.approx(4.0 * CHARGING, rel=1e-12)


def test_only_the_central_fifth_of_the_window_counts() -> None:
    potential, current, cycle = _voltammogram()
    # window -0.24 .. -0.20 V: its central fifth is -0.224 .. -0.216 V; a step further than a sample away is not seen
    spoiled = np.where(np.abs(potential + 0.22) > 0.0055, 1.0, current)
    found = charging_current_ampere(potential, spoiled, cycle, None, -0.24, -0.20)
    assert found == pytest.approx(CHARGING, rel=1e-12)


def test_uneven_samples_weigh_by_potential() -> None:
    # three samples a sweep; the central fifth is 0.4 to 0.6. Rising: i = e up to 0.5, then 0.5 + 3 (e - 0.5), so the
    # mean is half of 0.45 and half of 0.65. Falling: 4 (e - 0.5) down to 0.5, then 0: half of 0.2 and half of 0
    potential = np.array([0.0, 0.5, 1.0, 0.5, 0.0])
    current = np.array([0.0, 0.5, 2.0, 0.0, 0.0])
    assert charging_current_ampere(potential, current) == pytest.approx(0.5 * (0.55 - 0.1), rel=1e-12)


@pytest.mark.parametrize("with_column", [True, False])
def test_noise_of_the_potential_does_not_swap_the_sweeps(with_column: bool) -> None:
    # steps of 0.1 mV under noise of 1 mV: almost half of all steps go the wrong way
    potential, current, cycle = _voltammogram(per_sweep=1001, noise_volt=1e-3)
    found = charging_current_ampere(potential, current, cycle if with_column else None)
    # the ends of the fifth move by about the noise, 1 mV of 20 mV, in the leak of 0.1 uA/mV alone
    assert found == pytest.approx(CHARGING, rel=2e-3)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"chosen_cycle": 9.0}, "no cycle 9; the last one is 2"),
        ({"window_low_volt": -0.5}, "does not cross the window -0.5 V to -0.15 V"),
        ({"window_high_volt": 0.1}, "the cycle runs from -0.25 V to -0.15 V"),
        ({"window_low_volt": -0.1, "window_high_volt": -0.2}, "must start below where it ends"),
    ],
)
def test_window_or_cycle_that_is_not_there_is_refused(change: dict[str, float], message: str) -> None:
    potential, current, cycle = _voltammogram(cycles=2.0 - 1e-6)
    with pytest.raises(ValueError, match=message):
        charging_current_ampere(potential, current, cycle, **change)


def test_single_sweep_is_refused() -> None:
    up = np.linspace(0.0, 0.1, 50)
    with pytest.raises(ValueError, match="the falling sweep of cycle 1 does not cross"):
        charging_current_ampere(up, np.ones(50))


def test_potential_that_stands_still_is_refused() -> None:
    with pytest.raises(ValueError, match="does not move"):
        charging_current_ampere(np.zeros(50), np.ones(50))
    with pytest.raises(ValueError, match="3 sample"):
        charging_current_ampere(np.zeros(3), np.ones(3))
    with pytest.raises(ValueError, match="not a finite number"):
        charging_current_ampere(np.array([0.0, 1.0, np.nan, 1.0, 0.0]), np.ones(5))


def test_capacitance_is_the_slope_with_its_uncertainty() -> None:
    # v = 1, 2, 3, 4; i = 2 v + 1 with residuals r = (1, -1, -1, 1)/10, which a line cannot follow (they are orthogonal
    # to 1 and v): slope 2, intercept 1, s^2 = 0.04/2 = 0.02, Sxx = 5, u = sqrt(0.02/5)
    rate = np.array([1.0, 2.0, 3.0, 4.0])
    fit = fit_capacitance(rate, 2.0 * rate + 1.0 + np.array([0.1, -0.1, -0.1, 0.1]))
    assert fit.capacitance_farad == pytest.approx(2.0, rel=1e-14)
    assert fit.intercept_ampere == pytest.approx(1.0, rel=1e-13)
    assert fit.u_capacitance_farad == pytest.approx(np.sqrt(0.02 / 5), rel=1e-12)
    assert fit.residual_sd_ampere == pytest.approx(np.sqrt(0.02), rel=1e-12)
    # total sum of squares 4 x 5 + 0.04
    assert fit.r_squared == pytest.approx(1.0 - 0.04 / 20.04, rel=1e-14)


def test_exponent_tells_charging_from_diffusion() -> None:
    rate = np.array([0.01, 0.02, 0.05, 0.1])
    assert fit_capacitance(rate, 3e-3 * rate).exponent == pytest.approx(1.0, rel=1e-12)
    assert fit_capacitance(rate, 3e-3 * np.sqrt(rate)).exponent == pytest.approx(0.5, rel=1e-12)
    assert np.isnan(fit_capacitance(rate, 3e-3 * rate - 1e-4).exponent)


def test_two_rates_give_a_slope_but_no_uncertainty() -> None:
    fit = fit_capacitance(np.array([0.02, 0.1]), np.array([2e-5, 1e-4]))
    assert fit.capacitance_farad == pytest.approx(1e-3, rel=1e-12)
    assert np.isnan(fit.u_capacitance_farad)
    assert np.isnan(fit.residual_sd_ampere)


def test_single_rate_is_refused() -> None:
    with pytest.raises(ValueError, match="need as many different x; there are 1"):
        fit_capacitance(np.array([0.02, 0.02]), np.array([2e-5, 2.1e-5]))


def _bent(exponent: float, scatter: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    rate = np.array([0.01, 0.02, 0.04, 0.08, 0.16, 0.32])
    noise = np.random.default_rng(3).standard_normal(rate.size)
    return rate, 2e-4 * rate**exponent * (1.0 + scatter * noise)


def test_power_law_is_chosen_by_evidence_and_its_exponent_recovered() -> None:
    fit = fit_capacitance(*_bent(0.85))
    assert fit.form == "power law"
    assert fit.exponent == pytest.approx(0.85, rel=1e-12)
    # i / v at the geometric mean of the rates, 0.01 x 2^2.5 V/s
    assert fit.power_capacitance_farad == pytest.approx(2e-4 * (0.01 * 2**2.5) ** -0.15, rel=1e-6)
    noisy = fit_capacitance(*_bent(0.85, 0.01))
    assert noisy.form == "power law"
    # 99.9 % of a t of 4 degrees of freedom
    assert abs(noisy.exponent - 0.85) < 8.6 * noisy.u_exponent
    # s of ln i is 0.01; the logs of the rates have the sum of squares 17.5 ln(2)^2
    assert noisy.u_exponent == pytest.approx(0.01 / (17.5**0.5 * np.log(2.0)), rel=0.7)


def test_line_stays_where_nothing_speaks_against_it() -> None:
    rate, current = _bent(1.0, 0.01)
    assert fit_capacitance(rate, current).form == "line"
    exact = fit_capacitance(rate, 1e-3 * rate)
    assert exact.form == "line"
    assert exact.u_exponent == pytest.approx(0.0, abs=1e-9)
    # an intercept gives an exponent below 1, but no power law
    shifted = fit_capacitance(rate, 1e-3 * rate + 1e-5)
    assert shifted.exponent < 0.99
    assert shifted.form == "line"


def test_three_rates_cannot_tell_the_laws_apart() -> None:
    rate, current = _bent(0.8)
    fit = fit_capacitance(rate[:3], current[:3])
    assert fit.form == "line"
    assert np.isnan(fit.evidence)
