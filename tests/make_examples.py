"""Make the invented example days and their calibrations, byte for byte the same each time.

    python -m tests.make_examples [FOLDER]

writes `example_experiments/` and `calibrations/` under FOLDER (default: the project's own folder). Every
number comes from the forward model with fixed seeds; no laboratory measured any of it.
"""

from __future__ import annotations

import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import date, datetime, timedelta
from pathlib import Path

import numpy as np
from tests.forward.chemistry import FARADAY, GAS_CONSTANT, PRODUCTS
from tests.forward.files import Dialect, Style, write_sheets, write_text
from tests.forward.noise import Draws
from tests.forward.tables import Sheets, Table, sheets
from tests.forward.truth import (
    Compartment,
    Curve,
    DayTruth,
    Drift,
    Error,
    Hold,
    Key,
    Resonance,
    Surface,
    expected,
)

DAY_A = "2043-05-18-mesh-foil-foam"
DAY_B = "2043-06-02-gas-diffusion"
GAS, OLD_GAS, LIQUID = "gc-2043-04", "gc-2042-09", "nmr-2043-05"
SCCM = 1e-6 / 60 * 101325 / (GAS_CONSTANT * 273.15)  # mol/s of gas in one sccm at 0 degC and 101.325 kPa

# True responses: peak area in pA s over ppm (the thermal conductivity detector bends)
GAS_CURVES = {
    ("TCD", "hydrogen"): Curve(0.412, 1.1, -1.9e-6, "quadratic", "1/x^2"),
    ("FID", "carbon monoxide"): Curve(0.931, 0.42, 0.0, "line", "1/x^2"),
    ("FID", "methane"): Curve(0.947, 0.36, 0.0, "line", "1/x^2"),
    ("FID", "ethylene"): Curve(1.862, 0.51, 0.0, "line", "1/x^2"),
    ("FID", "ethane"): Curve(1.894, 0.47, 0.0, "line", "1/x^2"),
}
GAS_LEVELS = {
    "hydrogen": (50.0, 200.0, 1000.0, 5000.0, 10000.0, 20000.0),
    "carbon monoxide": (5.0, 50.0, 500.0, 2500.0, 7500.0, 15000.0),
    "methane": (2.0, 10.0, 100.0, 500.0, 2000.0, 5000.0),
    "ethylene": (2.0, 10.0, 100.0, 500.0, 2000.0, 5000.0),
    "ethane": (2.0, 5.0, 10.0, 50.0, 100.0, 500.0),
}
CHECK_PPM = {
    "hydrogen": 2000.0,
    "carbon monoxide": 1000.0,
    "methane": 500.0,
    "ethylene": 500.0,
    "ethane": 100.0,
}
SIGNALS = (
    Resonance("formate", "CH 8.33", 1),
    Resonance("ethanol", "CH3 1.06", 3),
    Resonance("n-propanol", "CH3 0.77", 3),
    Resonance("n-propanol", "CH2 1.42", 2),
    Resonance("acetate", "CH3 1.79", 3),
    Resonance("acetaldehyde", "CH3 2.13", 3),
    Resonance("allyl alcohol", "CH 5.87", 1),
    Resonance("methanol", "CH3 3.23", 3),
)
LIQUID_CURVES = {
    (one.analyte, one.signal): Curve(slope, form="line through zero", weights="1/x^2")
    for one, slope in zip(SIGNALS, (0.934, 0.988, 0.981, 0.962, 0.973, 0.957, 0.921, 0.966), strict=True)
}
LIQUID_LEVELS = (0.01, 0.03, 0.1, 0.3, 1.0, 3.0, 10.0, 30.0)
SEEN_RATIO = 0.012  # an amount ratio below it is no signal that anybody would integrate
SEEN_PPM = 2.2  # likewise for a peak


@dataclass(frozen=True, slots=True)
class Material:
    """What an invented catalyst does at each level."""

    name: str
    letter: str
    current_milliampere: tuple[float, ...]
    percent: Mapping[str, tuple[float, ...]]
    capacitance_farad: float


