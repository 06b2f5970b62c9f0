"""Judgements on a settled day: what cannot be, what may mislead, and whether the balance closes."""

from __future__ import annotations

from collections.abc import Mapping
from statistics import NormalDist

import numpy as np

from coulombook.balance.evaluate import drift_factor
from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.curves.control import ACTION, control_chart
from coulombook.curves.inverse import invertible
from coulombook.curves.nmr import signal_agreement
from coulombook.findings import Findings
from coulombook.prose.numbers import with_uncertainty
from coulombook.uncertainty.linearised import nominal, standard_uncertainty
from coulombook.units import written

QUANTIFIED, ABOVE, BELOW = "quantified", "above calibration", "below calibration"
UNDETECTED = "below detection"
CLOSED, SHORT, OVER = "closed", "short", "over"

# signals are called odd when chance alone would part them so in fewer than one vial in a thousand
_ODD = 0.001

# a reading is outside the range when it is so by more than rounding
_SLACK = 1e-9


def report_faults(settled: Settled, findings: Findings) -> None:
    """Faults that only the numbers show: curves that cannot be inverted at a reading, flows that run dry."""
    plan, gas = settled.plan, settled.plan.gas
    x = settled.inputs.nominal
    drift = nominal(drift_factor(plan, x))
    peak_ok = invertible(
        x["a0"][gas.peak_curve], x["a1"][gas.peak_curve], x["a2"][gas.peak_curve], x["peak area"] / drift
    )
    for number in np.flatnonzero(~peak_ok):
        peak = gas.peaks[number]
        if peak.used:
            findings.add(
                "broken-curve",
                peak.origin.of("peak area"),
                f"the curve of {peak.analyte} on {peak.channel} does not reach this peak area on its rising branch",
                "mark the peak with use = no, or calibrate over a range that holds it",
                found=f"{peak.peak_area:g}",
                expected=_within_reach("an area", x, int(gas.peak_curve[number]), float(drift[number])),
            )
    for number in np.flatnonzero(~np.isfinite(nominal(settled.liquids.amount_ratio))):
        signal = plan.liquid.signals[number]
        curve = int(plan.liquid.signal_curve[number])
        findings.add(
            "broken-curve",
            signal.origin.of("integral"),
            f"the curve of {signal.analyte} {signal.signal} does not reach this integral on its rising branch",
            "calibrate over a range that holds it",
            found=f"{signal.integral:g}",
            expected=_within_reach("an integral ratio per proton", x, curve),
        )
    outlet = nominal(settled.readings.outlet_mol_per_s)
    current = nominal(settled.readings.current_ampere)
    injections = gas.injections
    used = np.zeros(len(injections.label), dtype=bool)
    used[gas.reading_injection[gas.reading_used]] = True
    for number in np.flatnonzero(used):
        run = plan.runs[injections.run[number]].name
        where = f"run {run}, injection {injections.label[number]} ({injections.origin[number]})"
        if not outlet[number] > 0:
            findings.add(
                "not-allowed",
                where,
                "the outlet flow is used up",
                "check the flows, the tracer's peak and the carbonate uptake of the run",
                found=f"{outlet[number] * 1e6:.4g} umol/s",
                expected="a flow above zero",
            )
        elif not current[number] > 0:
            findings.add(
                "anodic-run",
                where,
                "the current that belongs to the injection is not cathodic",
                "check the sign of the current (cathodic is negative) and the time of the injection",
                found=f"{-current[number] * 1e3:.4g} mA",
                expected="a cathodic current, which is negative",
            )


def _within_reach(what: str, x: Mapping[str, FloatArray], curve: int, drift: float = 1.0) -> str:
    """What a curve can be inverted at, in words: up to (or down to) the response at its turning point."""
    a0, a1, a2 = (float(x[name][curve]) for name in ("a0", "a1", "a2"))
    if a2 == 0.0:
        return f"{what} that can be computed with"
    side = "below" if a2 < 0 else "above"
    return f"{what} {side} that of the curve's turning point, {drift * (a0 - a1**2 / (4.0 * a2)):.4g}"


def closures(settled: Settled) -> tuple[list[str], FloatArray]:
    """Verdict on each run's balance, and the uncertainty of its total, (R,).

    Closed when the total differs from 1 by no more than k u, k being the two-sided normal quantile of the level of
    confidence, and u the uncertainty of the total together with the share the day allows to be unaccounted for.
    """
    total = nominal(settled.outcome.total)
    near = np.abs(total - 1.0) <= allowed_deviation(settled)
    verdict = np.where(near, CLOSED, np.where(total < 1.0, SHORT, OVER))
    return [str(one) for one in verdict], standard_uncertainty(settled.outcome.total)


