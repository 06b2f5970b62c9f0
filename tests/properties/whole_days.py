"""Hypothesis strategies for whole days at the bench, of any size, in any mode and in any spelling of the file contract.

A day is drawn as a truth (`tests.forward`), and written out from it; what the forward model does not know (borrowed
curves, parent cylinders of standards, impedance spectra) is added to its cells here, from the contract's own words.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from datetime import timedelta
from pathlib import Path
from typing import Any

import numpy as np
from hypothesis import HealthCheck, settings
from hypothesis import strategies as st
from tests.forward.days import MORNING
from tests.forward.files import ACTUAL_FLOWS, Dialect, Style, write_sheets
from tests.forward.noise import Draws
from tests.forward.tables import Sheets, sheets
from tests.forward.truth import (
    Compartment,
    Curve,
    DayTruth,
    Drift,
    Error,
    Hold,
    Resonance,
    Standards,
    Surface,
)

LONG_RUN = "COULOMBOOK_EXAMPLES"


def examples(count: int) -> settings:
    """So many examples in the suite, always the same; in a long run as many as the environment says, fresh ones.

    COULOMBOOK_EXAMPLES=500 python -m pytest tests/properties/test_whole_days.py
    """
    asked = int(os.environ.get(LONG_RUN, "0"))
    return settings(
        max_examples=asked or count,
        derandomize=not asked,
        deadline=None,
        # a whole day is a large example
        suppress_health_check=[
            HealthCheck.too_slow,
            HealthCheck.data_too_large,
            HealthCheck.large_base_example,
        ],
    )


GAS = ("hydrogen", "carbon monoxide", "methane", "ethylene", "ethane", "propylene")
LIQUID = (
    "formate",
    "methanol",
    "ethanol",
    "acetate",
    "acetaldehyde",
    "n-propanol",
    "acetone",
    "allyl alcohol",
)
RESONANCES = (
    Resonance("formate", "CH", 1),
    Resonance("methanol", "CH3", 3),
    Resonance("ethanol", "CH3", 3),
    Resonance("ethanol", "CH2", 2),
    Resonance("acetate", "CH3", 3),
    Resonance("acetaldehyde", "CHO", 1),
    Resonance("n-propanol", "CH3", 3),
    Resonance("n-propanol", "CH2", 2),
    Resonance("acetone", "CH3", 6),
    Resonance("allyl alcohol", "CH", 1),
)
STANDARDS = {
    "DMSO": (Resonance("DMSO", "CH3", 6),),
    "phenol": (Resonance("phenol", "ortho", 2), Resonance("phenol", "meta", 2)),
}
SLOPES = {
    "hydrogen": 0.41,
    "carbon monoxide": 0.93,
    "methane": 0.95,
    "ethylene": 1.86,
    "ethane": 1.91,
    "propylene": 2.79,
    "nitrogen": 0.37,
}
# effective carbon numbers: 1.00 for an aliphatic, 0.95 for an olefinic carbon (Sternberg, Gallaway and Jones, 1962;
# from memory): ethane answers as 2.00, ethylene as 1.90
ETHANE_BY_ETHYLENE = 2.00 / 1.90
# what a spreadsheet, a page or a shell might take for its own
NAMES = ("mesh", "foam", "Cu/C (5 %)", "=1+1", "<blink>&amp;", "Füllung β", "it's", "-1.2 V", "a, b; c")

RELATIVE = (0.003, 0.02)
UNIT_CHOICES = {
    "t": ("s", "min", "h"),
    "E": ("V", "mV"),
    "I": ("mA", "A", "uA"),
    "electrode area": ("cm^2", "mm^2", "m^2"),
    "temperature": ("degC", "K"),
    "pressure": ("kPa", "bar", "Pa", "mbar"),
    "resistance": ("ohm", "mohm"),
    "inlet flow": ("sccm", "slpm", "mL/min", "L/h", "umol/s", "mol/s"),
    "outlet flow": ("sccm", "mL/min", "umol/s"),
    "tracer flow": ("sccm", "slpm", "nmol/s"),
    "headspace": ("mL", "L", "cm^3"),
    "carbonate uptake": ("umol/s", "nmol/s"),
    "time": ("s", "min"),
    "start": ("s", "min"),
    "stop": ("s", "h"),
    "compartment volume": ("mL", "L", "cm^3"),
    "aliquot": ("mL", "uL"),
    "standard amount": ("umol", "nmol"),
    "scan rate": ("mV s^-1", "V/s"),
    "window low": ("V", "mV"),
    "set potential": ("V", "mV"),
}


@dataclass(frozen=True)
class WholeDay:
    """A truth, how it is written down, and what stands in its files beyond the forward model."""

    truth: DayTruth
    style: Style = field(default_factory=Style)
    borrowed: bool = False  # ethane by ethylene's curve
    parents: bool = False  # standards were diluted from two cylinders
    spectra: bool = False  # the resistances are in spectra, not in cells
    noise: int | None = None  # seed of the declared errors; None: every value as it is

    def cells(self) -> Sheets:
        """Every cell of the day's files."""
        drawn = None if self.noise is None else np.random.default_rng(self.noise)
        cells = sheets(self.truth, Draws(self.truth.errors, drawn))
        if self.borrowed:
            _borrow(cells, self.truth.calibration_names[0])
        if self.parents:
            _dilute(cells, self.truth.calibration_names[0])
        if self.spectra:
            _measure_resistances(cells, self.truth)
        return cells

    def write(self, folder: Path, cells: Sheets | None = None) -> Path:
        """Write the day into a folder."""
        style = self.style
        if self.truth.meter_wet and style.units.get("outlet flow") not in ACTUAL_FLOWS:
            # vapour is part of a volume that a meter reads; an amount of gas per time is one without it
            style = replace(style, units={**style.units, "outlet flow": "mL/min"})
        return write_sheets(folder, self.truth, cells or self.cells(), style)


