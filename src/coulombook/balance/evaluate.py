"""The measurement function: from readings to Faradaic efficiencies, written once.

`read_injections` and `read_liquids` go as far as single injections and compartments, `close_books` sums them up. All of
it is arithmetic along the plan: plain arrays give nominal values, arrays (n_draws, n) give Monte Carlo values, and
`Linearised` numbers give values with their covariances.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from coulombook.amounts.gas import (
    charge_rate_ampere,
    dry_share,
    mixing_time_second,
    molar_density,
    outlet_from_carbon_balance,
    outlet_from_tracer,
)
from coulombook.amounts.liquid import (
    amount_in_compartment_mol,
    concentration_mol_per_m3,
    integral_per_proton,
    tube_amount_mol,
)
from coulombook.amounts.water import saturated_water_vapour_pascal
from coulombook.balance.plan import FlowPlan, Plan
from coulombook.balance.readings import FloatArray, OutletFlow, Signal
from coulombook.cell.potential import potential_rhe_volt, reference_potential_volt
from coulombook.constants import FARADAY_CONSTANT
from coulombook.curves.inverse import invert, response
from coulombook.curves.nmr import saturation_factor
from coulombook.uncertainty.linearised import (
    IntArray,
    Number,
    chain_each,
    gather,
    known_where,
    linear_map,
    nominal,
    select,
    sparse_map,
    without_slope,
)

Numbers = Mapping[str, Number]


@dataclass(frozen=True, slots=True, eq=False)
class Electrical:
    """Charge, current and potential of each run, (R,)."""

    charge_coulomb: Number
    mean_current_ampere: Number  # positive for reduction
    potential_rhe_volt: Number
    current_density_ampere_per_m2: Number


@dataclass(frozen=True, slots=True, eq=False)
class Liquids:
    """Liquid products."""

    amount_ratio: Number  # (S,) of each signal to its internal standard
    concentration_mol_per_m3: Number  # (A,) blanks subtracted
    amount_mol: Number  # (L,) in a compartment up to its last sampling
    compartment_efficiency: Number  # (L,)
    faradaic_efficiency: Number  # (LP,) of a run


@dataclass(frozen=True, slots=True, eq=False)
class GasReadings:
    """Gas products of single injections."""

    mole_fraction: Number  # (G,)
    inlet_mol_per_s: Number  # (R,)
    outlet_mol_per_s: Number  # (K,)
    mixing_time_second: Number  # (K,) NaN where no headspace is given
    current_ampere: Number  # (K,)
    faradaic_efficiency: Number  # (G,) zero for the tracer


@dataclass(frozen=True, slots=True, eq=False)
class Outcome:
    """What the books say: products (Q,) and runs (R,)."""

    electrical: Electrical
    faradaic_efficiency: Number  # (Q,)
    amount_mol: Number  # (Q,)
    partial_current_density_ampere_per_m2: Number  # (Q,)
    real_partial_current_density_ampere_per_m2: Number  # (Q,) NaN without roughness factor
    total: Number  # (R,)
    hydrogen: Number  # (R,)
    c1: Number  # (R,)
    c2_plus: Number  # (R,)
    ratio: Number  # (R,) C2+/C1 by charge
    ratio_molar: Number  # (R,)
    co2_conversion: Number  # (R,) NaN where no inlet flow is given
    capacitance_farad: Number  # (El,)
    roughness_factor: Number  # (El,)
    run_roughness_factor: Number  # (R,)


def _every(count: int) -> IntArray:
    """Index that repeats a single value ``count`` times."""
    return np.zeros(count, dtype=np.intp)


def read_electrical(plan: Plan, x: Numbers) -> Electrical:
    """Charge, current and potential of each run."""
    figures = plan.figures
    duration = np.array([one.stop_second - one.start_second for one in figures])
    charge = np.array([one.charge_coulomb for one in figures])
    current = charge / duration * (1.0 + x["current gain"]) + x["current offset"] + x["current noise"]
    runs = _every(len(figures))
    reference = reference_potential_volt(
        gather(x["potential"], runs), gather(x["temperature coefficient"], runs), x["temperature"]
    )
    potential = potential_rhe_volt(
        x["mean potential"] + x["potential noise"],
        reference,
        x["ph"],
        x["temperature"],
        -current,
        x["resistance"],
        x["compensated"],
    )
    return Electrical(current * duration, current, potential, current / x["electrode area"])


@dataclass(frozen=True, slots=True, eq=False)
class PerProton:
    """Integrals per proton: as measured, and as full relaxation would have given them where T1 is known."""

    measured: Number
    relaxed: Number


def per_proton(signals: Sequence[Signal], integral: Number, t1: Number) -> PerProton:
    """Integrals of some signals per proton, in the order of ``signals``."""
    protons = np.array([signal.protons for signal in signals], dtype=float)
    known = np.array([signal.relaxation_second is not None for signal in signals], dtype=bool)
    measured = integral_per_proton(integral, protons)
    if not known.any():
        return PerProton(measured, measured)
    repetition = np.array([signal.repetition_second or 1.0 for signal in signals], dtype=float)
    flip = np.array([signal.flip_angle_radian or np.pi / 2 for signal in signals], dtype=float)
    return PerProton(measured, select(known, measured / saturation_factor(repetition, t1, flip), measured))


def standard_signals(plan: Plan, x: Numbers) -> PerProton:
    """Each signal of an internal standard, (T,)."""
    return per_proton(plan.liquid.standard_signals, x["standard integral"], x["standard t1"])


def response_ratios(plan: Plan, x: Numbers, standard: PerProton) -> Number:
    """Response of each signal per proton over that of its internal standard, (S,).

    A signal that is read by a curve stays as measured, for the curve holds the saturation of its standards already;
    without a curve protons are counted, and saturation is corrected for.
    """
    liquid = plan.liquid
    signal = per_proton(liquid.signals, x["integral"], x["t1"])
    return select(
        liquid.signal_curve < 0,
        signal.relaxed / gather(standard.relaxed, liquid.signal_vial),
        signal.measured / gather(standard.measured, liquid.signal_vial),
    )


def signal_ratios(plan: Plan, x: Numbers, standard: PerProton) -> Number:
    """Amount ratio of each signal (S,) to its internal standard (V,), through the signal's curve if it has one."""
    a0, a1, a2 = (gather(x[name], plan.liquid.signal_curve) for name in ("a0", "a1", "a2"))
    return invert(a0, a1, a2, response_ratios(plan, x, standard))


