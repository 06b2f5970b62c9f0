"""The order of the day's work: read, plan, evaluate, judge, enter into the book."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from typing import TypeVar

from coulombook.balance.assumed import report_assumed
from coulombook.balance.draws import draw_day
from coulombook.balance.efficiencies import carbon_account, product_efficiencies, report_flow
from coulombook.balance.explain import explain
from coulombook.balance.gas_plan import list_injections
from coulombook.balance.liquid_plan import list_samplings
from coulombook.balance.make_plan import make_plan, recentred_requests, trace_requests
from coulombook.balance.readings import Day, FloatArray, Run
from coulombook.balance.scan_verdicts import judge_scans
from coulombook.balance.settle import Settled, settle
from coulombook.balance.spectra_used import (
    SpectrumFigures,
    impedance_capacitances,
    report_capacitances,
    use_spectra,
)
from coulombook.balance.trace_figures import TraceFigures, TraceRequest, figures_of
from coulombook.balance.trace_picture import TracePicture, picture_of
from coulombook.balance.verdicts import (
    closures,
    product_status,
    report_checks,
    report_doubts,
    report_faults,
    report_signals,
)
from coulombook.book import Book, InputFile
from coulombook.book.cautions import caution_rows
from coulombook.book.closures import closure_rows
from coulombook.book.display import FindingList
from coulombook.book.efficiencies import carbon_rows, efficiency_rows
from coulombook.book.entries import Row, enter
from coulombook.book.forecast import forecast
from coulombook.book.judgements import (
    explanation_rows,
    interval_rows,
    reconciliation_rows,
)
from coulombook.book.kinetics import kinetics_rows
from coulombook.book.stability import stability_rows
from coulombook.cell.capacitance import ScanError
from coulombook.cell.impedance import ImpedanceError, fit_circuit
from coulombook.cell.kramers_kronig import kramers_kronig
from coulombook.cell.scans import ScanFigures, scan_figures
from coulombook.findings import DayFaults, Finding, Findings
from coulombook.intake.day import DaySource, open_day
from coulombook.intake.digest import sha256_of

_Result = TypeVar("_Result")

Progress = Callable[[str, int, int], None]
"""Called with what is being done, how many are done, and of how many."""


def tally(
    path: str | os.PathLike[str],
    *,
    calibrations: Sequence[str | os.PathLike[str]] = (),
    draws: int = 0,
    seed: int = 1,
    reconcile: bool = False,
    progress: Progress | None = None,
) -> Book:
    """Tally a day folder: from its files to the book.

    Parameters
    ----------
    path : path
        The day folder.
    calibrations : sequence of paths
        Folders that hold calibrations, looked at after ``<day>/calibrations`` and before ``./calibrations``.
    draws : int
        Number of Monte Carlo draws for coverage intervals (JCGM 101 asks for 1e4/(1 - level) and more); 0: none.
    seed : int
        The same seed gives the same draws.
    reconcile : bool
        Adjust the day's readings to totals of 100 %, in a table beside the measured ones.
    progress : callable, optional
        Called as progress(what, done, of) while the long files are read and draws are made.

    Returns
    -------
    Book
        Every table, the findings and the fingerprints of the inputs. Nothing is written.

    Raises
    ------
    DayFaults
        The day's data have faults; ``findings`` of the exception holds all of them.
    NotADirectoryError
        ``path`` is no folder.

    Examples
    --------
    >>> book = tally("example_experiments/2043-05-18-mesh-foil-foam")  # doctest: +SKIP
    >>> book.summary[["run", "total FE / %", "closure"]]  # doctest: +SKIP
    """
    folder, places = _folders(path, calibrations)
    findings = Findings()
    source = open_day(folder, places, findings)
    pictures: dict[int, TracePicture] = {}
    settled = settle_day(source, findings, progress, for_draws=draws > 0, pictures=pictures)
    findings.raise_stops()
    assert settled is not None  # without faults there is an account
    assert source.day is not None
    judgements = _judge(settled, findings, draws, seed, reconcile, progress or _silent)
    return Book(
        source.day.name,
        source.day.settings.title,
        enter(settled, tuple(findings), judgements),
        FindingList(findings),
        _fingerprints(source),
        {
            "calibrations": os.pathsep.join(map(str, calibrations)),
            "draws": str(draws),
            "seed": str(seed),
            "reconcile": "yes" if reconcile else "no",
        },
        settled,
        tuple(pictures[number] for number in range(len(source.day.runs))),
    )


def _judge(
    settled: Settled, findings: Findings, draws: int, seed: int, reconcile: bool, progress: Progress
) -> dict[str, list[Row]]:
    """The tables that judge the day: why it does not close, and what was asked for beyond."""
    account = carbon_account(settled)
    report_flow(settled, account, findings)
    judgements = {
        "closure": closure_rows(settled),
        "explanations": explanation_rows(explain(settled)),
        "carbon": carbon_rows(settled, account),
        "efficiencies": efficiency_rows(settled, product_efficiencies(settled)),
        "kinetics": kinetics_rows(settled, findings),
        "stability": stability_rows(settled, findings),
        "cautions": caution_rows(settled),
    }
    if draws:
        turns = draw_day(settled, draws, seed, lambda done, of: progress("draws", done, of))
        judgements["intervals"] = interval_rows(settled, turns, draws, findings)
    if reconcile:
        try:
            judgements["reconciliation"] = reconciliation_rows(settled)
        except ValueError as error:
            findings.add(
                "not-reconciled",
                "[balance]",
                f"the day cannot be adjusted to its balance: {error}",
                "declare the uncertainties of the readings, or [balance] unaccounted",
            )
    return judgements


@dataclass(frozen=True, slots=True)
class Checked:
    """What `check` found: ``lines`` say in plain words what would be computed and what is missing."""

    findings: tuple[Finding, ...]
    lines: tuple[str, ...]


def check(path: str | os.PathLike[str], *, calibrations: Sequence[str | os.PathLike[str]] = ()) -> Checked:
    """Validate a day folder without writing anything; faults are among the findings, not raised.

    Parameters and errors otherwise as in `tally`.
    """
    folder, places = _folders(path, calibrations)
    findings = Findings()
    source = open_day(folder, places, findings)
    settled = settle_day(source, findings)
    lines = () if source.day is None else forecast(source.day, settled)
    return Checked(tuple(findings), tuple(lines))


def _folders(
    path: str | os.PathLike[str], calibrations: Iterable[str | os.PathLike[str]]
) -> tuple[Path, list[Path]]:
    folder = Path(path)
    if not folder.is_dir():
        raise NotADirectoryError(f"there is no day folder {os.fspath(path)!r}")
    return folder, [*map(Path, calibrations), Path("calibrations")]


def _silent(what: str, done: int, of: int) -> None:
    pass


def settle_day(
    source: DaySource,
    findings: Findings,
    progress: Progress | None = None,
    *,
    for_draws: bool = False,
    pictures: dict[int, TracePicture] | None = None,
) -> Settled | None:
    """Everything between the tables and the book; None when faults stand in the way.

    ``for_draws``: the settled day will be drawn (`draw_day`). ``pictures`` is filled with those of the logs, by the
    places of their runs.
    """
    progress = progress or _silent
    day = source.day
    if day is None:
        return None
    injections, samplings = list_injections(day, findings), list_samplings(day)
    requests = trace_requests(day, injections, samplings)
    figures = _read_traces(source, day, dict(enumerate(requests)), findings, progress, pictures)
    scans = judge_scans(day, _read_scans(source, day, findings, progress), findings)
    spectra = _read_spectra(source, day, findings, progress)
    day = use_spectra(day, spectra, findings)
    if len(figures) < len(day.runs):
        return None
    plan = make_plan(
        day, injections, [figures[number] for number in range(len(day.runs))], scans, findings, spectra
    )
    if findings.stops:
        return None
    again = recentred_requests(plan, requests, for_draws)
    if again:
        figures |= _read_traces(source, day, again, findings, progress)
        plan = plan.with_figures([figures[number] for number in range(len(day.runs))])
    settled = settle(plan)
    report_faults(settled, findings)
    if findings.stops:
        return None
    report_capacitances(plan.surface, impedance_capacitances(day, spectra), findings)
    report_assumed(day.settings, settled.inputs.moved, findings)
    closure, _ = closures(settled)
    report_doubts(settled, product_status(settled), closure, findings)
    report_signals(settled, findings)
    report_checks(settled, findings)
    return settled


def _read_traces(
    source: DaySource,
    day: Day,
    requests: dict[int, TraceRequest],
    findings: Findings,
    progress: Progress,
    pictures: dict[int, TracePicture] | None = None,
) -> dict[int, TraceFigures]:
    """Figures of the logs asked for; a log with faults is missing from the result."""

    def read(number: int) -> tuple[TraceFigures | None, Findings]:
        run, own = day.runs[number], Findings()
        try:
            trace = source.trace(run, own)
            if _report_window(run, trace.time_second, own):
                return None, own
            figures = figures_of(trace, requests[number])
            if pictures is not None:
                pictures[number] = picture_of(trace)
        except DayFaults as faults:
            own.extend(faults.findings)
            return None, own
        except ValueError as error:
            own.add(
                "broken-trace",
                run.trace,
                f"run {run.name} cannot be integrated",
                "check the run's start and stop and its log",
                found=str(error),
                expected="a log that covers the run's window",
            )
            return None, own
        if not figures.charge_coulomb > 0:
            own.add(
                "anodic-run",
                f"run {run.name} ({run.trace})",
                "no net reduction charge passed in its window",
                "check the sign of the current: cathodic is negative",
                found=f"{-figures.charge_coulomb:.4g} C by the signs of the log",
                expected="a negative (cathodic) charge",
            )
            return None, own
        if (figures.sampling_duration_second <= 0).any():
            _report_early_vials(day, run, figures.start_second, own)
            return None, own
        return figures, own

    found = {}
    for number, (one, own) in _in_threads(read, list(requests), "traces", progress):
        findings.extend(own)
        if one is not None:
            found[number] = one
    return found


def _report_window(run: Run, time_second: FloatArray, findings: Findings) -> bool:
    """Whether an end of the run's window, as entered, lies outside its log; each such end is a fault."""
    first, last = float(time_second[0]), float(time_second[-1])
    ends = (
        ("start", run.start_second, run.start_second is None or first <= run.start_second < last),
        ("stop", run.stop_second, run.stop_second is None or first < run.stop_second <= last),
    )
    for quantity, entered, inside in ends:
        if not inside:
            findings.add(
                "not-allowed",
                run.origin.of(quantity),
                f"the {quantity} of run {run.name} lies outside its trace",
                "correct the time or its unit, or leave the cell blank for the whole trace",
                found=f"{entered:g} s",
                expected=f"a time within {run.trace}, which runs from {first:g} s to {last:g} s",
            )
    return not all(inside for _, _, inside in ends)