def allowed_deviation(settled: Settled) -> FloatArray:
    """How far each run's total may lie off without being called so, (R,); see `closures`. [1]"""
    settings = settled.plan.settings
    u = standard_uncertainty(settled.outcome.total)
    factor = NormalDist().inv_cdf(0.5 + settings.level_of_confidence / 2)
    # rounding alone must not open a balance that has no uncertainty
    result: FloatArray = factor * np.hypot(u, settings.unaccounted or 0.0) + _SLACK
    return result


def product_status(settled: Settled) -> list[str]:
    """Status of each row of the ledger, (Q,): below detection, or within, above or below the range of its curve."""
    plan = settled.plan
    place = {
        key: row
        for row, key in enumerate(zip(plan.products.run.tolist(), plan.products.species, strict=True))
    }
    status = [QUANTIFIED] * len(plan.products.run)
    for run, species, low, high, value in _ranges(settled):
        row = place[run, species]
        if value > high + _SLACK * abs(high):
            status[row] = ABOVE
        elif value < low - _SLACK * abs(low) and status[row] != ABOVE:
            status[row] = BELOW
    for row in np.flatnonzero(~settled.detection.detected).tolist():
        status[row] = UNDETECTED
    return status


def _ranges(settled: Settled) -> list[tuple[int, str, float, float, float]]:
    """Run, product, lowest and highest standard, mean reading: one row per product of a run and curve."""
    return [*_gas_ranges(settled), *_liquid_ranges(settled)]


def _curve_ranges(settled: Settled) -> tuple[FloatArray, FloatArray]:
    """Range of each curve used; the line of slope 1 (last) has none."""
    curves = [one.curve for one in settled.plan.curves.used]
    lowest = [-np.inf if curve is None else curve.lowest for curve in curves]
    highest = [np.inf if curve is None else curve.highest for curve in curves]
    return np.array([*lowest, -np.inf]), np.array([*highest, np.inf])


def _gas_ranges(settled: Settled) -> list[tuple[int, str, float, float, float]]:
    gas = settled.plan.gas
    lowest, highest = _curve_ranges(settled)
    # a reading taken on several channels is inside the range if any channel covers it
    peaks = gas.channel_mean.tocoo()
    low, high = np.full(len(gas.reading_species), np.inf), np.full(len(gas.reading_species), -np.inf)
    np.minimum.at(low, peaks.coords[0], lowest[gas.peak_curve[peaks.coords[1]]])
    np.maximum.at(high, peaks.coords[0], highest[gas.peak_curve[peaks.coords[1]]])
    groups = len(gas.group_run)
    held = gas.pooled_reading
    count = np.bincount(gas.pooled_group, minlength=groups)
    mean = np.bincount(
        gas.pooled_group, weights=nominal(settled.readings.mole_fraction)[held], minlength=groups
    )
    group_low, group_high = np.full(groups, np.inf), np.full(groups, -np.inf)
    np.minimum.at(group_low, gas.pooled_group, low[held])
    np.maximum.at(group_high, gas.pooled_group, high[held])
    return [
        (
            int(run),
            species.name,
            float(group_low[group]),
            float(group_high[group]),
            float(mean[group] / count[group]),
        )
        for group, (run, species) in enumerate(zip(gas.group_run, gas.group_species, strict=True))
    ]


def _liquid_ranges(settled: Settled) -> list[tuple[int, str, float, float, float]]:
    """The signals of the last samplings; a signal read by proton counting has no range to leave."""
    liquid = settled.plan.liquid
    lowest, highest = _curve_ranges(settled)
    ratio = nominal(settled.liquids.amount_ratio)
    of_analyte: dict[int, list[int]] = {}
    for number, analyte in enumerate(liquid.signal_analyte):
        of_analyte.setdefault(int(analyte), []).append(number)
    rows = []
    analytes = liquid.replicate_mean
    for product, sampling in enumerate(liquid.product_sampling):
        run = int(liquid.samplings.run[sampling])
        for analyte in analytes.indices[analytes.indptr[product] : analytes.indptr[product + 1]]:
            name = liquid.analyte_species[analyte].name
            for signal in of_analyte[int(analyte)]:
                curve = liquid.signal_curve[signal]
                rows.append((run, name, float(lowest[curve]), float(highest[curve]), float(ratio[signal])))
    return rows


