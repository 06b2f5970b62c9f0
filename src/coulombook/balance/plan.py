"""The plan of a day: everything that is fixed before the first number is evaluated, and the blocks of inputs.

A plan says which reading belongs to which injection, vial, run and product. The evaluation (`evaluate.py`) turns
inputs into outputs along it and never looks at a name again.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.assumed import assumed_declarations
from coulombook.balance.curves_used import CurvesUsed
from coulombook.balance.gas_plan import GasPlan
from coulombook.balance.liquid_plan import LiquidPlan
from coulombook.balance.readings import Day, DaySettings, FloatArray, Flow, FlowKind, OutletFlow, Run, Signal
from coulombook.balance.scan_verdicts import JudgedScans
from coulombook.balance.spectra_used import SpectrumFigures
from coulombook.balance.surface_plan import SurfacePlan
from coulombook.balance.trace_figures import TraceFigures
from coulombook.curves.inverse import invert
from coulombook.curves.prediction import reading_variance
from coulombook.uncertainty.errors import (
    DAY,
    READING,
    RUN,
    Block,
    Correlated,
    Declaration,
    Inputs,
    Source,
    build_inputs,
)
from coulombook.uncertainty.linearised import IntArray, nominal, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array

INJECTION_SCATTER = Source("injection scatter", RUN)
VIAL_SCATTER = Source("vial scatter", RUN)


@dataclass(frozen=True, slots=True, eq=False)
class FlowPlan:
    """How the flows of one column were written, (R,) each."""

    molar: FloatArray
    standard: FloatArray
    actual: FloatArray
    value: FloatArray  # NaN where a run gives none


def plan_flow(flows: Sequence[Flow | None]) -> FlowPlan:
    """Flows of one column of runs."""

    def kind(which: FlowKind) -> FloatArray:
        return np.array([flow is not None and flow.kind is which for flow in flows], dtype=float)

    value = np.array([np.nan if flow is None else flow.value for flow in flows])
    return FlowPlan(kind(FlowKind.MOLAR), kind(FlowKind.STANDARD), kind(FlowKind.ACTUAL), value)


@dataclass(frozen=True, slots=True, eq=False)
class ProductPlan:
    """The ledger's rows: products of runs, from gas and liquid. Index Q."""

    run: IntArray  # (Q,)
    species: tuple[str, ...]
    phase: tuple[str, ...]
    group: tuple[str, ...]
    electrons: FloatArray  # (Q,)
    carbon: FloatArray  # (Q,)
    from_gas: csr_array  # (Q, GP)
    from_liquid: csr_array  # (Q, LP)


@dataclass(frozen=True, slots=True, eq=False)
class Plan:
    """Fixed structure of a day."""

    day: Day
    scans: JudgedScans
    spectra: tuple[SpectrumFigures | None, ...]  # in the order of ``day.spectra``
    figures: tuple[TraceFigures, ...]
    curves: CurvesUsed
    inlet: FlowPlan
    outlet: FlowPlan
    tracer: FlowPlan
    gas: GasPlan
    liquid: LiquidPlan
    surface: SurfacePlan
    products: ProductPlan
    headspace: NDArray[np.bool_]  # (R,)

    @property
    def settings(self) -> DaySettings:
        """What day.toml says."""
        return self.day.settings

    @property
    def runs(self) -> tuple[Run, ...]:
        """The runs, in the order of their table."""
        return self.day.runs

    @property
    def outlet_flow(self) -> OutletFlow:
        """How the outlet flow is found."""
        return self.settings.outlet_flow

    def with_figures(self, figures: Sequence[TraceFigures]) -> Plan:
        """The same plan on other figures of the same traces."""
        return replace(self, figures=tuple(figures))


def plan_products(day: Day, gas: GasPlan, liquid: LiquidPlan) -> ProductPlan:
    """Ledger rows: by run, then by carbon group, phase and order of appearance; a product of both phases is one row."""
    sources: dict[tuple[int, str], dict[str, int]] = {}
    for place, (run, species) in enumerate(zip(gas.group_run, gas.group_species, strict=True)):
        sources.setdefault((int(run), species.name), {})["gas"] = place
    for place, (run, species) in enumerate(zip(liquid.group_run, liquid.group_species, strict=True)):
        sources.setdefault((int(run), species.name), {})["liquid"] = place

    def order(key: tuple[int, str]) -> tuple[int, int, str, int, str]:
        species = day.species[key[1]]
        return (key[0], species.carbon, "+".join(sources[key]), -species.electrons, species.name)

    keys = sorted(sources, key=order)
    gas_entries = [(row, sources[key]["gas"]) for row, key in enumerate(keys) if "gas" in sources[key]]
    liquid_entries = [
        (row, sources[key]["liquid"]) for row, key in enumerate(keys) if "liquid" in sources[key]
    ]
    made = [day.species[name] for _, name in keys]
    return ProductPlan(
        np.array([run for run, _ in keys], dtype=np.intp),
        tuple(name for _, name in keys),
        tuple("+".join(sources[key]) for key in keys),
        tuple(one.group for one in made),
        np.array([one.electrons for one in made], dtype=np.float64),
        np.array([one.carbon for one in made], dtype=np.float64),
        sparse_map(
            [a for a, _ in gas_entries], [b for _, b in gas_entries], 1.0, (len(keys), len(gas.group_run))
        ),
        sparse_map(
            [a for a, _ in liquid_entries],
            [b for _, b in liquid_entries],
            1.0,
            (len(keys), len(liquid.group_run)),
        ),
    )


