"""The truth of a day: what really happened, in SI units."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from tests.forward.chemistry import FARADAY, GAS_CONSTANT, PRODUCTS
from tests.forward.programme import PiecewiseLinear

Key = tuple[str, str]  # (channel, analyte) of a gas curve, or (analyte, signal) of a liquid one


@dataclass(frozen=True, slots=True)
class Curve:
    """A true response y = a0 + a1 x + a2 x^2; x in ppm for a gas, an amount ratio for a liquid."""

    a1: float
    a0: float = 0.0
    a2: float = 0.0
    form: str = "line through zero"
    weights: str = "equal"

    def response(self, x: float) -> float:
        """Response at ``x``."""
        return self.a0 + self.a1 * x + self.a2 * x * x


@dataclass(frozen=True, slots=True)
class Standards:
    """The standards a curve was measured with, and how they scattered."""

    x: tuple[float, ...]
    sd_absolute: float = 0.0  # of the response
    sd_relative: float = 0.0


@dataclass(frozen=True, slots=True)
class Resonance:
    """One signal of a liquid analyte or of the internal standard."""

    analyte: str
    signal: str
    protons: float


@dataclass(frozen=True, slots=True)
class Compartment:
    """Where liquid products end up, and when it was sampled."""

    name: str
    share: float  # of every liquid product
    volumes_m3: tuple[float, ...]  # at each sampling
    aliquots_m3: tuple[float, ...]
    times_second: tuple[float | None, ...]  # None: end of the window
    shares: Mapping[str, float] = field(default_factory=dict)  # of single products, where they differ
    products: tuple[str, ...] | None = None  # None: all liquid products are looked for


@dataclass(frozen=True)
class Hold:
    """One electrolysis."""

    name: str
    time_second: NDArray[np.float64]
    current_ampere: NDArray[np.float64]  # cathodic negative
    potential_rhe_volt: NDArray[np.float64]
    efficiency: Mapping[str, float]  # product -> Faradaic efficiency, constant in time
    catalyst: str = "mesh"
    electrode: str = "m1"
    level: str | None = None
    set_potential_volt: float | None = None
    set_current_ampere: float | None = None
    started: datetime | None = None
    start_second: float | None = None
    stop_second: float | None = None
    electrode_area_m2: float = 1e-4
    pH: float = 6.8
    temperature_kelvin: float = 298.15
    pressure_pascal: float = 101325.0
    resistance_ohm: float = 10.0
    compensated: float = 0.0
    inlet_mol_per_s: float | None = 15e-6
    outlet_mol_per_s: float | None = None  # for outlet_flow = measured or tracer
    outlet_trend: float = 0.0  # relative change of the outlet flow from one injection to the next (tracer)
    tracer_mol_per_s: float | None = None
    headspace_m3: float | None = None
    carbonate_mol_per_s: float = 0.0
    injections_second: tuple[float, ...] = ()
    spoiled: Mapping[int, float] = field(
        default_factory=dict
    )  # injection number -> factor on its peaks; unused
    compartments: tuple[Compartment, ...] = ()
    leak: float = 0.0  # share of the gas lost behind the cell: peaks are low by it, and nothing says so
    note: str = ""

    @cached_property
    def current(self) -> PiecewiseLinear:
        """Current against time."""
        return PiecewiseLinear(self.time_second, self.current_ampere)

    @property
    def window(self) -> tuple[float, float]:
        """Start and stop of the electrolysis. [s]"""
        low = self.time_second[0] if self.start_second is None else self.start_second
        high = self.time_second[-1] if self.stop_second is None else self.stop_second
        return float(low), float(high)

    @cached_property
    def charge_coulomb(self) -> float:
        """Charge of the window, positive for reduction."""
        return -self.current.integral(*self.window)

    @property
    def mean_current_ampere(self) -> float:
        """Mean of -I over the window."""
        low, high = self.window
        return self.charge_coulomb / (high - low)

    @cached_property
    def mean_potential_rhe_volt(self) -> float:
        """Time-weighted mean potential over the window."""
        return PiecewiseLinear(self.time_second, self.potential_rhe_volt).mean(*self.window)

    def charge_until(self, time_second: float) -> float:
        """Charge from the start of the window to ``time_second``."""
        return -self.current.integral(self.window[0], time_second)

    def products(self, phase: str) -> list[str]:
        """Products of one phase, in the order given."""
        return [name for name in self.efficiency if PRODUCTS[name].phase == phase]

    def rate_mol_per_s(self, product: str, current_ampere: float) -> float:
        """Molar rate of a product at a current (positive for reduction)."""
        return self.efficiency[product] * current_ampere / (PRODUCTS[product].electrons * FARADAY)

    @property
    def molar_volume_m3(self) -> float:
        """Volume of a mole of gas at the run's temperature and pressure."""
        return GAS_CONSTANT * self.temperature_kelvin / self.pressure_pascal