def report_doubts(settled: Settled, status: list[str], closure: list[str], findings: Findings) -> None:
    """Warnings that the settled numbers call for."""
    plan, outcome = settled.plan, settled.outcome
    efficiency = nominal(outcome.faradaic_efficiency)
    for row, verdict in enumerate(status):
        run, product = plan.runs[plan.products.run[row]].name, plan.products.species[row]
        if verdict in (ABOVE, BELOW):
            side = "above" if verdict == ABOVE else "below"
            findings.add(
                f"{side}-calibration",
                f"run {run}, {product}",
                f"the reading lies {side} the range of its curve; the curve was extended to it, and it is counted",
                "dilute the sample or inject less"
                if verdict == ABOVE
                else "add lower standards to the calibration",
            )
        if verdict == UNDETECTED:
            continue
        if efficiency[row] < 0:
            findings.add(
                "negative-amount",
                f"run {run}, {product}",
                f"FE comes out as {efficiency[row] * 100:.3g} %; it is counted as it is",
                "look at the blank, the curve's intercept and the integration limits",
            )
    # behind the declared ones stand the assumed ones
    for declared, moved in zip(plan.settings.declared, settled.inputs.moved, strict=False):
        # a stated zero moves nothing, and is meant to
        if not moved and (declared.relative or declared.absolute):
            findings.add(
                "uncertainty-not-used",
                declared.origin,
                f"the uncertainty of {written(declared.quantity)} (shared: {declared.shared}) moves no result of this "
                "day",
                "check the quantity and the sharing, or take the entry out",
            )
    total = nominal(outcome.total)
    has_products = np.bincount(plan.products.run, minlength=len(plan.runs)) > 0
    u = standard_uncertainty(outcome.total)
    for number, run in enumerate(plan.runs):
        if not has_products[number]:
            findings.add(
                "no-products",
                f"run {run.name}",
                "no gas peak and no liquid reading counts for it",
                "add its injections and vials, or take it out of runs",
            )
        elif closure[number] != CLOSED:
            findings.add(
                "balance-open",
                f"run {run.name}",
                f"total FE is {with_uncertainty(100.0 * total[number], 100.0 * u[number])} %: {closure[number]}",
                "check outlet flow, window, curves and internal standard; declare the uncertainties that are missing",
            )


def report_signals(settled: Settled, findings: Findings) -> None:
    """Signals of one analyte of a vial that give different amounts, by more than their own uncertainties."""
    liquid = settled.plan.liquid
    ratio, u = nominal(settled.liquids.amount_ratio), settled.weights.u_ratio
    members: dict[int, list[int]] = {}
    for number, analyte in enumerate(liquid.signal_analyte.tolist()):
        members.setdefault(analyte, []).append(number)
    for numbers in members.values():
        if len(numbers) < 2 or not (u[numbers] > 0).all() or not np.isfinite(ratio[numbers]).all():
            continue
        found = signal_agreement(ratio[numbers], u[numbers])
        if found.p >= _ODD:
            continue
        first = liquid.signals[numbers[0]]
        odd = None if found.odd is None else liquid.signals[numbers[found.odd]]
        which = f"; {odd.signal} is the odd one" if odd is not None else ""
        findings.add(
            "signals-disagree",
            f"vial {first.vial}, {first.analyte} ({first.origin})",
            f"its {len(numbers)} signals give different amounts (chi-square {found.chi_square:.3g} with "
            f"{found.degrees_of_freedom} degrees of freedom, p = {found.p:.2g}){which}",
            "look for overlap and for the flank of a suppressed solvent; leave the odd signal out if it is disturbed",
        )


def report_checks(settled: Settled, findings: Findings) -> None:
    """Check injections on the control chart of their curve; what the drift correction assumes about them."""
    plan = settled.plan
    by_curve: dict[int, list[int]] = {}
    for number, curve in enumerate(plan.gas.check_curve.tolist()):
        if curve >= 0:
            by_curve.setdefault(curve, []).append(number)
    for index, numbers in by_curve.items():
        used = plan.curves.used[index]
        if used.curve is None:
            continue
        checks = sorted((plan.day.checks[number] for number in numbers), key=lambda check: check.at)
        chart = control_chart(
            used.curve, [check.mole_fraction for check in checks], [check.peak_area for check in checks]
        )
        for check, zone, score in zip(checks, chart.zones, chart.score.tolist(), strict=True):
            if zone == ACTION:
                findings.add(
                    "check-off",
                    check.origin,
                    f"the check of {used.name} lies {abs(score):.1f} standard deviations "
                    f"{'above' if score > 0.0 else 'below'} its curve; the drift "
                    "correction takes it for drift of the detector, linear in time between checks",
                    "if it is no drift (wrong cylinder, leak), take the check out; if it is, recalibrate",
                )
        for signal in chart.runs:
            findings.add(
                "check-off",
                checks[signal.check].origin,
                f"{used.name}: {signal.rule}",
                "recalibrate the channel",
            )