def make_inputs(plan: Plan) -> Inputs:
    """All inputs of the measurement function with their declared, assumed and estimated errors, in this order."""
    settings = plan.settings
    declarations = [
        Declaration(one.quantity, one.relative, one.absolute, one.shared) for one in settings.declared
    ]
    blocks = [
        *_curve_blocks(plan),
        *_setting_blocks(plan),
        *_run_blocks(plan),
        *_gas_blocks(plan),
        *_liquid_blocks(plan),
        *_surface_blocks(plan),
    ]
    return build_inputs(
        blocks,
        [*declarations, *assumed_declarations(settings)],
        [*_curve_errors(plan), *_capacitance_errors(plan), *_resistance_errors(plan)],
        ((INJECTION_SCATTER, len(plan.gas.injections.label)), (VIAL_SCATTER, len(plan.liquid.vials))),
    )


def _setting_blocks(plan: Plan) -> list[Block]:
    settings = plan.settings
    nobody = np.array([-1], dtype=np.intp)
    capacitance = settings.specific_capacitance_farad_per_m2
    values = {
        "potential": settings.reference_volt,
        "temperature coefficient": settings.reference_volt_per_kelvin,
        "standard temperature": settings.standard_temperature_kelvin,
        "standard pressure": settings.standard_pressure_pascal,
        "dead time": settings.dead_time_second,
        "feed co2": settings.feed_co2,
        "specific capacitance": np.nan if capacitance is None else capacitance,
    }
    return [Block(name, name, np.array([value], dtype=float), nobody) for name, value in values.items()]


def _run_blocks(plan: Plan) -> list[Block]:
    owner = np.arange(len(plan.runs), dtype=np.intp)
    zero, one = np.zeros(len(plan.runs)), np.ones(len(plan.runs))

    def column(get: Callable[[Run], float | None]) -> FloatArray:
        return np.array([np.nan if get(run) is None else get(run) for run in plan.runs], dtype=float)

    columns: dict[str, FloatArray] = {
        "electrode area": column(lambda run: run.electrode_area_m2),
        "ph": column(lambda run: run.pH),
        "temperature": column(lambda run: run.temperature_kelvin),
        "pressure": column(lambda run: run.pressure_pascal),
        "resistance": column(lambda run: run.resistance_ohm),
        "compensated": column(lambda run: run.compensated),
        "headspace": column(lambda run: run.headspace_m3),
        "carbonate uptake": column(lambda run: run.carbonate_uptake_mol_per_s),
        "inlet flow": plan.inlet.value,
        "outlet flow": plan.outlet.value,
        "tracer flow": plan.tracer.value,
    }
    mean = np.array([one.charge_coulomb / (one.stop_second - one.start_second) for one in plan.figures])
    noise = np.array([one.noise_weight for one in plan.figures])
    potential = np.array([one.mean_potential_volt for one in plan.figures])
    # some logs count the cell voltage from the other electrode
    voltage = np.abs(np.array([one.mean_cell_voltage_volt for one in plan.figures], dtype=float))
    return [
        *(Block(name, name, values, owner) for name, values in columns.items()),
        # errors of the trace: a gain and an offset that a day or a run shares, and the noise of single samples,
        # which the mean over a window averages down
        Block("current gain", "i", zero, owner, one, zero, (DAY, RUN)),
        Block("current offset", "i", zero, owner, zero, one, (DAY, RUN)),
        Block("current noise", "i", zero, owner, mean * noise, noise, (READING,)),
        Block("mean potential", "e", potential, owner, sharings=(DAY, RUN)),
        Block("cell voltage", "u", voltage, owner, None, np.isfinite(voltage).astype(float), (DAY, RUN)),
        Block("potential noise", "e", zero, owner, potential * noise, noise, (READING,)),
    ]