@dataclass(frozen=True, slots=True)
class Drift:
    """How the response of one channel and analyte wandered: factors at clock times, straight in between."""

    mole_fraction: float
    at: tuple[datetime, ...]
    factor: tuple[float, ...]

    def at_time(self, clock: datetime) -> float:
        """Factor at a clock time; constant outside the checks."""
        zero = self.at[0]
        seconds = [(one - zero).total_seconds() for one in self.at]
        return float(np.interp((clock - zero).total_seconds(), seconds, self.factor))


@dataclass(frozen=True, slots=True)
class Surface:
    """The double layer of one electrode, and how it was scanned."""

    capacitance_farad: float
    electrode_area_m2: float = 1e-4
    offset_ampere: float = 0.0  # i_0, on every scan alike
    leakage_siemens: float = 0.0  # slope of the current against potential
    drift_ampere: float = 0.0  # a current that both sweeps carry
    rates_volt_per_second: tuple[float, ...] = (0.02, 0.04, 0.06, 0.08, 0.1, 0.12)
    low_volt: float = -0.25
    high_volt: float = -0.15
    margin_volt: float = 0.0  # how far the scan went beyond the window on both sides
    cycles: int = 2
    samples: int = 101  # per sweep
    noise_ampere: float = 0.0


@dataclass(frozen=True, slots=True)
class Error:
    """A standard uncertainty that is declared, and drawn when noise is asked for."""

    quantity: str
    relative: float | None = None
    absolute: float | None = None  # SI
    unit: str | None = None  # how the absolute one is written
    shared: str = "day"


@dataclass(frozen=True)
class DayTruth:
    """A whole day."""

    holds: tuple[Hold, ...]
    gas_curves: Mapping[Key, Curve] = field(default_factory=dict)
    gas_standards: Mapping[Key, Standards] = field(default_factory=dict)
    liquid_curves: Mapping[Key, Curve] = field(default_factory=dict)  # empty: proton counting
    liquid_standards: Mapping[Key, Standards] = field(default_factory=dict)
    resonances: tuple[Resonance, ...] = ()
    standard: str = "DMSO"
    standard_resonances: tuple[Resonance, ...] = (Resonance("DMSO", "CH3", 6),)
    standard_amount_mol: float = 0.2e-6
    title: str = "An invented day"
    day_date: date = date(2043, 5, 18)
    outlet_flow: str = "inlet"
    meter_wet: bool = False
    standard_temperature_kelvin: float = 273.15
    standard_pressure_pascal: float = 101325.0
    current_window_second: float = 120.0
    dead_time_second: float = 0.0
    tracer: str | None = None
    tracer_channel: str = "TCD"
    feed_co2: float = 1.0
    reference_volt: float = 0.210
    reference_volt_per_kelvin: float = 0.0
    reference_name: str | None = None  # written as well; the potential wins
    drift: Mapping[Key, Drift] = field(default_factory=dict)
    # compartment -> product -> concentration that is there without any electrolysis [mol/m^3]
    blanks: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    blank_aliquot_m3: float = 0.5e-6
    surfaces: Mapping[str, Surface] = field(default_factory=dict)
    specific_capacitance: float | None = None  # F/m^2
    smooth_reference: str | None = None
    errors: tuple[Error, ...] = ()
    calibration_names: tuple[str, str] = ("gas-cal", "liquid-cal")


@dataclass(frozen=True, slots=True)
class GasReading:
    """What the gas of one injection held."""

    time_second: float
    current_ampere: float
    outlet_mol_per_s: float
    mole_fraction: Mapping[str, float]