def _borrow(cells: Sheets, calibration: str) -> None:
    text, rows = cells.calibrations[calibration]
    like = '\n[curve."ethane@FID"]\nlike = "ethylene@FID"\n'
    cells.calibrations[calibration] = (text + like, [row for row in rows if row["analyte"] != "ethane"])


def _dilute(cells: Sheets, calibration: str) -> None:
    for number, row in enumerate(cells.calibrations[calibration][1]):
        row["parent"] = ("cylinder 1", "cylinder 2")[number % 2]
        row["u(parent) / %"] = 0.5


def _measure_resistances(cells: Sheets, day: DayTruth) -> None:
    """Spectra of a solution resistance before a constant-phase element that leaks, 1 Hz to 100 kHz."""
    omega = 2.0 * np.pi * np.geomspace(1e5, 1.0, 26)
    cells.tables["spectra"] = []
    for hold, row in zip(day.holds, cells.tables["runs"], strict=True):
        row["resistance"] = None
        leak, exponent, phase = 20.0 * hold.resistance_ohm, 0.9, 2e-4 / hold.resistance_ohm
        impedance = hold.resistance_ohm + leak / (1.0 + leak * phase * (1j * omega) ** exponent)
        file = f"spectra/{hold.name}.csv"
        cells.scans[file] = {
            "f / Hz": omega / (2.0 * np.pi),
            "Zre / ohm": impedance.real,
            "Zim / ohm": impedance.imag,
        }
        cells.tables["spectra"].append({"run": hold.name, "file": file})


def between(low: float, high: float) -> st.SearchStrategy[float]:
    """One of a thousand numbers of a range, the low end the simplest."""
    return st.integers(0, 999).map(lambda share: low + share / 999 * (high - low))


@st.composite
def logs(draw: st.DrawFn) -> dict[str, Any]:
    """A log of 2 to 40 rows: times with uneven steps, a current that decays and wavers, a potential that wanders."""
    rows = draw(st.integers(2, 40))
    seconds = draw(st.sampled_from([1200.0, 1800.0, 3600.0]))
    shape = np.random.default_rng(draw(st.integers(0, 999)))
    inner = np.sort(shape.choice(np.arange(1, int(seconds)), rows - 2, replace=False))
    time = np.concatenate([[0.0], inner.astype(float), [seconds]])
    level = draw(between(2e-3, 0.3))
    unrest = draw(st.sampled_from([0.0, 0.02, 0.3]))
    current = -level * (1.0 + unrest * (np.exp(-time / 300.0) + 0.5 * shape.uniform(-1.0, 1.0, rows)))
    potential = -draw(between(0.5, 1.6)) + 0.05 * unrest * shape.uniform(-1.0, 1.0, rows)
    return {"time_second": time, "current_ampere": current, "potential_rhe_volt": potential}