def _report_early_vials(day: Day, run: Run, start_second: float, findings: Findings) -> None:
    for vial in day.vials:
        if vial.run != run.name or not vial.used or vial.blank or vial.time_second is None:
            continue
        if vial.time_second <= start_second:
            findings.add(
                "not-allowed",
                vial.origin.of("time"),
                "the vial was taken before any charge had passed",
                "correct the time; a sample from before the run is a blank (role = blank)",
                found=f"{vial.time_second:g} s",
                expected=f"a time after {start_second:g} s, the start of run {run.name}",
            )


def _read_scans(
    source: DaySource, day: Day, findings: Findings, progress: Progress
) -> list[ScanFigures | None]:
    """What is taken from each voltammogram, None where it has faults."""

    def read(number: int) -> tuple[ScanFigures | None, Findings]:
        scan, own = day.scans[number], Findings()
        try:
            voltammogram = source.voltammogram(scan, own)
            figures = scan_figures(
                voltammogram.potential_volt,
                voltammogram.current_ampere,
                scan.scan_rate_volt_per_second,
                cycle=voltammogram.cycle,
                time_second=voltammogram.time_second,
                chosen_cycle=scan.cycle,
                window_low_volt=scan.window_low_volt,
                window_high_volt=scan.window_high_volt,
            )
            return figures, own
        except DayFaults as faults:
            own.extend(faults.findings)
        except ScanError as error:
            own.add(
                "broken-scan",
                f"{scan.file} ({scan.origin})",
                "the voltammogram gives no charging current",
                "check the window, the cycle and the file",
                found=str(error),
                expected=error.expected,
            )
        return None, own

    figures: list[ScanFigures | None] = [None] * len(day.scans)
    for number, (one, own) in _in_threads(read, list(range(len(day.scans))), "scans", progress):
        findings.extend(own)
        figures[number] = one
    return figures


