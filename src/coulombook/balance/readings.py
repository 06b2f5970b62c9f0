"""The typed records of a day: what the plan is built from.

Every number is SI (mol, s, A, V, m^2, m^3, K, Pa; mole fractions as fractions), peak areas and integrals are raw
detector units. Every record remembers the row it came from (`RowOrigin`); `origin.of("peak area")` gives the cell.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from coulombook.findings import Origin, RowOrigin
from coulombook.species import Species, SpeciesTable

FloatArray = NDArray[np.float64]


class FlowKind(StrEnum):
    """How a flow was written."""

    MOLAR = "molar"  # value in mol/s
    STANDARD = "standard"  # value in m^3/s at the day's standard temperature and pressure
    ACTUAL = "actual"  # value in m^3/s at the run's own temperature and pressure


@dataclass(frozen=True, slots=True)
class Flow:
    """A flow as entered: mol/s, or m^3/s at standard or at actual conditions."""

    value: float
    kind: FlowKind


class OutletFlow(StrEnum):
    """How the outlet molar flow is found."""

    INLET = "inlet"
    MEASURED = "measured"
    TRACER = "tracer"
    BALANCE = "balance"

    @property
    def entered(self) -> str:
        """The quantity that is entered to find it."""
        match self:
            case OutletFlow.MEASURED:
                return "outlet flow"
            case OutletFlow.TRACER:
                return "tracer flow"
            case _:
                return "inlet flow"


@dataclass(frozen=True, slots=True)
class Declared:
    """One ``[[uncertainty]]`` entry: the standard uncertainty (k = 1) of a quantity.

    ``quantity`` is the head without its unit or the key, in small letters. Exactly one of ``relative``
    (a fraction) and ``absolute`` (in the SI unit the records carry; raw units for peak areas and integrals)
    is set. ``shared`` is "day", "run" or "reading".
    """

    quantity: str
    relative: float | None
    absolute: float | None
    shared: str
    origin: Origin


@dataclass(frozen=True, slots=True)
class DaySettings:
    """What day.toml says, defaults filled in."""

    title: str = ""
    date: date | None = None
    calibrations: tuple[str, ...] = ()
    reference_name: str | None = None
    reference_volt: float = 0.0  # against SHE at 25 degC
    reference_volt_per_kelvin: float = 0.0
    outlet_flow: OutletFlow = OutletFlow.INLET
    standard_temperature_kelvin: float = 273.15
    standard_pressure_pascal: float = 101325.0
    meter_gas_wet: bool = False
    current_window_second: float = 120.0
    dead_time_second: float = 0.0
    tracer: str | None = None  # a species name
    feed_co2: float = 1.0
    weighted_signals: bool = True
    specific_capacitance_farad_per_m2: float | None = None
    u_specific_capacitance: float = 0.0  # of a value of the shipped table, as a fraction
    specific_capacitance_source: str = ""  # of a value of the shipped table
    smooth_reference: str | None = None
    level_of_confidence: float = 0.95
    unaccounted: float | None = None  # prior standard deviation of a share that nothing measures, a fraction
    onset_current_density_ampere_per_m2: float = 1.0
    declared: tuple[Declared, ...] = ()


@dataclass(frozen=True, slots=True)
class Run:
    """One hold: a row of ``runs``."""

    name: str
    catalyst: str
    electrode: str
    level: str | None
    set_potential_volt: float | None
    set_current_ampere: float | None
    started: datetime | None
    trace: str  # path relative to the day folder
    start_second: float | None
    stop_second: float | None
    electrode_area_m2: float
    pH: float
    temperature_kelvin: float
    pressure_pascal: float
    resistance_ohm: float
    compensated: float
    inlet_flow: Flow | None
    outlet_flow: Flow | None
    tracer_flow: Flow | None
    headspace_m3: float | None
    carbonate_uptake_mol_per_s: float
    note: str
    origin: RowOrigin
    resistance_given: bool = True
    u_resistance_ohm: float = 0.0  # of a resistance that spectra told
    resistance_from: str = ""  # the spectra; runs with the same ones share the error


@dataclass(frozen=True, slots=True)
class Peak:
    """One peak of one gas injection: a row of ``gas``. ``analyte`` is the trade name of the species."""

    run: str
    injection: str
    time_second: float
    channel: str
    analyte: str
    peak_area: float
    used: bool
    origin: RowOrigin


@dataclass(frozen=True, slots=True)
class Vial:
    """One liquid sample: a row of ``vials``. ``run`` may be None for a blank."""

    name: str
    run: str | None
    compartment: str
    time_second: float | None  # None: end of the run's window
    compartment_volume_m3: float | None  # None for a blank that gives none
    aliquot_m3: float
    standard: str  # trade name or the text as written
    standard_amount_mol: float
    blank: bool
    used: bool
    origin: RowOrigin


@dataclass(frozen=True, slots=True)
class Signal:
    """One integrated signal of a vial: a row of ``liquid``. ``analyte`` equals the vial's ``standard`` for its rows.

    The last three are given together or not at all; they tell how far the signal was saturated.
    """

    vial: str
    analyte: str
    signal: str
    protons: float
    integral: float
    origin: RowOrigin
    relaxation_second: float | None = None  # T1
    repetition_second: float | None = None
    flip_angle_radian: float | None = None  # 90 degrees when T1 is given without it


@dataclass(frozen=True, slots=True)
class Scan:
    """One voltammogram for double-layer capacitance: a row of ``scans``."""

    electrode: str
    file: str  # path relative to the day folder
    scan_rate_volt_per_second: float
    electrode_area_m2: float
    cycle: float | None  # None: the last whole one
    window_low_volt: float | None
    window_high_volt: float | None
    origin: RowOrigin
    purpose: str = ""  # tells sets of scans of one electrode apart: "before", "after"


@dataclass(frozen=True, slots=True)
class Spectrum:
    """One impedance spectrum: a row of ``spectra``."""

    run: str | None
    electrode: str | None  # one of the two is given
    file: str  # path relative to the day folder
    purpose: str
    origin: RowOrigin


@dataclass(frozen=True, slots=True)
class Check:
    """One check-gas injection: a row of ``checks``."""

    at: datetime
    channel: str
    analyte: str
    mole_fraction: float
    peak_area: float
    origin: RowOrigin


@dataclass(frozen=True, slots=True)
class CurveOptions:
    """The ``[curve]`` settings of one curve."""

    form: str = "line"  # "line" | "line through zero" | "quadratic"
    weights: str = "equal"  # "equal" | "1/x" | "1/x^2" | "replicates" | "both"
    limits: str = "ISO 11843-2"
    like: str | None = None


@dataclass(frozen=True, slots=True, eq=False)
class StandardSet:
    """The standards of one curve.

    Gas: ``channel`` and ``analyte``; x is the mole fraction, y the peak area.
    Liquid: ``channel`` holds the signal; x is the amount ratio, y the integral ratio (per proton of each).
    """

    calibration: str
    kind: str  # "gas" | "liquid"
    channel: str
    analyte: str
    options: CurveOptions
    x: FloatArray  # (n_points,)
    y: FloatArray  # (n_points,)
    u_x: FloatArray | None  # (n_points,) standard uncertainty of x, or None
    parent: tuple[str, ...] | None  # (n_points,) parent cylinder of each standard, "" where none
    u_parent: FloatArray | None  # (n_points,) relative standard uncertainty of the parent
    origins: tuple[RowOrigin, ...]


@dataclass(frozen=True, slots=True)
class Calibration:
    """One folder of ``calibrations/``."""

    name: str
    kind: str  # "gas" | "liquid"
    measured_on: date | None
    valid_until: date | None
    standards: tuple[StandardSet, ...]
    origin: Origin


@dataclass(frozen=True, slots=True)
class Day:
    """All tables of a day folder, typed and in SI; the traces and voltammograms stay on disk until they are needed."""

    name: str
    settings: DaySettings
    species: SpeciesTable
    runs: tuple[Run, ...]
    peaks: tuple[Peak, ...] = ()
    vials: tuple[Vial, ...] = ()
    signals: tuple[Signal, ...] = ()
    scans: tuple[Scan, ...] = ()
    checks: tuple[Check, ...] = ()
    calibrations: tuple[Calibration, ...] = ()
    carried: Mapping[str, Mapping[str, tuple[str, ...]]] = field(
        default_factory=dict
    )  # table -> head -> cells
    spectra: tuple[Spectrum, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Trace:
    """A potentiostat log, in SI, cathodic current negative. Rows are as in the file."""

    time_second: FloatArray  # (n_samples,)
    potential_volt: FloatArray  # (n_samples,)
    current_ampere: FloatArray  # (n_samples,)
    cell_voltage_volt: FloatArray | None  # (n_samples,)


@dataclass(frozen=True, slots=True, eq=False)
class Voltammogram:
    """A voltammogram, in SI."""

    potential_volt: FloatArray  # (n_samples,)
    current_ampere: FloatArray  # (n_samples,)
    time_second: FloatArray | None  # (n_samples,)
    cycle: FloatArray | None  # (n_samples,)


@dataclass(frozen=True, slots=True, eq=False)
class SpectrumRecord:
    """An impedance spectrum, in SI, a capacitive imaginary part negative."""

    frequency_hertz: FloatArray  # (n_points,)
    impedance_ohm: NDArray[np.complex128]  # (n_points,)


__all__ = [
    "Calibration",
    "Check",
    "CurveOptions",
    "Day",
    "DaySettings",
    "Declared",
    "FloatArray",
    "Flow",
    "FlowKind",
    "OutletFlow",
    "Peak",
    "Run",
    "Scan",
    "Signal",
    "Species",
    "SpeciesTable",
    "Spectrum",
    "SpectrumRecord",
    "StandardSet",
    "Trace",
    "Vial",
    "Voltammogram",
]