MESH = Material(
    "annealed copper mesh",
    "m",
    (3.1, 6.2, 11.4, 18.7, 27.3),
    {
        "hydrogen": (46.0, 37.0, 29.0, 26.0, 29.0),
        "carbon monoxide": (20.0, 11.0, 5.0, 2.2, 1.2),
        "methane": (0.5, 0.8, 2.5, 6.5, 12.0),
        "ethylene": (4.0, 13.0, 26.0, 33.0, 28.0),
        "ethane": (0.9, 0.7, 0.4, 0.2, 0.15),
        "formate": (20.0, 19.0, 12.0, 7.0, 4.5),
        "ethanol": (2.0, 7.0, 11.0, 13.0, 12.0),
        "n-propanol": (1.2, 4.2, 5.5, 4.5, 3.0),
        "acetate": (0.8, 1.1, 1.3, 1.5, 1.6),
        "acetaldehyde": (0.6, 0.9, 0.8, 0.5, 0.3),
        "allyl alcohol": (0.4, 0.6, 0.8, 0.7, 0.5),
        "methanol": (0.3, 0.2, 0.1, 0.1, 0.1),
    },
    1.71e-3,
)
FOIL = Material(
    "polished copper foil",
    "f",
    (1.4, 3.2, 7.1, 13.2, 21.6),
    {
        "hydrogen": (65.0, 57.0, 45.0, 37.0, 41.0),
        "carbon monoxide": (9.0, 7.0, 4.0, 2.0, 1.0),
        "methane": (0.9, 2.4, 9.0, 20.0, 27.0),
        "ethylene": (1.8, 6.0, 14.0, 19.0, 13.0),
        "formate": (17.0, 18.0, 14.0, 9.0, 6.0),
        "ethanol": (1.0, 3.0, 6.0, 7.0, 5.0),
        "n-propanol": (0.5, 1.2, 2.0, 1.6, 1.0),
        "acetate": (0.4, 0.5, 0.6, 0.7, 0.7),
        "acetaldehyde": (0.4, 0.5, 0.5, 0.3, 0.2),
    },
    34.6e-6,
)
FOAM = Material(
    "silver foam",
    "s",
    (1.7, 5.4, 12.8, 23.5, 35.8),
    {
        "hydrogen": (34.0, 17.0, 9.0, 8.0, 11.0),
        "carbon monoxide": (61.0, 77.0, 86.0, 86.0, 81.0),
        "formate": (2.0, 2.5, 3.0, 3.5, 4.0),
    },
    0.236e-3,
)
PAPER = Material(
    "copper on carbon paper",
    "p",
    (50.0, 100.0, 150.0, 200.0),
    {
        "hydrogen": (18.0, 14.0, 15.0, 19.0),
        "carbon monoxide": (24.0, 16.0, 11.0, 8.0),
        "methane": (0.5, 0.8, 1.4, 2.6),
        "ethylene": (28.0, 38.0, 41.0, 39.0),
        "ethane": (0.1, 0.1, 0.1, 0.1),
        "formate": (10.0, 7.0, 5.0, 4.0),
        "ethanol": (10.0, 14.0, 16.0, 15.0),
        "n-propanol": (4.5, 4.5, 4.0, 3.2),
        "acetate": (2.0, 2.8, 3.4, 4.2),
        "acetaldehyde": (0.6, 0.5, 0.4, 0.4),
        "allyl alcohol": (0.5, 0.5, 0.4, 0.3),
    },
    2.3e-3,
)
ALLOY = Material(
    "copper-silver on carbon paper",
    "q",
    (50.0, 100.0, 150.0, 200.0),
    {
        "hydrogen": (12.0, 10.0, 11.0, 14.0),
        "carbon monoxide": (46.0, 36.0, 29.0, 25.0),
        "methane": (0.3, 0.4, 0.8, 1.3),
        "ethylene": (17.0, 25.0, 29.0, 29.0),
        "formate": (11.0, 8.0, 6.0, 5.0),
        "ethanol": (8.0, 13.0, 16.0, 16.0),
        "n-propanol": (2.6, 3.0, 2.8, 2.4),
        "acetate": (1.6, 2.2, 2.9, 3.6),
        "acetaldehyde": (0.4, 0.4, 0.4, 0.3),
    },
    1.9e-3,
)


