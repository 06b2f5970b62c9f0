"""The surface side of the plan: which voltammogram belongs to which electrode, and what it is held against.

Index letters: N scans, El electrodes with a capacitance, R runs.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import Day, FloatArray
from coulombook.cell.capacitance import CapacitanceFit, fit_capacitance
from coulombook.findings import Findings
from coulombook.uncertainty.linearised import IntArray, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True, eq=False)
class SurfacePlan:
    """Fixed structure of the capacitance scans."""

    electrodes: tuple[str, ...]
    charging_current_ampere: FloatArray  # (N,)
    scan_rate_volt_per_second: FloatArray  # (N,)
    electrode_area_m2: FloatArray  # (N,)
    scan_electrode: IntArray  # (N,)
    mean: csr_array  # (El, N) mean over the scans of an electrode
    total: csr_array  # (El, N) sum over the scans of an electrode
    fits: tuple[CapacitanceFit, ...]
    smooth: int | None  # electrode taken as roughness 1, or None: the specific capacitance of day.toml
    judged: bool  # whether there is anything to hold the capacitance against
    runs: csr_array  # (R, El) 1 where the run's electrode has a capacitance
    run_has: NDArray[np.bool_]  # (R,)


def plan_surface(day: Day, charging_current_ampere: FloatArray, findings: Findings) -> SurfacePlan:
    """Lay out the capacitance scans.

    ``charging_current_ampere`` (n_scans,) is in the order of ``day.scans``; NaN for a scan that could not be read.
    """
    members: dict[str, list[int]] = {}
    for number, scan in enumerate(day.scans):
        if np.isfinite(charging_current_ampere[number]):
            members.setdefault(scan.electrode, []).append(number)
    kept: dict[str, list[int]] = {}
    fits = []
    for electrode, numbers in members.items():
        rates = np.array([day.scans[number].scan_rate_volt_per_second for number in numbers])
        if len(np.unique(rates)) < 2:
            findings.add(
                "no-roughness",
                f"electrode {electrode}",
                "its scans have a single scan rate; a capacitance is a slope against scan rate",
                "record voltammograms at three or more scan rates",
            )
            continue
        kept[electrode] = numbers
        fits.append(fit_capacitance(rates, charging_current_ampere[numbers]))
    electrodes = tuple(kept)
    flat = np.array([number for numbers in kept.values() for number in numbers], dtype=np.intp)
    owner = np.repeat(np.arange(len(kept)), [len(numbers) for numbers in kept.values()]).astype(np.intp)
    count = np.bincount(owner, minlength=len(kept)).astype(float)
    shape = (len(kept), len(flat))
    runs = [
        (number, electrodes.index(run.electrode))
        for number, run in enumerate(day.runs)
        if run.electrode in kept
    ]
    smooth = _smooth_electrode(day, electrodes, findings)
    judged = smooth is not None or day.settings.specific_capacitance_farad_per_m2 is not None
    if electrodes and not judged:
        findings.add(
            "no-roughness",
            "[surface]",
            "capacitances are known, but nothing to hold them against",
            "give specific_capacitance or smooth_reference in [surface]",
        )
    run_has = np.zeros(len(day.runs), dtype=bool)
    run_has[[number for number, _ in runs]] = judged
    scans = [day.scans[number] for number in flat]
    return SurfacePlan(
        electrodes,
        charging_current_ampere[flat],
        np.array([scan.scan_rate_volt_per_second for scan in scans], dtype=float),
        np.array([scan.electrode_area_m2 for scan in scans], dtype=float),
        owner,
        sparse_map(owner, np.arange(len(flat)), 1.0 / count[owner] if len(flat) else 1.0, shape),
        sparse_map(owner, np.arange(len(flat)), 1.0, shape),
        tuple(fits),
        smooth,
        judged,
        sparse_map([a for a, _ in runs], [b for _, b in runs], 1.0, (len(day.runs), len(kept))),
        run_has,
    )


def _smooth_electrode(day: Day, electrodes: tuple[str, ...], findings: Findings) -> int | None:
    name = day.settings.smooth_reference
    if name is None:
        return None
    if name in electrodes:
        return electrodes.index(name)
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
