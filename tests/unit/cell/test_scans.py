"""Voltammograms judged: lag behind the sweep, symmetry, choice of a window, methods compared."""

from __future__ import annotations

import numpy as np
import pytest
from tests.unit.cell.rc_circuit import Record, sweep

from coulombook.cell.capacitance import ScanError
from coulombook.cell.scans import SETTLED_RATIO, ScanFigures, clean_window, scan_figures, with_window

CAPACITANCE, RATE = 1.0e-3, 0.05
CHARGING = CAPACITANCE * RATE
SWEEP = 0.1 / RATE  # duration of one sweep of 0.1 V


def figures(record: Record, rate: float = RATE, **more: float) -> ScanFigures:
    return scan_figures(
        record.potential_volt, record.current_ampere, rate, time_second=record.time_second, **more
    )


def lagging(ratio: float, **more: float) -> Record:
    """RC is ``ratio`` times the duration of a sweep."""
    return sweep(CAPACITANCE, ratio * SWEEP / CAPACITANCE, RATE, **more)  # type: ignore[arg-type]


@pytest.mark.parametrize("cycles", [1, 3])
@pytest.mark.parametrize("ratio", [0.0, 0.005, 0.02, 0.049])
def test_capacitance_of_an_exact_circuit_is_good_to_one_per_cent_while_settled(
    ratio: float, cycles: int
) -> None:
    found = figures(lagging(ratio, cycles=cycles, leak=1e-4))
    assert found.charging_ampere == pytest.approx(CHARGING, rel=0.01)
    assert found.settled(found.transient.rc_second)


@pytest.mark.parametrize("cycles", [1, 3])
@pytest.mark.parametrize("ratio", [0.052, 0.1, 0.3, 1.0])
def test_sweeps_too_fast_for_the_circuit_are_flagged(ratio: float, cycles: int) -> None:
    assert ratio > SETTLED_RATIO
    found = figures(lagging(ratio, cycles=cycles, leak=1e-4))
    assert not found.settled(found.transient.rc_second)


@pytest.mark.parametrize("cycles", [1, 3])
@pytest.mark.parametrize("noise", [0.0, 0.01 * CHARGING])
def test_time_constant_is_found(noise: float, cycles: int) -> None:
    found = figures(lagging(0.1, cycles=cycles, noise=noise)).transient
    assert found.sweep_second == pytest.approx(SWEEP, rel=1e-12)
    # the third cycle is periodic to exp(-20); the sample at the turn belongs to both sweeps, 1/200 of a sweep
    assert found.rc_second == pytest.approx(0.1 * SWEEP, rel=0.02)
    assert found.highest_rc_second == pytest.approx(0.1 * SWEEP, rel=0.05)


def test_lag_does_not_matter_where_the_window_lies_far_from_the_turns() -> None:
    # RC is a twelfth of the sweep; the window is the middle fifth of the scan, its fifth begins 0.48 sweeps after
    # the turn, 5.8 RC for the whole scan and fewer than 8 as well: still unsettled; with a longer scan it settles
    record = sweep(CAPACITANCE, 0.08 * SWEEP / CAPACITANCE, RATE, low=-0.3, high=-0.1)
    whole = figures(record)
    inner = figures(record, window_low_volt=-0.21, window_high_volt=-0.19)
    # RC = 0.08 x 2 s over a sweep of 4 s
    assert whole.transient.rc_second / whole.transient.sweep_second == pytest.approx(0.04, rel=0.02)
    assert whole.settled(0.05 * 4.0)
    assert not whole.settled(0.0501 * 4.0)
    # begins 0.49 x 4 s after the turn: 8 RC up to RC = 0.245 s
    assert inner.settled(0.0612 * 4.0)
    assert not inner.settled(0.0613 * 4.0)


@pytest.mark.parametrize("height", [0.1, 0.5])
def test_capacitance_that_depends_on_potential_is_no_lag(height: float) -> None:
    record = lagging(0.0)
    place = (record.potential_volt + 0.2) / 0.05
    humped = Record(
        record.time_second, record.potential_volt, record.current_ampere * (1.0 + height * (1.0 - place**2))
    )
    found = figures(humped).transient
    assert (found.rc_second, found.highest_rc_second) == (0.0, 0.0)


def test_few_samples_cannot_tell_a_lag() -> None:
    found = figures(lagging(0.3, per_sweep=10)).transient
    assert np.isnan(found.rc_second)