def _gas_blocks(plan: Plan) -> list[Block]:
    gas = plan.gas
    place = {run.name: number for number, run in enumerate(plan.runs)}
    peak_owner = np.array([place[peak.run] for peak in gas.peaks], dtype=np.intp)
    check_owner = len(plan.runs) + np.arange(len(gas.check_area), dtype=np.intp)
    injections = gas.injections
    zero = np.zeros(len(injections.label))
    current = _by_injection(plan, lambda figures: figures.injection_current_ampere)
    noise = _by_injection(plan, lambda figures: figures.injection_noise_weight)
    area = np.array([peak.peak_area for peak in gas.peaks], dtype=float)
    a0, a1, a2 = (one[gas.peak_curve] for one in plan.curves.coefficients())
    scatter = _reading_scatter(plan, gas.peak_curve, nominal(invert(a0, a1, a2, area)))
    of_checks = _reading_scatter(plan, gas.check_curve, gas.check_mole_fraction)
    return [
        Block("peak area", "peak area", area, peak_owner, _assumed_size(plan, "peak area", area, scatter)),
        Block(
            "check area",
            "peak area",
            gas.check_area,
            check_owner,
            _assumed_size(plan, "peak area", gas.check_area, of_checks),
        ),
        Block("check mole fraction", "mole fraction", gas.check_mole_fraction, check_owner),
        Block("injection delay", "time", zero, injections.run, injections.time_second, np.ones(len(zero))),
        Block("injection current noise", "i", zero, injections.run, current * noise, noise, (READING,)),
    ]


def _reading_scatter(plan: Plan, curve: IntArray, x: FloatArray) -> FloatArray:
    """Standard deviation of a single response about its curve, (n,); 0 where none is known (-1: no curve)."""
    sd = np.zeros(len(x))
    for number in np.unique(curve[curve >= 0]).tolist():
        held, used = curve == number, plan.curves.used[number].curve
        if used is not None:
            sd[held] = np.nan_to_num(np.sqrt(reading_variance(used, x[held])))
    return sd


def _assumed_size(plan: Plan, quantity: str, value: FloatArray, scatter: FloatArray) -> FloatArray | None:
    """What a relative error of a reading counts from, where it is assumed and not declared.

    No reading repeats better than the standards did about their curve, so that the assumed share of this size is the
    scatter of a reading where that exceeds the assumed share of the reading itself: near the detection limit.
    """
    for one in assumed_declarations(plan.settings):
        if one.quantity == quantity and one.relative:
            return np.maximum(np.abs(value), scatter / one.relative)
    return None


def _by_injection(plan: Plan, get: Callable[[TraceFigures], FloatArray]) -> FloatArray:
    """A figure of every injection, in the plan's order (by run, then time)."""
    return np.concatenate([get(figures) for figures in plan.figures]) if plan.figures else np.zeros(0)


def _liquid_blocks(plan: Plan) -> list[Block]:
    liquid = plan.liquid
    place = {run.name: number for number, run in enumerate(plan.runs)}
    beyond = len(plan.runs)
    owner = np.array(
        [
            place[vial.run] if vial.run is not None and not vial.blank else beyond + number
            for number, vial in enumerate(liquid.vials)
        ],
        dtype=np.intp,
    )
    volume = [
        np.nan if vial.compartment_volume_m3 is None else vial.compartment_volume_m3 for vial in liquid.vials
    ]
    integral = np.array([signal.integral for signal in liquid.signals], dtype=float)
    return [
        Block("compartment volume", "compartment volume", np.array(volume, dtype=float), owner),
        Block("aliquot", "aliquot", np.array([vial.aliquot_m3 for vial in liquid.vials], dtype=float), owner),
        Block(
            "standard amount",
            "standard amount",
            np.array([vial.standard_amount_mol for vial in liquid.vials], dtype=float),
            owner,
        ),
        Block(
            "integral",
            "integral",
            integral,
            owner[liquid.signal_vial],
            _assumed_size(plan, "integral", integral, _integral_scatter(plan, integral)),
        ),
        Block(
            "standard integral",
            "integral",
            np.array([signal.integral for signal in liquid.standard_signals], dtype=float),
            owner[liquid.standard_vial],
        ),
        _relaxation("t1", liquid.signals, owner[liquid.signal_vial]),
        _relaxation("standard t1", liquid.standard_signals, owner[liquid.standard_vial]),
    ]