def efficiencies(material: Material, level: int, generator: np.random.Generator) -> dict[str, float]:
    """Faradaic efficiencies of one piece at one level: the material's, with the spread of real pieces."""
    raw = {
        name: values[level] * (1 + 0.03 * float(generator.standard_normal()))
        for name, values in material.percent.items()
    }
    # the rest goes into products that nobody looks for
    total = 0.992 + 0.006 * float(generator.standard_normal())
    scale = total / sum(raw.values())
    return {name: round(value * scale, 5) for name, value in raw.items()}


def _log_times(seconds: float, rows: int, generator: np.random.Generator) -> np.ndarray:
    """Times of a log that was meant to be regular: steps vary by a few hundredths of a second."""
    regular = np.linspace(0.0, seconds, rows)
    shaken = regular + np.where(
        (regular > 0) & (regular < seconds), 0.08 * generator.uniform(-1, 1, rows), 0.0
    )
    return np.round(shaken, 2)


def _decaying(
    milliampere: float, time: np.ndarray, generator: np.random.Generator, fall: float, noise: float
) -> np.ndarray:
    """A cathodic current that falls by the share ``fall``, with a charging spike and noise. [A]"""
    shape = 1 + fall * (np.exp(-time / 400.0) - 0.35) + 1.5 * np.exp(-time / 2.5)
    return np.round(-milliampere * shape * (1 + noise * generator.standard_normal(time.size)), 4) * 1e-3


def _looked_for(hold: Hold, volume_m3: float, aliquot_m3: float, standard_mol: float) -> tuple[str, ...]:
    """Liquid products whose signal stands out of the noise."""
    seen = []
    for name in hold.products("liquid"):
        made = hold.efficiency[name] * hold.charge_coulomb / (PRODUCTS[name].electrons * FARADAY)
        if made / volume_m3 * aliquot_m3 / standard_mol > SEEN_RATIO:
            seen.append(name)
    return tuple(seen)


# --- calibrations ---


def write_calibrations(folder: Path) -> None:
    """Two gas calibrations (one of them past its time) and a liquid one."""
    _write_gas(folder / GAS, 1.0, 204304, "2043-04-02", "2043-10-02", "C-1187", 3)
    _write_gas(folder / OLD_GAS, 1.043, 204209, "2042-09-11", "2043-03-11", "C-0932", 2)
    generator = np.random.default_rng(204305)
    rows: list[list[object]] = [["analyte", "signal", "amount ratio", "integral ratio"]]
    for (analyte, signal), curve in LIQUID_CURVES.items():
        for ratio in LIQUID_LEVELS:
            for _ in range(2):
                response = curve.response(ratio) * (1 + 0.012 * float(generator.standard_normal()))
                rows.append([analyte, signal, ratio, float(f"{response:.4g}")])
    write_text(folder / LIQUID / "standards.csv", rows, Dialect())
    (folder / LIQUID / "calibration.toml").write_text(
        "# Invented: made by tests/make_examples.py, measured by nobody.\n"
        'kind = "liquid"\nmeasured_on = 2043-05-04\nvalid_until = 2043-11-04\n\n'
        '[curve]\nform = "line through zero"\nweights = "1/x^2"\n',
        encoding="utf-8",
        newline="\n",
    )