@st.composite
def efficiencies(draw: st.DrawFn) -> dict[str, float]:
    """Any products, at least one, with a sum of at most 120 %."""
    names = draw(st.lists(st.sampled_from(GAS + LIQUID), min_size=1, max_size=9, unique=True))
    shares = [draw(between(0.002, 1.0)) for _ in names]
    total = draw(between(0.3, 1.2))
    return {name: total * share / sum(shares) for name, share in zip(names, shares, strict=True)}


@st.composite
def compartments(draw: st.DrawFn, stop_second: float) -> tuple[Compartment, ...]:
    """Catholyte alone, or anolyte or trap beside it; each sampled once or several times."""
    names = draw(
        st.sampled_from([("catholyte",), ("catholyte", "anolyte"), ("catholyte", "anolyte", "trap")])
    )
    shares = {1: (1.0,), 2: (0.9, 0.1), 3: (0.85, 0.1, 0.05)}[len(names)]
    places = []
    for name, share in zip(names, shares, strict=True):
        times = draw(st.sampled_from([(None,), (0.5, None), (0.3, 0.6, None), (0.4, 0.9)]))
        volume, aliquot = draw(between(5e-6, 60e-6)), draw(between(0.1e-6, 0.8e-6))
        places.append(
            Compartment(
                name,
                share,
                # the aliquots are missing from the next volume, and some electrolyte has gone up
                tuple(volume * (1.0 - 0.02 * number) for number in range(len(times))),
                (aliquot,) * len(times),
                tuple(None if one is None else round(one * stop_second, 1) for one in times),
            )
        )
    return tuple(places)


@st.composite
def holds(draw: st.DrawFn, number: int, outlet_flow: str, electrodes: tuple[str, ...], mixed: bool) -> Hold:
    """One electrolysis, in any condition a bench would see."""
    log = draw(logs())
    last = float(log["time_second"][-1])
    start, stop = draw(
        st.sampled_from([(None, None), (0.0, last), (0.02 * last, 0.97 * last), (None, 0.9 * last)])
    )
    made = draw(efficiencies())
    level = float(-log["current_ampere"].mean())
    inlet = level * draw(between(2e-4, 4e-3))
    fractions = draw(
        st.lists(st.sampled_from([0.3, 0.45, 0.6, 0.75, 0.85]), min_size=1, max_size=4, unique=True)
    )
    return Hold(
        name=f"r{number + 1}",
        **log,
        efficiency=made,
        catalyst=draw(st.sampled_from(NAMES)),
        electrode=draw(st.sampled_from(electrodes)),
        level=draw(st.sampled_from([None, "-1.5 V", "low", "=A1"])),
        set_potential_volt=draw(st.sampled_from([None, -1.5, -1.72])),
        started=MORNING + timedelta(minutes=70 * number),
        start_second=start,
        stop_second=stop,
        electrode_area_m2=draw(between(1e-5, 5e-4)),
        pH=draw(between(3.0, 14.0)),
        temperature_kelvin=273.15 + round(draw(between(5.0, 70.0)), 2),
        pressure_pascal=draw(between(9e4, 1.3e5)),
        resistance_ohm=draw(between(0.3, 40.0)),
        compensated=draw(st.sampled_from([0.0, 0.85, 1.0])),
        inlet_mol_per_s=inlet,
        outlet_mol_per_s=0.93 * inlet if outlet_flow in ("measured", "tracer") else None,
        outlet_trend=draw(st.sampled_from([0.0, 0.01])) if outlet_flow == "tracer" else 0.0,
        tracer_mol_per_s=0.02 * inlet if outlet_flow == "tracer" else None,
        headspace_m3=inlet * draw(between(0.2, 5.0)) if mixed and draw(st.booleans()) else None,
        carbonate_mol_per_s=draw(st.sampled_from([0.0, 0.05 * inlet])) if outlet_flow == "balance" else 0.0,
        injections_second=tuple(sorted(round(one * last, 1) for one in fractions)),
        compartments=draw(compartments(last if stop is None else stop)) if set(made) & set(LIQUID) else (),
        note=draw(st.sampled_from(["", "leaky fitting", '=HYPERLINK("x")'])),
    )


