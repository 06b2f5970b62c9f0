"""Which voltammograms of a day count, in which window, and what the reader should know of them."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from coulombook.balance.readings import Day, FloatArray, Scan
from coulombook.cell.scans import ScanFigures, clean_window, with_window
from coulombook.findings import Findings

# relative difference of the scan rate entered from that of the record's own time; turning points may lack a sample
_RATE_OFF = 0.05
_AFTER = "after"


@dataclass(frozen=True, slots=True, eq=False)
class JudgedScans:
    """What counts of each voltammogram, (n_scans,) each in the order of ``day.scans``; NaN for one that does not."""

    charging_ampere: FloatArray  # in the middle fifth of the window
    central_ampere: FloatArray  # over its central three fifths
    window_ampere: FloatArray  # over the whole of it
    charge_farad: FloatArray  # capacitance by charge; NaN without a time
    cycle_deviation_ampere: FloatArray  # standard deviation between cycles; NaN where not known


def scan_sets(scans: Sequence[Scan]) -> dict[tuple[str, str], list[int]]:
    """Scans of one electrode and purpose, by their numbers; the set that speaks for the runs of an electrode first.

    That is the first one of the table which is not called "after".
    """
    sets: dict[tuple[str, str], list[int]] = {}
    for number, scan in enumerate(scans):
        sets.setdefault((scan.electrode, scan.purpose), []).append(number)
    return dict(sorted(sets.items(), key=lambda item: item[0][1].casefold().startswith(_AFTER)))


def set_name(electrode: str, purpose: str) -> str:
    """How a set of scans is called."""
    return f"{electrode}, {purpose}" if purpose else electrode


def judge_scans(day: Day, figures: Sequence[ScanFigures | None], findings: Findings) -> JudgedScans:
    """Decide which scans count, and in which window; tell of it.

    ``figures`` are in the order of ``day.scans``; None for a voltammogram that could not be read.
    """
    used = list(figures)
    for (electrode, purpose), numbers in scan_sets(day.scans).items():
        where = f"electrode {set_name(electrode, purpose)}"
        there = {number: one for number in numbers if (one := used[number]) is not None}
        there |= _cleaned(day, there, where, findings)
        _report_doubts(day, there, where, findings)
        slow = _unsettled(day, there, where, findings)
        for number in numbers:
            used[number] = None if number in slow else there.get(number)

    def column(get: str) -> FloatArray:
        return np.array([math.nan if one is None else getattr(one, get) for one in used], dtype=float)

    return JudgedScans(
        column("charging_ampere"),
        column("central_ampere"),
        column("window_ampere"),
        column("charge_capacitance_farad"),
        column("cycle_deviation_ampere"),
    )


def _own_window(scan: Scan) -> bool:
    return scan.window_low_volt is not None or scan.window_high_volt is not None


def _rates(day: Day, numbers: Sequence[int]) -> str:
    """Scan rates in words."""
    rates = sorted({day.scans[number].scan_rate_volt_per_second * 1e3 for number in numbers})
    return ", ".join(f"{one:.4g}" for one in rates) + " mV/s"


def _cleaned(
    day: Day, there: dict[int, ScanFigures], where: str, findings: Findings
) -> dict[int, ScanFigures]:
    """Scans in another window, where the whole scan holds a reaction and the table gives none."""
    free = {number: one for number, one in there.items() if not _own_window(day.scans[number])}
    # a scan that lags is out of symmetry for that reason
    judged = {n: one for n, one in free.items() if one.settled(_lag(one))}
    spoiled = [number for number, one in judged.items() if not one.symmetry.clean]
    if not spoiled:
        return {}
    window = clean_window(list(judged.values()))
    if window is None:
        return {}
    worst = max(
        (judged[number].symmetry for number in spoiled), key=lambda one: abs(one.tilt) + abs(one.bend)
    )
    findings.add(
        "window-chosen",
        where,
        f"between its turning points the current is no double layer's alone ({_share(worst.tilt)} tilt, "
        f"{_share(worst.bend)} bend about the middle, of the charging current, at {_rates(day, spoiled)}); the widest "
        f"window that is clean at every rate was taken, {window[0]:.4g} V to {window[1]:.4g} V",
        "give window low and window high to choose your own",
    )
    return {
        number: replace(
            with_window(one, *window, day.scans[number].scan_rate_volt_per_second),
            cycle_deviation_ampere=one.cycle_deviation_ampere,
        )
        for number, one in free.items()
    }


def _share(value: float) -> str:
    return f"{100.0 * value:+.0f} %" if math.isfinite(value) else "unknown"


def _lag(scan: ScanFigures) -> float:
    """The time constant by which a scan is judged; 0 where there is nothing to tell it from."""
    return 0.0 if math.isnan(scan.transient.rc_second) else scan.transient.rc_second


def _unsettled(day: Day, there: dict[int, ScanFigures], where: str, findings: Findings) -> set[int]:
    """Scans whose charging current has not settled, each told of."""
    slow = {number for number, one in there.items() if not one.settled(_lag(one))}
    if slow:
        rc = float(np.median([there[number].transient.rc_second for number in slow]))
        findings.add(
            "scan-left-out",
            where,
            f"at {_rates(day, sorted(slow))} the charging current has not settled in the middle of the window: it "
            f"follows the sweep with a time constant RC of {rc:.3g} s; these scan rates were left out",
            "scan more slowly or over a wider range, or compensate the resistance",
        )
    unsure = [number for number in _not_told(there) if number not in slow]
    if unsure:
        findings.add(
            "lag-not-told",
            where,
            f"at {_rates(day, unsure)} the samples are too few or too noisy to tell whether the charging current has "
            "settled; these scan rates were kept",
            "record twenty samples a sweep or more",
        )
    return slow


def _not_told(there: dict[int, ScanFigures]) -> Iterator[int]:
    for number, one in there.items():
        rc = one.transient.rc_second
        if math.isnan(rc) or (rc == 0.0 and not one.settled(one.transient.highest_rc_second)):
            yield number


def _report_doubts(day: Day, there: dict[int, ScanFigures], where: str, findings: Findings) -> None:
    spoiled = [number for number, one in there.items() if one.settled(_lag(one)) and not one.symmetry.clean]
    if spoiled:
        worst = max((there[n].symmetry for n in spoiled), key=lambda one: abs(one.tilt) + abs(one.bend))
        findings.add(
            "scan-contaminated",
            where,
            f"at {_rates(day, spoiled)} the current in the window is no double layer's alone: {_share(worst.tilt)} "
            f"tilt, {_share(worst.bend)} bend about the middle, of the charging current",
            "choose a window without reaction by window low and window high",
        )
    leaking = [
        number
        for number, one in there.items()
        if abs(one.symmetry.leakage_siemens) * (one.high_volt - one.low_volt)
        > 2.0 * one.charging_ampere
        > 0.0
    ]
    if leaking:
        most = max(abs(there[number].symmetry.leakage_siemens) for number in leaking)
        findings.add(
            "leakage",
            where,
            f"at {_rates(day, leaking)} a leak exceeds the charging current at the ends of the window "
            f"({1.0 / most:.3g} ohm parallel to the double layer); it is the same in both sweeps and cancels",
            "look for a reaction, dissolved oxygen, or a leaking contact",
        )
    for number, one in there.items():
        entered = day.scans[number].scan_rate_volt_per_second
        measured = one.measured_rate_volt_per_second
        if abs(measured / entered - 1.0) > _RATE_OFF:
            findings.add(
                "scan-rate-off",
                f"{day.scans[number].file} ({day.scans[number].origin})",
                f"the scan rate was entered as {entered * 1e3:.4g} mV/s; by its own time the record runs at "
                f"{measured * 1e3:.4g} mV/s",
                "correct the scan rate, or the unit of the record's time",
            )