def _write_gas(
    folder: Path, sensitivity: float, seed: int, measured: str, until: str, cylinder: str, replicates: int
) -> None:
    generator = np.random.default_rng(seed)
    rows: list[list[object]] = [
        [
            "channel",
            "analyte",
            "mole fraction / ppm",
            "u(mole fraction) / ppm",
            "peak area / pA s",
            "parent",
            "u(parent) / %",
        ]
    ]
    for (channel, analyte), curve in GAS_CURVES.items():
        for ppm in GAS_LEVELS[analyte]:
            for _ in range(replicates):
                area = sensitivity * curve.response(ppm) * (1 + 0.010 * float(generator.standard_normal()))
                rows.append(
                    [channel, analyte, ppm, float(f"{0.004 * ppm:.3g}"), float(f"{area:.5g}"), cylinder, 0.5]
                )
    write_text(folder / "standards.csv", rows, Dialect())
    (folder / "calibration.toml").write_text(
        "# Invented: made by tests/make_examples.py, measured by nobody.\n"
        f'kind = "gas"\nmeasured_on = {measured}\nvalid_until = {until}\n\n'
        '[curve]\nform = "line"\nweights = "1/x^2"\n\n'
        '[curve."hydrogen@TCD"]\nform = "quadratic"\n',
        encoding="utf-8",
        newline="\n",
    )


# --- day A: three catalysts at five potentials, text files ---

# V against Ag/AgCl
SET_POTENTIALS = (-1.36, -1.48, -1.60, -1.72, -1.84)


def day_a() -> DayTruth:
    """Mesh, foil and foam in two stirred H-cells, the outlet flow measured behind a dryer."""
    generator = np.random.default_rng(20430518)
    holds: list[Hold] = []
    morning = datetime(2043, 5, 18, 7, 40)
    slot = 0
    for material in (MESH, FOIL, FOAM):
        for level, potential in enumerate(SET_POTENTIALS):
            for cell, piece in enumerate("12"):
                time = _log_times(1800.0, 1801, generator)
                factor = 1 + 0.04 * float(generator.standard_normal())
                current = _decaying(
                    material.current_milliampere[level] * factor, time, generator, 0.08, 0.003
                )
                resistance = round(27.5 + 2.5 * float(generator.standard_normal()), 1)
                shown = np.round(potential + 2e-4 * generator.standard_normal(time.size), 4)
                compensated = 0.85
                rhe = shown + 0.210 + GAS_CONSTANT * 298.15 * np.log(10) / FARADAY * 6.8
                rhe = rhe - (1 - compensated) * current * resistance
                first = 330.0 + 210.0 * cell
                hold = Hold(
                    name=f"{material.letter}{piece}-{level + 1}",
                    time_second=time,
                    current_ampere=current,
                    potential_rhe_volt=rhe,
                    efficiency=efficiencies(material, level, generator),
                    catalyst=material.name,
                    electrode=f"{material.letter}{piece}",
                    set_potential_volt=potential,
                    started=morning + timedelta(minutes=37 * slot),
                    start_second=4.0,
                    stop_second=1800.0,
                    pH=6.8,
                    resistance_ohm=resistance,
                    compensated=compensated,
                    inlet_mol_per_s=10.0 * SCCM,
                    outlet_mol_per_s=(9.86 + 0.03 * float(generator.standard_normal())) * SCCM,
                    injections_second=tuple(first + 420.0 * number for number in range(4)),
                )
                holds.append(_sampled_a(hold, level))
            slot += 1
    holds = [_mishaps_a(hold) for hold in holds]
    return DayTruth(
        holds=tuple(holds),
        gas_curves=GAS_CURVES,
        liquid_curves=LIQUID_CURVES,
        resonances=SIGNALS,
        standard_resonances=(Resonance("DMSO", "CH3 2.60", 6),),
        standard_amount_mol=0.05e-6,
        title="Invented: annealed mesh and polished foil against silver foam",
        day_date=date(2043, 5, 18),
        outlet_flow="measured",
        reference_volt=0.210,
        reference_volt_per_kelvin=-0.73e-3,
        dead_time_second=25.0,
        drift=_drift(
            (morning, morning + timedelta(hours=4, minutes=55), morning + timedelta(hours=9, minutes=40)),
            generator,
        ),
        blanks={"catholyte": {"formate": 0.9e-3, "ethanol": 1.6e-3, "acetate": 1.2e-3}},
        surfaces=_surfaces((MESH, FOIL, FOAM), generator),
        specific_capacitance=0.28,
        calibration_names=(GAS, LIQUID),
        errors=(
            Error("outlet flow", relative=0.015, shared="day"),
            Error("outlet flow", relative=0.004, shared="run"),
            Error("peak area", relative=0.015, shared="reading"),
            Error("integral", relative=0.020, shared="reading"),
            Error("compartment volume", absolute=0.15e-6, unit="mL", shared="reading"),
            Error("aliquot", relative=0.008, shared="reading"),
            Error("standard amount", relative=0.015, shared="day"),
            Error("electrode area", relative=0.020, shared="run"),
            Error("resistance", relative=0.050, shared="run"),
            Error("pH", absolute=0.03, shared="day"),
        ),
    )