FORMS = {
    "line through zero": Curve(1.0),
    "line": Curve(1.0, 0.4, 0.0, "line", "1/x^2"),
    "quadratic": Curve(1.0, 0.3, -1e-6, "quadratic", "1/x"),
}


def _curve(slope: float, form: str, scale: float = 1.0) -> Curve:
    plain = FORMS[form]
    return replace(plain, a1=slope, a0=scale * slope * plain.a0, a2=slope * plain.a2 / scale)


@st.composite
def errors(draw: st.DrawFn) -> tuple[Error, ...]:
    """Declared standard uncertainties: none, or some of each kind and sharing."""
    kinds = {
        "peak area": ("reading",),
        "integral": ("reading",),
        "inlet flow": ("day", "run"),
        "outlet flow": ("day", "run"),
        "tracer flow": ("day",),
        "standard amount": ("day",),
        "compartment volume": ("run",),
        "aliquot": ("reading",),
        "electrode area": ("run", "day"),
        "headspace": ("day",),
    }
    chosen = draw(st.one_of(st.just([]), st.lists(st.sampled_from(sorted(kinds)), unique=True, min_size=1)))
    return tuple(
        Error(name, draw(between(*RELATIVE)), shared=draw(st.sampled_from(kinds[name]))) for name in chosen
    )


@st.composite
def truths(draw: st.DrawFn, runs: int = 3, everything_declared: bool = False) -> DayTruth:
    """A truth of one to ``runs`` holds."""
    outlet_flow = draw(st.sampled_from(["inlet", "measured", "tracer", "balance"]))
    electrodes = draw(st.sampled_from([("m1",), ("m1", "s1")]))
    mixed = draw(st.booleans())
    done = tuple(
        draw(holds(number, outlet_flow, electrodes, mixed)) for number in range(draw(st.integers(1, runs)))
    )
    made = {name for one in done for name in one.efficiency}
    form = draw(st.sampled_from(sorted(FORMS)))
    gas = {_channel(name): _curve(SLOPES[name], form) for name in GAS if name in made | {"ethylene"}}
    if outlet_flow == "tracer":
        gas["TCD", "nitrogen"] = _curve(SLOPES["nitrogen"], "line through zero")
    spread = draw(st.sampled_from([0.0, 0.003]))
    liquid = draw(st.sampled_from([None, "line through zero", "line"]))
    resonances = tuple(one for one in RESONANCES if one.analyte in made)
    by_signal = (
        {}
        if liquid is None
        else {(one.analyte, one.signal): _curve(0.96, liquid, 0.01) for one in resonances}
    )
    standard = draw(st.sampled_from(sorted(STANDARDS)))
    surfaces = _surfaces(electrodes) if draw(st.booleans()) else {}
    smooth = draw(st.booleans()) if surfaces else False
    return DayTruth(
        holds=done,
        gas_curves=gas,
        gas_standards={key: Standards(_PPM, sd_relative=spread) for key in gas},
        liquid_curves=by_signal,
        resonances=resonances,
        standard=standard,
        standard_resonances=STANDARDS[standard],
        standard_amount_mol=draw(between(0.05e-6, 1e-6)),
        title=draw(st.sampled_from(NAMES)),
        outlet_flow=outlet_flow,
        meter_wet=draw(st.booleans()) if outlet_flow == "measured" else False,
        standard_temperature_kelvin=draw(st.sampled_from([273.15, 298.15])),
        standard_pressure_pascal=draw(st.sampled_from([101325.0, 1e5])),
        current_window_second=draw(st.sampled_from([30.0, 120.0])),
        dead_time_second=draw(st.sampled_from([0.0, 25.0])),
        tracer="nitrogen" if outlet_flow == "tracer" else None,
        feed_co2=draw(st.sampled_from([1.0, 0.6])),
        reference_volt=draw(between(0.0, 0.9)),
        reference_volt_per_kelvin=draw(st.sampled_from([0.0, -7.3e-4])),
        drift=_drift(gas) if draw(st.booleans()) else {},
        blanks=_blanks(made) if draw(st.booleans()) else {},
        surfaces=surfaces | ({"polished": Surface(28e-6)} if smooth else {}),
        specific_capacitance=0.28 if surfaces and not smooth else None,
        smooth_reference="polished" if smooth else None,
        errors=EVERY_ERROR if everything_declared else draw(errors()),
    )