def _read_spectra(
    source: DaySource, day: Day, findings: Findings, progress: Progress
) -> list[SpectrumFigures | None]:
    """What is taken from each impedance spectrum, None where it has faults."""

    def read(number: int) -> tuple[SpectrumFigures | None, Findings]:
        spectrum, own = day.spectra[number], Findings()
        try:
            record = source.spectrum(spectrum, own)
            fit = fit_circuit(record.frequency_hertz, record.impedance_ohm)
            check = kramers_kronig(record.frequency_hertz, record.impedance_ohm)
            return SpectrumFigures(fit, check, record), own
        except DayFaults as faults:
            own.extend(faults.findings)
        except ImpedanceError as error:
            own.add(
                "broken-spectrum",
                f"{spectrum.file} ({spectrum.origin})",
                "the spectrum gives no resistance",
                "check the file and the signs of its columns",
                found=str(error),
                expected=error.expected,
            )
        return None, own

    figures: list[SpectrumFigures | None] = [None] * len(day.spectra)
    for number, (one, own) in _in_threads(read, list(range(len(day.spectra))), "spectra", progress):
        findings.extend(own)
        figures[number] = one
    return figures


def _in_threads(
    read: Callable[[int], _Result], numbers: Sequence[int], what: str, progress: Progress
) -> Iterable[tuple[int, _Result]]:
    """Results in order; reading long text releases the interpreter lock, so that two threads pay."""
    with ThreadPoolExecutor(min(4, os.cpu_count() or 1)) as pool:
        for done, result in enumerate(pool.map(read, numbers), start=1):
            progress(what, done, len(numbers))
            yield numbers[done - 1], result


def _fingerprints(source: DaySource) -> tuple[InputFile, ...]:
    with ThreadPoolExecutor(min(4, os.cpu_count() or 1)) as pool:
        found = list(pool.map(sha256_of, source.files))
    return tuple(
        sorted(
            (InputFile(source.label(path), *one) for path, one in zip(source.files, found, strict=True)),
            key=lambda one: one.path,
        )
    )