def test_methods_agree_on_a_double_layer_and_part_on_a_lagging_one() -> None:
    quick = figures(lagging(0.0))
    # the step of 0.5 mV at each turn goes from one sweep's current to the other's: a quarter per cent either side
    assert quick.window_ampere == pytest.approx(CHARGING, rel=0.006)
    assert quick.charge_capacitance_farad == pytest.approx(CAPACITANCE, rel=0.006)
    slow = figures(lagging(0.05))
    # h = C v (1 - (exp(-t/RC) + exp(-(T-t)/RC)) / (1 + exp(-T/RC))): its mean lacks 2 RC / T of C v
    assert slow.window_ampere == pytest.approx(0.9 * CHARGING, rel=0.01)
    assert slow.charge_capacitance_farad == pytest.approx(0.9 * CAPACITANCE, rel=0.01)


def test_capacitance_by_charge_needs_no_scan_rate() -> None:
    record = lagging(0.0, leak=3e-4)
    wrong = figures(record, rate=2.0 * RATE, window_low_volt=-0.23, window_high_volt=-0.17)
    assert wrong.charge_capacitance_farad == pytest.approx(CAPACITANCE, rel=1e-9)
    assert wrong.measured_rate_volt_per_second == pytest.approx(RATE, rel=1e-9)
    timeless = scan_figures(record.potential_volt, record.current_ampere, RATE)
    assert np.isnan(timeless.charge_capacitance_farad)
    assert np.isnan(timeless.measured_rate_volt_per_second)


def test_scatter_between_cycles_leaves_the_first_aside() -> None:
    record = lagging(0.0, cycles=4)
    cycle = np.maximum(np.ceil(np.arange(record.time_second.size) / 400), 1.0)
    grown = record.current_ampere * np.select([cycle == 1, cycle == 2, cycle == 3], [2.0, 1.02, 1.01], 1.0)
    found = scan_figures(record.potential_volt, grown, RATE, cycle=cycle)
    # standard deviation of 1.02, 1.01, 1.00
    assert found.cycle_deviation_ampere == pytest.approx(0.01 * CHARGING, rel=1e-6)
    assert np.isnan(figures(lagging(0.0, cycles=2)).cycle_deviation_ampere)


def test_leak_is_measured_and_no_contamination() -> None:
    found = figures(lagging(0.0, leak=5e-4)).symmetry
    assert found.leakage_siemens == pytest.approx(5e-4, rel=1e-9)
    assert found.clean


def reacting(amplitude: float, rate: float = RATE) -> Record:
    """Reduction that sets in at the low end of a scan of 0.3 V: a tenth for each 58 mV."""
    record = sweep(CAPACITANCE, 0.0, rate, low=-0.25, high=0.05, per_sweep=300)
    current = record.current_ampere - amplitude * np.exp(-(record.potential_volt + 0.25) / 0.025)
    return Record(record.time_second, record.potential_volt, current)


def test_reaction_at_one_end_bends_the_common_current() -> None:
    found = figures(reacting(20.0 * CHARGING)).symmetry
    # means of exp(-x/25 mV) over 30-90, 120-180 and 210-270 mV by 25/60 (exp(-a/25) - exp(-b/25)) = 0.1141,
    # 0.00312, 0.00009; half the outer two less the inner, times -20
    assert found.bend == pytest.approx(-20.0 * (0.5 * (0.11411 + 0.00009) - 0.00312), rel=1e-3)
    assert not found.clean


def test_widest_clean_window_is_found_away_from_the_reaction() -> None:
    scans = [figures(reacting(20.0 * CHARGING, rate), rate) for rate in (RATE, 2.0 * RATE)]
    window = clean_window(scans)
    assert window is not None
    low, high = window
    assert low > -0.25 + 0.02
    assert high == pytest.approx(0.05, abs=0.016)
    inside = with_window(scans[0], low, high, RATE)
    assert inside.symmetry.clean
    assert inside.charging_ampere == pytest.approx(CHARGING, rel=1e-6)


def test_no_window_is_found_where_a_reaction_is_everywhere() -> None:
    record = sweep(CAPACITANCE, 0.0, RATE, per_sweep=300)
    place = (record.potential_volt + 0.2) / 0.05
    spoiled = Record(record.time_second, record.potential_volt, record.current_ampere * np.exp(4.0 * place))
    assert clean_window([figures(spoiled)]) is None


def test_window_beyond_the_scan_is_refused() -> None:
    with pytest.raises(ScanError, match="does not cross the window"):
        figures(lagging(0.0), window_low_volt=-0.5)