def standards_of_vials(plan: Plan, standards: PerProton, weights: FloatArray) -> PerProton:
    """Signals of each vial's internal standard combined, (V,)."""
    liquid = plan.liquid
    n = len(liquid.standard_signals)
    average = sparse_map(liquid.standard_vial, np.arange(n), weights, (len(liquid.vials), n))
    return PerProton(linear_map(average, standards.measured), linear_map(average, standards.relaxed))


@dataclass(frozen=True, slots=True, eq=False)
class SignalWeights:
    """Weights of the signals that speak of one thing; each group adds up to one."""

    standard: FloatArray  # (T,)
    analyte: FloatArray  # (S,)
    u_ratio: (
        FloatArray  # (S,) standard uncertainty of each signal's ratio, without what signals of a vial share
    )


def read_liquids(plan: Plan, x: Numbers, weights: SignalWeights) -> Liquids:
    """From integrals to the Faradaic efficiency of liquid products."""
    liquid = plan.liquid
    n_signal = len(liquid.signals)
    standard = standards_of_vials(plan, standard_signals(plan, x), weights.standard)
    ratio = signal_ratios(plan, x, standard)
    combine = sparse_map(
        liquid.signal_analyte, np.arange(n_signal), weights.analyte, (len(liquid.analyte_vial), n_signal)
    )
    vial = liquid.analyte_vial
    in_tube = tube_amount_mol(linear_map(combine, ratio), gather(x["standard amount"], vial))
    aliquot = gather(x["aliquot"], vial)
    measured = concentration_mol_per_m3(in_tube, aliquot)
    concentration = measured - linear_map(liquid.blanks, measured)
    amount = amount_in_compartment_mol(
        linear_map(liquid.replicate_mean, concentration),
        linear_map(liquid.volume_mean, x["compartment volume"]),
        linear_map(liquid.withdrawn, concentration * aliquot),
    )
    charge = charge_to_sampling(plan, x)
    efficiency = liquid.electrons * FARADAY_CONSTANT * amount / gather(charge, liquid.product_sampling)
    return Liquids(ratio, concentration, amount, efficiency, linear_map(liquid.compartments, efficiency))


