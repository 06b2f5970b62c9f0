"""Truths to start a test from: small days, quick to write and to tally, with every product phase in them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from datetime import datetime, timedelta
from typing import Any

import numpy as np
from tests.forward.truth import Compartment, Curve, DayTruth, Hold, Resonance

MORNING = datetime(2043, 5, 18, 9, 30)

EFFICIENCIES: tuple[Mapping[str, float], ...] = (
    {
        "hydrogen": 0.312,
        "carbon monoxide": 0.097,
        "methane": 0.0214,
        "ethylene": 0.271,
        "ethane": 0.0043,
        "formate": 0.118,
        "ethanol": 0.092,
        "n-propanol": 0.031,
        "acetate": 0.0127,
    },
    {
        "hydrogen": 0.451,
        "carbon monoxide": 0.183,
        "methane": 0.0087,
        "ethylene": 0.103,
        "ethane": 0.0091,
        "formate": 0.164,
        "ethanol": 0.038,
        "n-propanol": 0.014,
        "acetate": 0.0062,
    },
)

GAS_CURVES = {
    ("TCD", "hydrogen"): Curve(0.41),
    ("FID", "carbon monoxide"): Curve(0.93),
    ("FID", "methane"): Curve(0.95),
    ("FID", "ethylene"): Curve(1.86),
    ("FID", "ethane"): Curve(1.89),
}

RESONANCES = (
    Resonance("formate", "CH", 1),
    Resonance("ethanol", "CH3", 3),
    Resonance("ethanol", "CH2", 2),
    Resonance("n-propanol", "CH3", 3),
    Resonance("acetate", "CH3", 3),
)

CATHOLYTE = Compartment("catholyte", 1.0, (31.0e-6,), (0.52e-6,), (None,))


def uneven_log(
    seed: int, rows: int = 60, seconds: float = 1500.0, milliampere: float = 12.0
) -> dict[str, Any]:
    """Times with uneven steps, a current that decays, jumps and wavers, and a potential that wanders."""
    generator = np.random.default_rng(seed)
    inner = np.sort(generator.uniform(1.0, seconds - 1.0, rows - 2))
    time = np.round(np.concatenate([[0.0], inner, [seconds]]), 3)
    shape = 1 + 0.4 * np.exp(-time / 300.0) - 0.25 * (time > 0.6 * seconds) + 0.05 * np.sin(time / 40.0)
    potential = -0.93 + 0.02 * np.sin(time / 200.0) + 0.01 * (time > 0.6 * seconds)
    return {
        "time_second": time,
        "current_ampere": -1e-3 * milliampere * shape,
        "potential_rhe_volt": potential,
    }


def hold(number: int, **changes: Any) -> Hold:
    """Run ``number`` (0, 1, ...) of a small day."""
    plain: dict[str, Any] = {
        "name": f"r{number + 1}",
        **uneven_log(number + 11, milliampere=(12.0, 7.5)[number % 2]),
        "efficiency": EFFICIENCIES[number % 2],
        "catalyst": ("mesh", "foam")[number % 2],
        "electrode": ("m1", "s1")[number % 2],
        "level": ("-1.5 V", "-1.4 V")[number % 2],
        "started": MORNING + timedelta(minutes=40 * number),
        "start_second": (13.7, None)[number % 2],
        "stop_second": (1450.3, None)[number % 2],
        "electrode_area_m2": (1.0e-4, 0.72e-4)[number % 2],
        "resistance_ohm": (11.3, 24.0)[number % 2],
        "compensated": (0.0, 0.85)[number % 2],
        "inlet_mol_per_s": (14.8e-6, 7.3e-6)[number % 2],
        "injections_second": (400.0, 800.0, 1300.0),
        "compartments": (CATHOLYTE,),
    }
    return Hold(**{**plain, **changes})


def small_day(holds: Mapping[str, Any] | None = None, **changes: Any) -> DayTruth:
    """Two runs of two catalysts; ``holds`` changes both of them, ``changes`` the day."""
    runs = tuple(replace(hold(number), **(holds or {})) for number in range(2))
    plain: dict[str, Any] = {"holds": runs, "gas_curves": GAS_CURVES, "resonances": RESONANCES}
    return DayTruth(**{**plain, **changes})
