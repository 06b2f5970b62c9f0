"""The gas side of the plan: which peak belongs to which injection, run and product, and by which curve it is read.

Index letters: R runs, K injections, P peaks, G readings (one product in one injection), GP products of a run,
C curves, D check injections.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.curves_used import GAS, CurvesUsed
from coulombook.balance.readings import Day, FloatArray, OutletFlow, Peak, Species
from coulombook.curves.drift import interpolation_weights
from coulombook.findings import Findings, RowOrigin
from coulombook.uncertainty.linearised import IntArray, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True, eq=False)
class Injections:
    """The gas injections of a day, by run and time."""

    run: IntArray  # (K,)
    label: tuple[str, ...]
    time_second: FloatArray  # (K,) on the trace's time axis
    origin: tuple[RowOrigin, ...]
    index: dict[tuple[str, str], int]

    def of_run(self, run: int) -> IntArray:
        """Indices of the injections of one run, in order of time."""
        # sorted by run when built
        return np.arange(np.searchsorted(self.run, run), np.searchsorted(self.run, run, side="right"))


def list_injections(day: Day, findings: Findings) -> Injections:
    """All injections, used or not, ordered by run and time; one injection has one time."""
    place = {run.name: number for number, run in enumerate(day.runs)}
    first: dict[tuple[str, str], Peak] = {}
    for peak in day.peaks:
        key = (peak.run, peak.injection)
        known = first.setdefault(key, peak)
        if known.time_second != peak.time_second:
            findings.add(
                "not-allowed",
                peak.origin.of("time"),
                f"injection {peak.injection} of run {peak.run} stands at two times",
                "give all peaks of an injection the same time",
                found=f"{peak.time_second:g} s",
                expected=f"{known.time_second:g} s, as in {known.origin}",
            )
    ordered = sorted(first.values(), key=lambda peak: (place[peak.run], peak.time_second))
    return Injections(
        np.array([place[peak.run] for peak in ordered], dtype=np.intp),
        tuple(peak.injection for peak in ordered),
        np.array([peak.time_second for peak in ordered], dtype=float),
        tuple(peak.origin for peak in ordered),
        {(peak.run, peak.injection): number for number, peak in enumerate(ordered)},
    )


@dataclass(frozen=True, slots=True, eq=False)
class GasPlan:
    """Fixed structure of the gas readings."""

    injections: Injections
    # peaks
    peaks: tuple[Peak, ...]
    peak_curve: IntArray  # (P,)
    drift: csr_array  # (P, D) weights of the check injections
    undrifted: FloatArray  # (P,) 1 where no check gas was run
    check_curve: IntArray  # (D,)
    check_area: FloatArray  # (D,)
    check_mole_fraction: FloatArray  # (D,)
    # readings: one species in one injection, the tracer included
    channel_mean: csr_array  # (G, P)
    reading_injection: IntArray  # (G,)
    reading_species: tuple[Species, ...]
    reading_used: NDArray[np.bool_]  # (G,)
    electrons: FloatArray  # (G,) 0 for the tracer
    net_gas: csr_array  # (K, G) 1 - CO2 used, for the carbon balance
    tracer_reading: IntArray  # (K,) reading of the tracer, or -1
    # products of a run: the used readings of one product, pooled
    pooled_reading: IntArray  # (U,) readings that are pooled
    pooled_group: IntArray  # (U,) product of a run each belongs to
    group_run: IntArray  # (GP,)
    group_species: tuple[Species, ...]

    @property
    def reading_run(self) -> IntArray:
        """Run of each reading, (G,)."""
        return self.injections.run[self.reading_injection]


def plan_gas(
    day: Day, injections: Injections, usable: NDArray[np.bool_], curves: CurvesUsed, findings: Findings
) -> GasPlan:
    """Lay out the gas readings.

    ``usable`` (K,) tells which injections have a current to be compared with; the others were reported already.
    """
    tracer = day.settings.tracer if day.settings.outlet_flow is OutletFlow.TRACER else None
    peaks, peak_curve = _peaks_with_curves(day, tracer, curves, findings)

    by_reading: dict[tuple[int, str], list[int]] = {}
    for number, peak in enumerate(peaks):
        by_reading.setdefault((injections.index[peak.run, peak.injection], peak.analyte), []).append(number)
    keys = sorted(by_reading, key=lambda key: key[0])
    rows, columns, weights, used = [], [], [], []
    for reading, key in enumerate(keys):
        members = [number for number in by_reading[key] if peaks[number].used] or by_reading[key]
        used.append(peaks[members[0]].used and bool(usable[key[0]]))
        rows += [reading] * len(members)
        columns += members
        weights += [1.0 / len(members)] * len(members)
    _note_several_channels(day, peaks, by_reading, findings)

    species = tuple(day.species[name] for _, name in keys)
    reading_injection = np.array([injection for injection, _ in keys], dtype=np.intp)
    product = [one.name != tracer for one in species]
    count, held = len(injections.label), np.flatnonzero(product)
    net = [1.0 - species[reading].carbon for reading in held]
    tracer_reading = np.full(count, -1, dtype=np.intp)
    for reading, (injection, name) in enumerate(keys):
        if name == tracer:
            tracer_reading[injection] = reading
    if tracer is not None:
        in_use = [key for key, use in zip(keys, used, strict=True) if use]
        has_tracer = {injection for injection, name in in_use if name == tracer}
        lacking = sorted({injection for injection, _ in in_use} - has_tracer)
        _demand_tracer(day, injections, lacking, tracer, findings)

    run_of = injections.run[reading_injection]
    pooled = [int(reading) for reading in held if used[reading]]
    product_of = [(int(run_of[reading]), species[reading].name) for reading in pooled]
    # by run, within it in order of appearance
    order = {
        key: place for place, key in enumerate(sorted(dict.fromkeys(product_of), key=lambda key: key[0]))
    }
    check_curve, drift, undrifted = _plan_drift(day, peaks, peak_curve, curves, findings)
    return GasPlan(
        injections,
        tuple(peaks),
        np.array(peak_curve, dtype=np.intp),
        drift,
        undrifted,
        check_curve,
        np.array([check.peak_area for check in day.checks], dtype=float),
        np.array([check.mole_fraction for check in day.checks], dtype=float),
        sparse_map(rows, columns, weights, (len(keys), len(peaks))),
        reading_injection,
        species,
        np.array(used, dtype=bool),
        np.array(
            [one.electrons if is_product else 0 for one, is_product in zip(species, product, strict=True)],
            float,
        ),
        sparse_map(reading_injection[held], held, net, (count, len(keys))),
        tracer_reading,
        np.array(pooled, dtype=np.intp),
        np.array([order[key] for key in product_of], dtype=np.intp),
        np.array([run for run, _ in order], dtype=np.intp),
        tuple(day.species[name] for _, name in order),
    )


def _peaks_with_curves(
    day: Day, tracer: str | None, curves: CurvesUsed, findings: Findings
) -> tuple[list[Peak], list[int]]:
    """The peaks of products and tracer with their curves; carrier gases are passed over."""
    peaks, peak_curve = [], []
    without: dict[tuple[str, str], list[Peak]] = {}
    for peak in day.peaks:
        # a gas named as tracer is no product, even where the outlet flow is found in another way
        idle = day.species[peak.analyte].carrier or peak.analyte == day.settings.tracer
        if idle and peak.analyte != tracer:
            continue
        index = curves.index(GAS, peak.channel, peak.analyte)
        if index is not None:
            peaks.append(peak)
            peak_curve.append(index)
        elif peak.used:
            without.setdefault((peak.channel, peak.analyte), []).append(peak)
    for (channel, analyte), missed in without.items():
        elsewhere = curves.channels(GAS, analyte)
        findings.add(
            "missing-curve",
            missed[0].origin.of("analyte"),
            f"no curve for {analyte} on channel {channel} ({len(missed)} peaks)",
            f"did you mean channel {elsewhere[0]}?"
            if elsewhere
            else "name the calibration in [day] calibrations, or mark the peaks with use = no",
            found=f"{analyte}@{channel}",
            expected="a curve of that analyte and channel in one of the day's gas calibrations",
        )
    return peaks, peak_curve


def _note_several_channels(
    day: Day, peaks: list[Peak], by_reading: dict[tuple[int, str], list[int]], findings: Findings
) -> None:
    several: dict[str, set[str]] = {}
    for (_, name), members in by_reading.items():
        channels = {peaks[number].channel for number in members if peaks[number].used}
        if len(channels) > 1:
            several.setdefault(name, set()).update(channels)
    for name, channels in several.items():
        findings.add(
            "several-channels",
            "gas",
            f"{name} was measured on channels {', '.join(sorted(channels))}; their mean mole fraction was taken",
            "mark the peaks of one channel with use = no if the other is the better one",
        )


def _demand_tracer(
    day: Day,
    injections: Injections,
    lacking: Sequence[int],
    tracer: str,
    findings: Findings,
) -> None:
    for number in lacking:
        findings.add(
            "missing-value",
            injections.origin[number],
            "the outlet flow of each injection is found from its tracer's peak",
            "add the peak, or mark every peak of the injection with use = no",
            found=f"injection {injections.label[number]} of run {day.runs[injections.run[number]].name} without it",
            expected=f"a peak of the tracer {tracer}",
        )


def _plan_drift(
    day: Day, peaks: list[Peak], peak_curve: list[int], curves: CurvesUsed, findings: Findings
) -> tuple[IntArray, csr_array, FloatArray]:
    """Curve of each check, weights (P, D) of the checks in the drift factor of each peak, and who has no check."""
    by_channel: dict[int, list[int]] = {}
    check_curve = np.full(len(day.checks), -1, dtype=np.intp)
    for number, check in enumerate(day.checks):
        index = curves.index(GAS, check.channel, check.analyte)
        if index is not None:
            check_curve[number] = index
            by_channel.setdefault(index, []).append(number)
        elif not day.species[check.analyte].carrier:
            findings.add(
                "injection-left-out",
                check.origin.of("analyte"),
                f"the check gas {check.analyte} has no curve on channel {check.channel}; it corrects no drift",
                "correct analyte and channel, or delete the row",
            )
    undrifted = np.ones(len(peaks))
    started = {run.name: run.started for run in day.runs}
    members: dict[int, list[int]] = {}
    for number, curve in enumerate(peak_curve):
        members.setdefault(curve, []).append(number)
    rows: list[int] = []
    columns: list[int] = []
    weights: list[float] = []
    for index, checks in by_channel.items():
        numbers = members.get(index, [])
        zero = day.checks[checks[0]].at
        at = []
        kept = []
        for number in numbers:
            clock = started[peaks[number].run]
            if clock is not None:
                kept.append(number)
                at.append((clock - zero).total_seconds() + peaks[number].time_second)
        if not kept:
            continue
        check_times = np.array([(day.checks[check].at - zero).total_seconds() for check in checks])
        row, column, weight = interpolation_weights(check_times, np.array(at))
        rows.extend(np.array(kept)[row].tolist())
        columns.extend(np.array(checks)[column].tolist())
        weights.extend(weight.tolist())
        undrifted[kept] = 0.0
    return check_curve, sparse_map(rows, columns, weights, (len(peaks), len(day.checks))), undrifted
