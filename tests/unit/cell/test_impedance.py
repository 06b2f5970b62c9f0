"""Impedance: the circuit and its capacitances, and the Kramers-Kronig check."""

from __future__ import annotations

import math

import numpy as np
import pytest

from coulombook.cell.impedance import (
    ImpedanceError,
    brug_capacitance,
    circuit_impedance,
    fit_circuit,
    hsu_mansfeld_capacitance,
)
from coulombook.cell.kramers_kronig import SOUND, kramers_kronig

FREQUENCY = np.geomspace(1e5, 0.1, 43)
OMEGA = 2.0 * np.pi * FREQUENCY


def noisy(z: np.ndarray, share: float, seed: int = 1) -> np.ndarray:
    random = np.random.default_rng(seed).standard_normal((2, z.size))
    return z * (1.0 + share * (random[0] + 1j * random[1]))


@pytest.mark.parametrize(
    ("resistance", "transfer", "admittance", "alpha"),
    [(20.0, 1e4, 5e-5, 0.9), (5.0, 200.0, 1e-3, 0.85), (0.5, 5.0, 1e-2, 0.8)],
)
def test_circuit_is_recovered(resistance: float, transfer: float, admittance: float, alpha: float) -> None:
    found = fit_circuit(FREQUENCY, circuit_impedance(OMEGA, resistance, transfer, admittance, alpha))
    # the search ends when a step changes the cost by 1e-8 of itself
    assert found.resistance_ohm == pytest.approx(resistance, rel=1e-5)
    assert found.transfer_ohm == pytest.approx(transfer, rel=1e-5)
    assert found.admittance == pytest.approx(admittance, rel=1e-5)
    assert found.alpha == pytest.approx(alpha, rel=1e-5)
    assert found.fits
    assert (found.points, found.left_out) == (43, 0)


def test_resistance_agrees_with_its_uncertainty_under_noise() -> None:
    truth = circuit_impedance(OMEGA, 20.0, 1e4, 5e-5, 0.9)
    fits = [fit_circuit(FREQUENCY, noisy(truth, 0.005, seed)) for seed in range(24)]
    score = [(one.resistance_ohm - 20.0) / one.u_resistance_ohm for one in fits]
    # chi-square of 24 at 0.1 and 99.9 %, the upper end alone: the second opinion makes u larger than need be
    assert sum(one**2 for one in score) < 51.2
    assert np.mean([one.u_resistance_ohm for one in fits]) < 5.0 * np.std(
        [one.resistance_ohm for one in fits]
    )


def test_blocking_electrode_has_no_charge_transfer() -> None:
    found = fit_circuit(FREQUENCY, circuit_impedance(OMEGA, 2.0, 1e12, 2e-2, 0.95))
    assert math.isinf(found.transfer_ohm)
    assert math.isnan(found.hsu_mansfeld_farad)
    # the limit of Brug's equation, Q^(1/a) R^((1-a)/a)
    assert found.brug_farad == pytest.approx(0.02 ** (1 / 0.95) * 2.0 ** (0.05 / 0.95), rel=1e-4)


def test_ideal_capacitor_has_its_capacitance_by_either_equation() -> None:
    assert brug_capacitance(3e-4, 1.0, 5.0, 100.0) == pytest.approx(3e-4, rel=1e-14)
    assert hsu_mansfeld_capacitance(3e-4, 1.0, 100.0) == pytest.approx(3e-4, rel=1e-14)


def test_inductive_points_are_left_out() -> None:
    z = circuit_impedance(OMEGA, 5.0, 200.0, 1e-3, 0.85) + 2e-6j * OMEGA
    found = fit_circuit(FREQUENCY, z)
    assert found.left_out == int((z.imag >= 0).sum()) > 0
    # the inductance still acts on the points that are left
    assert found.resistance_ohm == pytest.approx(5.0, rel=0.02)


def test_second_process_at_low_frequency_does_not_move_the_resistance() -> None:
    z = circuit_impedance(OMEGA, 5.0, 20.0, 1e-4, 0.95) + circuit_impedance(OMEGA, 0.0, 300.0, 5e-2, 0.6)
    found = fit_circuit(FREQUENCY, z)
    assert not found.fits
    assert abs(found.resistance_ohm - 5.0) < max(2.0 * found.u_resistance_ohm, 0.05)


@pytest.mark.parametrize(
    ("frequency", "impedance", "message"),
    [
        (FREQUENCY[:4], np.full(4, 1 - 1j), "4 capacitive point"),
        (FREQUENCY, np.full(43, 1 + 1j), "most imaginary parts of the spectrum are positive"),
        (-FREQUENCY, np.full(43, 1 - 1j), "not above zero"),
        (FREQUENCY, np.full(43, np.nan - 1j), "not a finite number"),
    ],
)
def test_what_is_no_spectrum_is_refused(frequency: np.ndarray, impedance: np.ndarray, message: str) -> None:
    with pytest.raises(ImpedanceError, match=message):
        fit_circuit(frequency, impedance)


@pytest.mark.parametrize("alpha", [1.0, 0.9, 0.6])
@pytest.mark.parametrize("transfer", [50.0, 1e9])
def test_clean_spectrum_passes(alpha: float, transfer: float) -> None:
    found = kramers_kronig(FREQUENCY, circuit_impedance(OMEGA, 20.0, transfer, 5e-5, alpha))
    assert found is not None
    # four RC elements a decade follow a single time constant to a few 1e-4
    assert found.residual < 1e-3
    assert found.sound


def test_noise_alone_passes_however_large() -> None:
    clean = circuit_impedance(OMEGA, 20.0, 500.0, 5e-5, 0.9)
    checks = [kramers_kronig(FREQUENCY, noisy(clean, 0.03, seed)) for seed in range(50)]
    assert all(one is not None and one.residual > SOUND for one in checks)
    # three standard deviations: a chance of 1 in 700 each, were fitted residuals independent; they repel each other
    assert all(one is not None and one.sound for one in checks)


@pytest.mark.parametrize("noise", [0.0, 0.003])
@pytest.mark.parametrize("order", [1, -1])
def test_drifting_spectrum_fails(noise: float, order: int) -> None:
    # the resistance grows by half and the capacitance falls by a quarter while the spectrum is taken
    at = np.linspace(0.0, 1.0, OMEGA.size)
    z = np.array(
        [
            circuit_impedance(np.array([w]), 20.0 * (1 + 0.5 * t), 500.0, 5e-5 * (1 - 0.25 * t), 0.9)[0]
            for w, t in zip(OMEGA, at, strict=True)
        ]
    )
    found = kramers_kronig(FREQUENCY[::order], noisy(z, noise)[::order])
    assert found is not None
    assert not found.sound


def test_few_points_cannot_be_checked() -> None:
    assert kramers_kronig(FREQUENCY[:9], circuit_impedance(OMEGA[:9], 20.0, 500.0, 5e-5, 0.9)) is None