def charge_to_sampling(plan: Plan, x: Numbers) -> Number:
    """Charge passed up to each sampling, (M,)."""
    run = plan.liquid.samplings.run
    charge = np.concatenate([one.sampling_charge_coulomb for one in plan.figures])
    duration = np.concatenate([one.sampling_duration_second for one in plan.figures])
    offset = x["current offset"] + x["current noise"]
    return charge * (1.0 + gather(x["current gain"], run)) + duration * gather(offset, run)


def molar_flow(flow: FlowPlan, x: Numbers, name: str) -> Number:
    """Flow of one column of runs as amount per time, (R,). [mol/s]"""
    runs = _every(len(flow.value))
    standard = molar_density(gather(x["standard pressure"], runs), gather(x["standard temperature"], runs))
    actual = molar_density(x["pressure"], x["temperature"])
    return x[name] * (flow.molar + flow.standard * standard + flow.actual * actual)


def drift_factor(plan: Plan, x: Numbers) -> Number:
    """Drift of the detector at each peak, (P,): measured over expected area of the check gas, interpolated."""
    gas = plan.gas
    a0, a1, a2 = (gather(x[name], gas.check_curve) for name in ("a0", "a1", "a2"))
    expected = response(a0, a1, a2, x["check mole fraction"])
    return linear_map(gas.drift, x["check area"] / expected) + gas.undrifted


def read_injections(plan: Plan, x: Numbers, electrical: Electrical, liquids: Liquids) -> GasReadings:
    """From peak areas to the Faradaic efficiency of each gas product in each injection."""
    gas = plan.gas
    a0, a1, a2 = (gather(x[name], gas.peak_curve) for name in ("a0", "a1", "a2"))
    by_peak = invert(a0, a1, a2, x["peak area"] / drift_factor(plan, x))
    mole_fraction = linear_map(gas.channel_mean, by_peak)

    run = gas.injections.run
    inlet = molar_flow(plan.inlet, x, "inlet flow")
    outlet = _outlet(plan, x, inlet, mole_fraction, electrical, liquids)
    # of the volume that a wet meter counts, in the headspace as in the meter, only a part is the gas of the outlet flow
    density = molar_density(x["pressure"], x["temperature"]) * dry_outlet(plan, x)
    # no outlet flow, no mixing: NaN passes silently to the verdicts, which tell of it; infinity would make noise
    flowing = known_where(lambda values: values > 0.0, outlet)
    mixing = mixing_time_second(gather(x["headspace"], run), flowing, gather(density, run))
    current = _injection_current(plan, x, mixing)
    injection = gas.reading_injection
    # likewise, no current, no efficiency
    passing = known_where(lambda values: values != 0.0, current)
    # divided before it is gathered: there are fewer injections than readings
    per_ampere = gather(outlet / passing, injection)
    efficiency = charge_rate_ampere(gas.electrons, mole_fraction * per_ampere)
    return GasReadings(mole_fraction, inlet, outlet, mixing, current, efficiency)


def _outlet(
    plan: Plan, x: Numbers, inlet: Number, mole_fraction: Number, electrical: Electrical, liquids: Liquids
) -> Number:
    """Outlet molar flow at each injection, (K,)."""
    run = plan.gas.injections.run
    match plan.outlet_flow:
        case OutletFlow.INLET:
            return gather(inlet, run)
        case OutletFlow.MEASURED:
            return gather(molar_flow(plan.outlet, x, "outlet flow") * dry_outlet(plan, x), run)
        case OutletFlow.TRACER:
            tracer = molar_flow(plan.tracer, x, "tracer flow")
            # an injection that is not used may lack the tracer's peak: no flow is known then
            known = np.where(plan.gas.tracer_reading < 0, np.nan, 0.0)
            return outlet_from_tracer(
                gather(tracer, run), gather(mole_fraction, plan.gas.tracer_reading) + known
            )
        case OutletFlow.BALANCE:
            return outlet_from_carbon_balance(
                gather(inlet, run),
                gather(carbon_to_liquid_mol_per_s(plan, electrical, liquids), run),
                gather(x["carbonate uptake"], run),
                linear_map(plan.gas.net_gas, mole_fraction),
            )