def _sampled_a(hold: Hold, level: int) -> Hold:
    seen = _looked_for(hold, 30e-6, 0.5e-6, 0.05e-6)
    ions = tuple(name for name in ("formate", "acetate") if name in seen)
    stays = {"formate": 0.965, "acetate": 0.955}
    crossed = {"formate": 0.035, "acetate": 0.045}
    if level == 2:
        cathode = Compartment(
            "catholyte", 1.0, (30e-6, 29.0e-6), (0.5e-6, 0.5e-6), (900.0, None), shares=stays, products=seen
        )
    else:
        cathode = Compartment("catholyte", 1.0, (30e-6,), (0.5e-6,), (None,), shares=stays, products=seen)
    anode = Compartment("anolyte", 0.0, (25e-6,), (0.5e-6,), (None,), shares=crossed, products=ions)
    return replace(hold, compartments=(cathode, anode) if ions and level >= 2 else (cathode,))


def _mishaps_a(hold: Hold) -> Hold:
    if hold.name == "f1-3":
        return replace(hold, spoiled={1: 0.22}, note="injection 2: sample loop was not flushed, not used")
    if hold.name == "m2-4":
        return replace(hold, leak=0.19, note="gas line behind the cell found loose after the run")
    if hold.name == "s2-1":
        return replace(hold, note="electrode re-seated before the run")
    return hold


def _drift(at: Sequence[datetime], generator: np.random.Generator) -> dict[Key, Drift]:
    found = {}
    for channel, analyte in GAS_CURVES:
        middle, end = (0.985, 0.962) if channel == "FID" else (1.004, 1.011)
        factors = [1.0, middle, end]
        shaken = tuple(round(one + 0.001 * float(generator.standard_normal()), 4) for one in factors)
        found[(channel, analyte)] = Drift(1e-6 * CHECK_PPM[analyte], tuple(at), shaken)
    return found


def _surfaces(materials: Sequence[Material], generator: np.random.Generator) -> dict[str, Surface]:
    found = {}
    for material in materials:
        for piece in "12":
            capacitance = material.capacitance_farad * (1 + 0.06 * float(generator.standard_normal()))
            found[f"{material.letter}{piece}"] = Surface(
                capacitance,
                offset_ampere=capacitance * 8e-4,
                leakage_siemens=capacitance * 0.05,
                drift_ampere=-capacitance * 0.006,
                noise_ampere=capacitance * 4e-4,
                samples=81,
            )
    return found


# --- day B: gas-diffusion electrodes, a workbook, headspace and the balance mode ---