def gas_reading(day: DayTruth, hold: Hold, number: int) -> GasReading:
    """Flow, current and mole fractions at the injection ``number`` of a run, consistent with each other.

    With a balance the outlet flow depends on what is in the gas, and with a headspace the gas depends on the
    outlet flow; both are iterated together until nothing moves.
    """
    time = hold.injections_second[number]
    at_electrode = time - day.dead_time_second
    start, stop = hold.window

    def current(outlet: float) -> float:
        if hold.headspace_m3 is not None:
            # vapour that a wet meter counts flushes the headspace as well
            flushing = outlet * hold.molar_volume_m3 / _dry_share(day, hold)
            tau = hold.headspace_m3 / flushing
            return -hold.current.mixed(start, at_electrode, tau)
        low, high = max(at_electrode - day.current_window_second, start), min(at_electrode, stop)
        return -hold.current.mean(low, high)

    if day.outlet_flow == "inlet":
        assert hold.inlet_mol_per_s is not None
        outlet = hold.inlet_mol_per_s
    elif day.outlet_flow in ("measured", "tracer"):
        assert hold.outlet_mol_per_s is not None
        outlet = hold.outlet_mol_per_s * (1 + hold.outlet_trend * number)
    else:
        assert hold.inlet_mol_per_s is not None
        into_liquid = sum(
            PRODUCTS[name].carbon * hold.rate_mol_per_s(name, hold.mean_current_ampere)
            for name in hold.products("liquid")
        )
        net = hold.inlet_mol_per_s - into_liquid - hold.carbonate_mol_per_s
        outlet = net
        for _ in range(200):
            passed = current(outlet)
            # every molecule of product comes out, and the CO2 it was made of does not
            fresh = net + sum(
                (1 - PRODUCTS[name].carbon) * hold.rate_mol_per_s(name, passed)
                for name in hold.products("gas")
            )
            settled = abs(fresh - outlet) < 1e-15 * outlet
            outlet = fresh
            if settled:
                break
        else:
            raise RuntimeError("the outlet flow of the balance did not settle")
    passed = current(outlet)
    fractions = {name: hold.rate_mol_per_s(name, passed) / outlet for name in hold.products("gas")}
    if day.outlet_flow == "tracer":
        assert hold.tracer_mol_per_s is not None
        assert day.tracer is not None
        fractions[day.tracer] = hold.tracer_mol_per_s / outlet
    return GasReading(time, passed, outlet, fractions)


def _dry_share(day: DayTruth, hold: Hold) -> float:
    """Share of a metered outlet volume that is no water vapour."""
    if day.outlet_flow != "measured" or not day.meter_wet:
        return 1.0
    from tests.forward.chemistry import water_vapour_pascal

    return 1.0 - water_vapour_pascal(hold.temperature_kelvin) / hold.pressure_pascal


@dataclass(frozen=True, slots=True)
class Expected:
    """What a tally must find for one run."""

    charge_coulomb: float
    potential_rhe_volt: float
    current_density: float  # A/m^2
    efficiency: Mapping[str, float]
    total: float
    group: Mapping[str, float]  # "H2", "C1", "C2+"
    ratio: float | None
    ratio_molar: float | None
    roughness: float | None
    conversion: float | None


def expected(day: DayTruth, hold: Hold) -> Expected:
    """The figures of one run, from the truth alone."""
    density = hold.mean_current_ampere / hold.electrode_area_m2
    group = {"H2": 0.0, "C1": 0.0, "C2+": 0.0}
    molar = {"C1": 0.0, "C2+": 0.0}
    for name, share in hold.efficiency.items():
        carbon = PRODUCTS[name].carbon
        label = ("H2", "C1", "C2+")[min(carbon, 2)]
        group[label] += share
        if carbon:
            molar[label] += share / PRODUCTS[name].electrons
    consumed = sum(
        PRODUCTS[name].carbon * hold.rate_mol_per_s(name, hold.mean_current_ampere)
        for name in hold.efficiency
    )
    surface = day.surfaces.get(hold.electrode)
    return Expected(
        charge_coulomb=hold.charge_coulomb,
        potential_rhe_volt=hold.mean_potential_rhe_volt,
        current_density=density,
        efficiency=dict(hold.efficiency),
        total=sum(hold.efficiency.values()),
        group=group,
        ratio=group["C2+"] / group["C1"] if group["C1"] else None,
        ratio_molar=molar["C2+"] / molar["C1"] if molar["C1"] else None,
        roughness=None if surface is None else roughness(day, hold.electrode),
        conversion=None if hold.inlet_mol_per_s is None else consumed / (day.feed_co2 * hold.inlet_mol_per_s),
    )


def roughness(day: DayTruth, electrode: str) -> float | None:
    """Roughness factor of an electrode, or None where no smooth surface is known."""
    surface = day.surfaces[electrode]
    specific = surface.capacitance_farad / surface.electrode_area_m2
    if day.smooth_reference is not None:
        smooth = day.surfaces[day.smooth_reference]
        return specific / (smooth.capacitance_farad / smooth.electrode_area_m2)
    return None if day.specific_capacitance is None else specific / day.specific_capacitance