def carbon_to_liquid_mol_per_s(plan: Plan, electrical: Electrical, liquids: Liquids) -> Number:
    """CO2 that ends in liquid products, mean over each run, (R,). [mol/s]"""
    liquid = plan.liquid
    rate = liquids.faradaic_efficiency * gather(electrical.mean_current_ampere, liquid.group_run)
    electrons = np.array([one.electrons for one in liquid.group_species], dtype=float)
    return linear_map(liquid.carbon_per_run, rate / (electrons * FARADAY_CONSTANT))


def dry_outlet(plan: Plan, x: Numbers) -> Number:
    """Share of the metered outlet volume that is not water vapour, (R,): 1 unless a wet volume was measured."""
    every = np.ones(len(plan.runs))
    if plan.outlet_flow is not OutletFlow.MEASURED or not plan.settings.meter_gas_wet:
        return every
    dry = dry_share(saturated_water_vapour_pascal(x["temperature"]), x["pressure"])
    # a standard flow is an amount already; only a volume holds the water
    return select(plan.outlet.actual > 0, dry, every)


def _injection_current(plan: Plan, x: Numbers, mixing: Number) -> Number:
    """The charge rate each injection is compared with, (K,). [A]"""
    run = plan.gas.injections.run
    delay = x["injection delay"] - gather(x["dead time"] - plan.settings.dead_time_second, _every(len(run)))
    gain, offset = gather(x["current gain"], run), gather(x["current offset"], run)
    window = np.concatenate([one.injection_current_ampere for one in plan.figures])
    if not plan.headspace.any():
        seen: Number = window
        memory = offset
        slope: Number = np.concatenate([one.injection_slope_ampere_per_second for one in plan.figures])
    else:
        mixed_run = plan.headspace[run]
        since = np.concatenate([one.injection_since_second for one in plan.figures])
        now = np.concatenate([one.injection_now_ampere for one in plan.figures])
        direct = np.concatenate([one.injection_slope_ampere_per_second for one in plan.figures])

        def mixed(tau: FloatArray, injections: IntArray) -> tuple[FloatArray, FloatArray]:
            return mixed_current(plan, tau, injections)

        seen = select(mixed_run, chain_each(mixing, mixed), window)
        # a constant offset builds up in the headspace like any other current
        memory = select(mixed_run, offset * (1.0 - np.exp(-since / mixing)), offset)
        slope = select(mixed_run, (now - without_slope(seen)) / without_slope(mixing), direct)
    return seen * (1.0 + gain) + memory + x["injection current noise"] + slope * delay


def mixed_current(plan: Plan, tau_second: FloatArray, injections: IntArray) -> tuple[FloatArray, FloatArray]:
    """Current that the headspace remembers at some injections (k,), with its derivative by tau; (..., k) each.

    NaN where tau lies too far from what the log was read for.
    """
    value = np.full(tau_second.shape, np.nan)
    slope = np.full(tau_second.shape, np.nan)
    run = plan.gas.injections.run[injections]
    for number in np.unique(run).tolist():
        series = plan.figures[number].mixed
        if series is not None:
            held = np.flatnonzero(run == number)
            part = series.of(injections[held] - plan.gas.injections.of_run(number)[0])
            tau = tau_second[..., held]
            covered = part.covers(tau)
            found, slope[..., held] = part.value_and_slope(tau)
            value[..., held] = np.where(covered, found, np.nan)
    return value, slope


def dioxide_fed_mol_per_s(plan: Plan, x: Numbers, readings: GasReadings) -> Number:
    """CO2 that enters with the feed of each run, (R,); NaN where no inlet flow is given. [mol/s]"""
    return gather(x["feed co2"], _every(len(plan.runs))) * readings.inlet_mol_per_s