_PPM = tuple(np.geomspace(20.0, 30000.0, 12).round(3).tolist())
EVERY_ERROR = (
    Error("peak area", 0.01, shared="reading"),
    Error("integral", 0.01, shared="reading"),
    Error("inlet flow", 0.015, shared="day"),
    Error("outlet flow", 0.015, shared="run"),
    Error("tracer flow", 0.01, shared="day"),
    Error("standard amount", 0.01, shared="day"),
    Error("compartment volume", 0.01, shared="run"),
    Error("aliquot", 0.007, shared="reading"),
    Error("electrode area", 0.02, shared="run"),
)


def _channel(analyte: str) -> tuple[str, str]:
    return ("TCD" if analyte == "hydrogen" else "FID", analyte)


def _surfaces(electrodes: tuple[str, ...]) -> dict[str, Surface]:
    return {
        name: Surface(capacitance, leakage_siemens=2e-5, offset_ampere=1e-6, cycles=2, samples=41)
        for name, capacitance in zip(electrodes, (1.7e-3, 0.4e-3), strict=False)
    }


def _drift(gas: Mapping[tuple[str, str], Curve]) -> dict[tuple[str, str], Drift]:
    at = (MORNING - timedelta(minutes=30), MORNING + timedelta(hours=2))
    return {key: Drift(2e-3, at, (1.0, 0.96)) for key in list(gas)[:2] if key[1] != "nitrogen"}


def _blanks(made: set[str]) -> dict[str, dict[str, float]]:
    found = {name: 0.01 for name in LIQUID[:3] if name in made}
    return {"catholyte": found} if found else {}


@st.composite
def dialects(draw: st.DrawFn) -> Dialect:
    """How a text table is written."""
    decimal = draw(st.sampled_from([".", ","]))
    return Dialect(
        draw(st.sampled_from([";", "\t"] if decimal == "," else [",", ";", "\t"])),
        decimal,
        draw(st.sampled_from(["utf-8", "utf-8-sig", "utf-16"])),
        tuple(draw(st.lists(st.sampled_from(["Prüfstand 2", "Messung vom 18.05.", ""]), max_size=2))),
        draw(st.sampled_from(["\n", "\r\n"])),
        draw(st.booleans()),
    )


@st.composite
def styles(draw: st.DrawFn) -> Style:
    """How a whole day is written: text or workbook, dialects, units, aliases, order of rows."""
    text = draw(dialects())
    return Style(
        text,
        draw(dialects()),
        draw(dialects()),
        draw(dialects()),
        workbook=draw(st.booleans()),
        units={
            name: draw(st.sampled_from(units)) for name, units in UNIT_CHOICES.items() if draw(st.booleans())
        },
        aliases=draw(st.booleans()),
        shuffle=draw(st.one_of(st.none(), st.integers(0, 99))),
        drop_empty=draw(st.booleans()),
    )


@st.composite
def whole_days(draw: st.DrawFn, runs: int = 3, everything_declared: bool = False) -> WholeDay:
    """A whole day, its values as they are, written plainly; give it another style or draw its errors with `replace`."""
    truth = draw(truths(runs, everything_declared))
    borrowed = draw(st.booleans())
    if borrowed and _channel("ethane") in truth.gas_curves:
        # the detector sees so many times the mole fraction, through the same curve
        other, k = truth.gas_curves["FID", "ethylene"], ETHANE_BY_ETHYLENE
        scaled = replace(other, a1=k * other.a1, a2=k * k * other.a2)
        truth = replace(truth, gas_curves={**truth.gas_curves, _channel("ethane"): scaled})
    else:
        borrowed = False
    return WholeDay(truth, borrowed=borrowed, parents=draw(st.booleans()), spectra=draw(st.booleans()))