def day_b() -> DayTruth:
    """Two gas-diffusion electrodes at set currents; a stirred gas vessel before the sample loop."""
    generator = np.random.default_rng(20430602)
    holds: list[Hold] = []
    morning = datetime(2043, 6, 2, 8, 15)
    slot = 0
    for material in (PAPER, ALLOY):
        for level, milliampere in enumerate(material.current_milliampere):
            for piece in "12" if level in (1, 3) else "1":
                time = _log_times(1500.0, 1501, generator)
                current = -np.round(milliampere * (1 + 2e-4 * generator.standard_normal(time.size)), 3) * 1e-3
                current[0] = 0.0  # the log starts as the current is switched on
                rhe = (
                    -0.56
                    - 0.0015 * milliampere
                    - 0.02 * (time / 1500.0)
                    + 1e-3 * generator.standard_normal(time.size)
                )
                base = 26.0 * SCCM
                hold = Hold(
                    name=f"{material.letter}{piece}-{milliampere:.0f}",
                    time_second=time,
                    current_ampere=current,
                    potential_rhe_volt=rhe,
                    efficiency=efficiencies(material, level, generator),
                    catalyst=material.name,
                    electrode=f"{material.letter}{piece}",
                    level=f"{milliampere:.0f} mA",
                    set_current_ampere=-1e-3 * milliampere,
                    started=morning + timedelta(minutes=38 * slot),
                    pH=7.6,
                    temperature_kelvin=296.65,
                    pressure_pascal=100.8e3,
                    resistance_ohm=round(2.9 + 0.15 * float(generator.standard_normal()), 2),
                    inlet_mol_per_s=base,
                    headspace_m3=95e-6,
                    carbonate_mol_per_s=round(5.2e-9 * milliampere, 10),
                    injections_second=(240.0, 600.0, 960.0, 1320.0),
                )
                holds.append(_sampled_b(hold))
                slot += 1
    return DayTruth(
        holds=tuple(_mishaps_b(hold) for hold in holds),
        gas_curves=GAS_CURVES,
        liquid_curves=LIQUID_CURVES,
        resonances=SIGNALS,
        standard_resonances=(Resonance("DMSO", "CH3 2.60", 6),),
        standard_amount_mol=0.2e-6,
        title="Invented: two gas-diffusion electrodes, headspace and carbon balance",
        day_date=date(2043, 6, 2),
        outlet_flow="balance",
        reference_volt=0.098,
        reference_volt_per_kelvin=0.0,
        dead_time_second=12.0,
        drift=_drift(
            (morning - timedelta(minutes=30), morning + timedelta(hours=4), morning + timedelta(hours=8)),
            generator,
        ),
        blanks={"catholyte": {"formate": 2.1e-3, "ethanol": 1.9e-3}},
        surfaces=_surfaces((PAPER, ALLOY), generator),
        specific_capacitance=0.28,
        calibration_names=(GAS, LIQUID),
        errors=(
            Error("inlet flow", relative=0.015, shared="day"),
            Error("carbonate uptake", relative=0.15, shared="run"),
            Error("headspace", relative=0.03, shared="day"),
            Error("peak area", relative=0.015, shared="reading"),
            Error("integral", relative=0.020, shared="reading"),
            Error("compartment volume", relative=0.006, shared="reading"),
            Error("aliquot", relative=0.008, shared="reading"),
            Error("standard amount", relative=0.015, shared="day"),
            Error("electrode area", relative=0.015, shared="run"),
            Error("resistance", relative=0.040, shared="run"),
        ),
    )


def _sampled_b(hold: Hold) -> Hold:
    seen = _looked_for(hold, 40e-6, 0.4e-6, 0.2e-6)
    anionic = tuple(name for name in seen if name in ("formate", "acetate", "ethanol"))
    volatile = tuple(name for name in seen if name in ("ethanol", "acetaldehyde", "n-propanol"))
    crossed = {"formate": 0.08, "acetate": 0.11, "ethanol": 0.03}
    stripped = {"ethanol": 0.05, "acetaldehyde": 0.55, "n-propanol": 0.04}
    stays = {name: 1.0 - crossed.get(name, 0.0) - stripped.get(name, 0.0) for name in seen}
    return replace(
        hold,
        compartments=(
            Compartment("catholyte", 1.0, (40e-6,), (0.4e-6,), (None,), shares=stays, products=seen),
            Compartment("anolyte", 0.0, (40e-6,), (0.4e-6,), (None,), shares=crossed, products=anionic),
            Compartment("trap", 0.0, (12e-6,), (0.4e-6,), (None,), shares=stripped, products=volatile),
        ),
    )