def close_books(
    plan: Plan,
    x: Numbers,
    electrical: Electrical,
    readings: GasReadings,
    gas_efficiency: Number,
    liquid_efficiency: Number,
    counted: FloatArray,
) -> Outcome:
    """Sum up.

    ``gas_efficiency`` (GP,) is the mean over the used injections, scatter of the injections included, and
    ``liquid_efficiency`` (LP,) that of the liquid products, scatter of replicate vials included; ``counted`` (Q,) is 1
    for products that enter the totals and 0 for those below detection.
    """
    products, surface = plan.products, plan.surface
    n_runs, n_products = len(plan.runs), len(products.run)
    efficiency = linear_map(products.from_gas, gas_efficiency) + linear_map(
        products.from_liquid, liquid_efficiency
    )
    per_charge = 1.0 / (products.electrons * FARADAY_CONSTANT)
    amount = efficiency * gather(electrical.charge_coulomb, products.run) * per_charge
    partial = efficiency * gather(electrical.current_density_ampere_per_m2, products.run)
    capacitance, roughness = _roughness(plan, x)
    run_roughness = linear_map(surface.runs, roughness) + np.where(surface.run_has, 0.0, np.nan)

    def total(keep: FloatArray, what: Number) -> Number:
        kept = keep * counted
        return linear_map(sparse_map(products.run, np.arange(n_products), kept, (n_runs, n_products)), what)

    one = (products.carbon == 1).astype(float)
    more = (products.carbon > 1).astype(float)
    c1, c2_plus = total(one, efficiency), total(more, efficiency)
    feed = dioxide_fed_mol_per_s(plan, x, readings)
    carbon_used = total(products.carbon * per_charge, efficiency) * electrical.mean_current_ampere
    # without a C1 product there is nothing to divide by
    has_c1 = np.where(nominal(total(one, np.ones(n_products))) > 0, 0.0, np.nan)
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio, ratio_molar = c2_plus / (c1 + has_c1), total(more, amount) / (total(one, amount) + has_c1)
        conversion = carbon_used / feed
    return Outcome(
        electrical,
        efficiency,
        amount,
        partial,
        partial / gather(run_roughness, products.run),
        total(np.ones(n_products), efficiency),
        total((products.carbon == 0).astype(float), efficiency),
        c1,
        c2_plus,
        ratio,
        ratio_molar,
        conversion,
        capacitance,
        roughness,
        run_roughness,
    )


def _roughness(plan: Plan, x: Numbers) -> tuple[Number, Number]:
    """Double-layer capacitance and roughness factor of each electrode, (El,)."""
    surface = plan.surface
    electrode = surface.scan_electrode
    rate, current = x["scan rate"], x["charging current"]
    centred = rate - gather(linear_map(surface.mean, rate), electrode)
    # least squares with intercept: C = sum (v - mean v) i / sum (v - mean v)^2
    slope = linear_map(surface.total, centred * current) / linear_map(surface.total, centred * centred)
    capacitance = slope + x["capacitance scatter"]
    specific = capacitance / linear_map(surface.mean, x["scan area"])
    if surface.smooth is not None:
        smooth = gather(specific, np.full(len(surface.electrodes), surface.smooth, dtype=np.intp))
    else:
        smooth = gather(x["specific capacitance"], _every(len(surface.electrodes)))
    return capacitance, specific / smooth


def mean_over_injections(plan: Plan, readings: GasReadings) -> Number:
    """Faradaic efficiency of each gas product of a run: the mean over its used injections, (GP,)."""
    gas = plan.gas
    count = np.bincount(gas.pooled_group, minlength=len(gas.group_run)).astype(float)
    average = sparse_map(
        gas.pooled_group,
        np.arange(len(gas.pooled_reading)),
        1.0 / count[gas.pooled_group],
        (len(gas.group_run), len(gas.pooled_reading)),
    )
    return linear_map(average, gather(readings.faradaic_efficiency, gas.pooled_reading))


def evaluate(
    plan: Plan,
    x: Numbers,
    weights: SignalWeights,
    counted: FloatArray,
    scatter: Number | float = 0.0,
    liquid_scatter: Number | float = 0.0,
) -> Outcome:
    """The whole measurement function.

    ``counted`` (Q,) tells which products enter the totals: a decision of the day, taken once at the nominal point.
    ``scatter`` (GP,) is the error of each run's mean over injections that the readings' own errors do not explain, and
    ``liquid_scatter`` (LP,) that of the means over replicate vials; zero at the nominal point.
    """
    electrical = read_electrical(plan, x)
    liquids = read_liquids(plan, x, weights)
    readings = read_injections(plan, x, electrical, liquids)
    gas_efficiency = mean_over_injections(plan, readings) + scatter
    liquid_efficiency = liquids.faradaic_efficiency + liquid_scatter
    return close_books(plan, x, electrical, readings, gas_efficiency, liquid_efficiency, counted)