def _integral_scatter(plan: Plan, integral: FloatArray) -> FloatArray:
    """Standard deviation of each analyte's integral about its curve, (S,), the internal standard taken as it is."""
    liquid = plan.liquid
    per_proton = np.array([one.integral / one.protons for one in liquid.standard_signals], dtype=float)
    count = np.bincount(liquid.standard_vial, minlength=len(liquid.vials))
    with np.errstate(invalid="ignore", divide="ignore"):
        standard = np.bincount(liquid.standard_vial, per_proton, len(liquid.vials)) / count
    unit = standard[liquid.signal_vial] * np.array([one.protons for one in liquid.signals], dtype=float)
    a0, a1, a2 = (one[liquid.signal_curve] for one in plan.curves.coefficients())
    x = nominal(invert(a0, a1, a2, integral / unit))
    scatter: FloatArray = unit * _reading_scatter(plan, liquid.signal_curve, x)
    return scatter


def _relaxation(name: str, signals: Sequence[Signal], owner: IntArray) -> Block:
    """T1 of each signal; one second, without error and without effect, where it is not known."""
    known = np.array([signal.relaxation_second is not None for signal in signals], dtype=bool)
    values = np.array([signal.relaxation_second or 1.0 for signal in signals], dtype=float)
    return Block(name, "t1", values, owner, np.where(known, values, 0.0), known.astype(np.float64))


def _surface_blocks(plan: Plan) -> list[Block]:
    surface = plan.surface
    owner = len(plan.runs) + surface.scan_electrode
    electrode = len(plan.runs) + np.arange(len(surface.electrodes), dtype=np.intp)
    return [
        Block("scan area", "electrode area", surface.electrode_area_m2, owner),
        Block("scan rate", "scan rate", surface.scan_rate_volt_per_second, owner),
        Block(
            "charging current",
            "i",
            surface.charging_current_ampere,
            owner,
            per_absolute=np.zeros(
                len(surface.charging_current_ampere)
            ),  # an offset cancels in the half difference
            sharings=(DAY, RUN),
        ),
        Block("capacitance scatter", "capacitance", np.zeros(len(electrode)), electrode, sharings=()),
    ]


def _curve_blocks(plan: Plan) -> list[Block]:
    """Coefficients of the curves used, the line of slope 1 last."""
    nobody = -1 - np.arange(len(plan.curves.used) + 1, dtype=np.intp)
    return [
        Block(name, "curve", values, nobody, sharings=())
        for name, values in zip(("a0", "a1", "a2"), plan.curves.coefficients(), strict=True)
    ]


def _curve_errors(plan: Plan) -> list[Correlated]:
    """Errors of the coefficients. A curve made like another shares that one's errors and adds one of its own."""
    errors = []
    for number, one in enumerate(plan.curves.used):
        if one.curve is None or one.like is not None:
            continue
        own = one.curve.factor.shape[1]
        rows, factors = [_coefficients(number)], [one.curve.factor]
        for place, other in enumerate(plan.curves.used):
            if other.like == number and other.curve is not None:
                rows.append(_coefficients(place))
                factors.append(other.curve.factor[:, :own])
                errors.append(
                    Correlated(
                        Source(f"carbon number {other.name}", DAY),
                        _coefficients(place),
                        other.curve.factor[:, own:],
                    )
                )
        errors.append(
            Correlated(Source(f"curve {one.name}", DAY), tuple(sum(rows, ())), np.concatenate(factors))
        )
    return errors


def _coefficients(number: int) -> tuple[tuple[str, int], ...]:
    return (("a0", number), ("a1", number), ("a2", number))


def _capacitance_errors(plan: Plan) -> list[Correlated]:
    settings = plan.settings
    value, share = settings.specific_capacitance_farad_per_m2, settings.u_specific_capacitance
    errors = []
    # what day.toml declares of it stands in place of the table's own
    if (
        value is not None
        and share > 0
        and not any(one.quantity == "specific capacitance" for one in settings.declared)
    ):
        errors.append(
            # one error for every electrode held against it, so that it cancels between them
            Correlated(
                Source("specific capacitance", DAY),
                (("specific capacitance", 0),),
                np.array([[share * value]]),
            )
        )
    return errors + [
        Correlated(Source(name, DAY), (("capacitance scatter", number),), np.array([[u]]))
        for number, one in enumerate(plan.surface.methods)
        for name, u in (("capacitance fit", one.u_scatter), ("capacitance method", one.u_method))
        if np.isfinite(u) and u > 0
    ]


def _resistance_errors(plan: Plan) -> list[Correlated]:
    """Errors of resistances from spectra, shared by the runs that have them from the same ones."""
    groups: dict[str, list[int]] = {}
    for number, run in enumerate(plan.runs):
        if run.resistance_from and np.isfinite(run.u_resistance_ohm) and run.u_resistance_ohm > 0:
            groups.setdefault(run.resistance_from, []).append(number)
    return [
        Correlated(
            Source(f"spectrum {files}", DAY),
            tuple(("resistance", number) for number in numbers),
            np.array([[plan.runs[number].u_resistance_ohm] for number in numbers]),
        )
        for files, numbers in groups.items()
    ]