def _mishaps_b(hold: Hold) -> Hold:
    if hold.name == "q1-150":
        lost = tuple(place for place in hold.compartments if place.name != "catholyte")
        return replace(hold, compartments=lost, note="catholyte tube broke in the centrifuge")
    if hold.name == "p2-200":
        return replace(
            hold, spoiled={3: 1.35}, note="injection 4: liquid carried over into the loop, not used"
        )
    return hold


# --- writing ---

_DIGITS = {
    "peak area": 5, "integral": 4, "mole fraction": 6, "inlet flow": 4, "outlet flow": 4, "electrode area": 3,
    "resistance": 3, "standard amount": 4, "headspace": 3, "carbonate uptake": 3, "aliquot": 4,
    "compartment volume": 4, "pH": 3, "temperature": 4, "pressure": 6,
}  # fmt: skip
_COMMENT = (
    "# Invented data. No laboratory, person or product stands behind any number of this folder;\n"
    "# tests/make_examples.py draws it all from a known truth.\n"
)


def _cells(day: DayTruth, seed: int) -> Sheets:
    # a piece has one area and the electrolyte one pH: no two rows disagree about them
    drawn = [error for error in day.errors if error.quantity not in ("electrode area", "pH")]
    cells = sheets(day, Draws(drawn, np.random.default_rng(seed)))
    cells.tables["gas"] = _integrated(cells.tables["gas"])
    notes = {hold.name: hold.note for hold in day.holds}
    for row in cells.tables["gas"]:
        row["remark"] = notes[row["run"]].partition(": ")[2] if row["use"] == "no" else ""
    return cells


def _integrated(rows: Table) -> Table:
    """Peaks that stand out, in all injections of a run or in none: the rest no integrator reports."""
    smallest: dict[tuple[str, str], float] = {}
    for row in rows:
        if row["use"] == "yes":
            key = (row["run"], row["analyte"])
            smallest[key] = min(smallest.get(key, np.inf), row["peak area"])
    least = {analyte: curve.response(SEEN_PPM) for (_, analyte), curve in GAS_CURVES.items()}
    return [row for row in rows if smallest[(row["run"], row["analyte"])] > least[row["analyte"]]]


def write_examples(folder: Path) -> None:
    """Write both days under ``folder``."""
    text = Dialect(";", ",", "cp1252", newline="\r\n")
    log = replace(
        text,
        preamble=(
            "Potentiostat log, two-cell stand (invented)",
            "Elektrolyt: 0,1 mol/L KHCO3, gesättigt mit CO2",
            "",
        ),
    )
    scan = replace(text, preamble=("Cyclic voltammogram (invented)", ""))
    decimals = {"t": 2, "E": 4, "I": 5, "cycle": 0}
    first = day_a()
    write_sheets(
        folder / DAY_A,
        first,
        _cells(first, 51801),
        Style(
            tables=text,
            traces=log,
            scans=scan,
            digits=_DIGITS,
            decimals=decimals,
            comment=_COMMENT,
            inside=False,
            names={"carbon monoxide": "CO", "hydrogen": "H2", "ethylene": "C2H4"},
        ),
    )
    second = day_b()
    write_sheets(
        folder / DAY_B,
        second,
        _cells(second, 60202),
        Style(
            workbook=True,
            traces=Dialect("\t", preamble=("galvanostatic log (invented)",), suffix=".txt"),
            digits=_DIGITS,
            decimals={**decimals, "I": 4},
            comment=_COMMENT,
            inside=False,
            units={"inlet flow": "mL/min", "t": "s"},
            names={"n-propanol": "1-propanol"},
        ),
    )


def main(arguments: Sequence[str]) -> None:
    """Regenerate everything under the folder given."""
    root = Path(arguments[0]) if arguments else Path(__file__).resolve().parent.parent
    write_calibrations(root / "calibrations")
    write_examples(root / "example_experiments")
    for day in (day_a(), day_b()):
        totals = [expected(day, hold).total for hold in day.holds]
        print(f"{day.title}: {len(day.holds)} runs, true totals {min(totals):.3f} to {max(totals):.3f}")


if __name__ == "__main__":
    main(sys.argv[1:])
