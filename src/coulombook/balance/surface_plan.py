"""The surface side of the plan: which voltammogram belongs to which electrode, and what it is held against.

Index letters: N scans, El electrodes with a capacitance, R runs.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import Day, FloatArray
from coulombook.balance.scan_verdicts import JudgedScans, scan_sets, set_name
from coulombook.cell.capacitance import POWER_LAW, CapacitanceFit, fit_capacitance
from coulombook.findings import Findings
from coulombook.prose.numbers import with_uncertainty
from coulombook.uncertainty.linearised import IntArray, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array


# by how much the area of an electrode may change where its uncertainty is not known (common practice, no source)
_CHANGE = 0.1


@dataclass(frozen=True, slots=True, eq=False)
class SurfacePlan:
    """Fixed structure of the capacitance scans; an electrode scanned before and after stands there twice."""

    electrodes: tuple[str, ...]  # names of the sets of scans, each unique
    owners: tuple[tuple[str, str], ...]  # (El,) electrode and purpose
    charging_current_ampere: FloatArray  # (N,)
    scan_rate_volt_per_second: FloatArray  # (N,)
    electrode_area_m2: FloatArray  # (N,)
    scan_electrode: IntArray  # (N,)
    mean: csr_array  # (El, N) mean over the scans of an electrode
    total: csr_array  # (El, N) sum over the scans of an electrode
    fits: tuple[CapacitanceFit, ...]
    methods: tuple[Methods, ...]  # (El,)
    smooth: int | None  # electrode taken as roughness 1, or None: the specific capacitance of day.toml
    judged: bool  # whether there is anything to hold the capacitance against
    runs: csr_array  # (R, El) 1 where the run's electrode has a capacitance
    run_has: NDArray[np.bool_]  # (R,)


@dataclass(frozen=True, slots=True)
class Methods:
    """Capacitance of one set of scans by other methods, and what its value is uncertain by. [F]"""

    by_window: float  # current averaged over the whole window
    by_charge: float  # charge integrated over time; NaN where a record has no time
    u_scatter: float  # about the line, or between cycles, whichever is larger; NaN where neither is known
    u_method: float  # by the choice of the window and of the law; 0 where they do not matter


def compare_methods(
    rate: FloatArray,
    fit: CapacitanceFit,
    central_ampere: FloatArray,
    window_ampere: FloatArray,
    charge_farad: FloatArray,
    cycle_deviation_ampere: FloatArray,
) -> Methods:
    """Hold the capacitance of a set of scans against other ways to it.

    The scatter about the line holds that between cycles already, so that the larger of the two counts. The
    choice of the window, and of line or power law where the latter fits better, are rectangular distributions.

    Parameters
    ----------
    rate, central_ampere, window_ampere, charge_farad, cycle_deviation_ampere : (n_scans,) float arrays
        Scan rate [V/s], and the figures of `coulombook.balance.scan_verdicts.JudgedScans`.
    fit : CapacitanceFit
        Of the currents in the middle of the window.
    """
    centred = rate - rate.mean()
    lever = centred / np.sum(centred**2)
    of_cycles = math.sqrt(float(np.sum((lever * cycle_deviation_ampere) ** 2)))
    known = [one for one in (fit.u_capacitance_farad, of_cycles) if math.isfinite(one)]
    window = float(lever @ central_ampere) - fit.capacitance_farad
    law = fit.power_capacitance_farad - fit.capacitance_farad if fit.form == POWER_LAW else 0.0
    return Methods(
        float(lever @ window_ampere),
        float(lever @ (charge_farad * rate)),
        max(known, default=math.nan),
        math.hypot(window, law) / math.sqrt(3.0),
    )


def plan_surface(day: Day, judged_scans: JudgedScans, findings: Findings) -> SurfacePlan:
    """Lay out the capacitance scans that count."""
    current = judged_scans.charging_ampere
    kept: dict[tuple[str, str], list[int]] = {}
    fits, methods = [], []
    for owner, every in scan_sets(day.scans).items():
        numbers = [number for number in every if np.isfinite(current[number])]
        rates = np.array([day.scans[number].scan_rate_volt_per_second for number in numbers])
        if len(np.unique(rates)) < 2:
            left = len(numbers) < len(every)
            findings.add(
                "no-roughness",
                f"electrode {set_name(*owner)}",
                "its scans have "
                + ("fewer than two scan rates that can be used" if left else "a single scan rate")
                + "; a capacitance is a slope against scan rate",
                "record voltammograms at three or more scan rates",
            )
            continue
        kept[owner] = numbers
        fit = fit_capacitance(rates, current[numbers])
        fits.append(fit)
        methods.append(
            compare_methods(
                rates,
                fit,
                judged_scans.central_ampere[numbers],
                judged_scans.window_ampere[numbers],
                judged_scans.charge_farad[numbers],
                judged_scans.cycle_deviation_ampere[numbers],
            )
        )
        _report_law(fit, f"electrode {set_name(*owner)}", findings)
    owners = tuple(kept)
    electrodes = tuple(set_name(*one) for one in owners)
    flat = np.array([number for numbers in kept.values() for number in numbers], dtype=np.intp)
    place = np.repeat(np.arange(len(kept)), [len(numbers) for numbers in kept.values()]).astype(np.intp)
    count = np.bincount(place, minlength=len(kept)).astype(float)
    shape = (len(kept), len(flat))
    first: dict[str, int] = {}
    for number, (electrode, _) in enumerate(owners):
        first.setdefault(electrode, number)
    runs = [(number, first[run.electrode]) for number, run in enumerate(day.runs) if run.electrode in first]
    smooth = _smooth_electrode(day, first, findings)
    judged = smooth is not None or day.settings.specific_capacitance_farad_per_m2 is not None
    if electrodes and smooth is None and day.settings.specific_capacitance_source:
        value = 100.0 * (day.settings.specific_capacitance_farad_per_m2 or math.nan)  # uF/cm^2
        source = day.settings.specific_capacitance_source
        share = 100.0 * day.settings.u_specific_capacitance
        findings.add(
            "capacitance-from-table",
            "[surface]",
            f"the specific capacitance {value:.3g} uF/cm^2 was taken for {source}; its "
            f"relative standard uncertainty of {share:.0f} % is one error for all electrodes",
            "scan a smooth electrode of the same material, and name it as smooth_reference",
        )
    if electrodes and not judged:
        findings.add(
            "no-roughness",
            "[surface]",
            "capacitances are known, but nothing to hold them against",
            "give specific_capacitance, smooth_reference, or material and electrolyte in [surface]",
        )
    run_has = np.zeros(len(day.runs), dtype=bool)
    run_has[[number for number, _ in runs]] = judged
    scans = [day.scans[number] for number in flat]
    areas = np.array([scan.electrode_area_m2 for scan in scans], dtype=float)
    _report_changes(owners, fits, methods, np.bincount(place, areas, len(kept)) / count, findings)
    return SurfacePlan(
        electrodes,
        owners,
        current[flat],
        np.array([scan.scan_rate_volt_per_second for scan in scans], dtype=float),
        areas,
        place,
        sparse_map(place, np.arange(len(flat)), 1.0 / count[place] if len(flat) else 1.0, shape),
        sparse_map(place, np.arange(len(flat)), 1.0, shape),
        tuple(fits),
        tuple(methods),
        smooth,
        judged,
        sparse_map([a for a, _ in runs], [b for _, b in runs], 1.0, (len(day.runs), len(kept))),
        run_has,
    )


def _report_law(fit: CapacitanceFit, where: str, findings: Findings) -> None:
    if fit.form == POWER_LAW:
        findings.add(
            "no-straight-line",
            where,
            "the charging current follows a power law of the scan rate, exponent "
            f"{with_uncertainty(fit.exponent, fit.u_exponent)}, better than a line (difference of the information "
            f"criterion {fit.evidence:.1f}); "
            f"the slope of the line is {fit.capacitance_farad * 1e3:.4g} mF, the power law's current over scan rate "
            f"{fit.power_capacitance_farad * 1e3:.4g} mF at the middle of the rates, and their difference is in the "
            "uncertainty",
            "scan more slowly, so that pores are charged to their ground, or compare electrodes at the same rates",
        )


def _report_changes(
    owners: Sequence[tuple[str, str]],
    fits: Sequence[CapacitanceFit],
    methods: Sequence[Methods],
    area_m2: FloatArray,
    findings: Findings,
) -> None:
    """Tell of electrodes whose area is another one in a later set of scans."""
    first: dict[str, int] = {}
    for number, (electrode, purpose) in enumerate(owners):
        start = first.setdefault(electrode, number)
        if start == number:
            continue
        ratio, u = 1.0, 0.0
        for place, sign in ((number, 1), (start, -1)):
            c = fits[place].capacitance_farad
            ratio *= (c / area_m2[place]) ** sign if c > 0.0 else math.nan
            u = math.hypot(u, methods[place].u_scatter / c, methods[place].u_method / c)
        if abs(ratio - 1.0) > (_CHANGE if math.isnan(u) else 2.0 * u * ratio):
            then = owners[start][1]
            findings.add(
                "area-changed",
                f"electrode {electrode}",
                f"its capacitance is {with_uncertainty(ratio, u * ratio)} times that of its "
                + (f"scans '{then}'" if then else "other scans")
                + f" in its scans '{purpose}'"
                + f"; its runs are put on the area of the {f'scans {then!r}' if then else 'former'}",
                "take the electrode as another one, or report both areas",
            )


def _smooth_electrode(day: Day, electrodes: Mapping[str, int], findings: Findings) -> int | None:
    name = day.settings.smooth_reference
    if name is None:
        return None
    if name in electrodes:
        return electrodes[name]
    if day.scans:
        findings.add(
            "unknown-name",
            "day.toml, [surface] smooth_reference",
            f"electrode {name} has no usable scans",
            "name an electrode of scans that was scanned at several rates",
            found=name,
            expected="one of " + ", ".join(electrodes) if electrodes else "an electrode of scans",
        )
    return None
