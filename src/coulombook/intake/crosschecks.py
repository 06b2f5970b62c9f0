"""What no single cell can show: names that must meet, things entered twice, what a choice of the day needs."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Collection, Mapping, Sequence
from datetime import datetime
from typing import TypeVar

from coulombook.balance.readings import (
    Calibration,
    Check,
    DaySettings,
    Declared,
    FlowKind,
    OutletFlow,
    Peak,
    Run,
    Scan,
    Signal,
    Vial,
)
from coulombook.findings import Findings, RowOrigin
from coulombook.intake.files import advice, did_you_mean
from coulombook.intake.settings import DayFile
from coulombook.intake.tables import Default, TypedTable

_Record = TypeVar("_Record", Peak, Signal, Check, Scan)

_FLOW_NEEDED = {
    OutletFlow.INLET: "inlet flow",
    OutletFlow.MEASURED: "outlet flow",
    OutletFlow.TRACER: "tracer flow",
    OutletFlow.BALANCE: "inlet flow",
}


def unique_words(table: TypedTable, quantities: Sequence[str], what: str, findings: Findings) -> None:
    """Fault a row that repeats the words of an earlier one in all of ``quantities``."""
    columns = [table.words(quantity) for quantity in quantities]
    folded = zip(*([word.casefold() for word in words] for words in columns), strict=True)
    if not table.columns.get(quantities[0]):
        return
    used = table.yes_no("use", otherwise=True)
    first: dict[tuple[str, ...], int] = {}
    for place, key in enumerate(folded):
        if not key[0] or not used[place]:
            continue
        earlier = first.setdefault(key, place)
        if earlier != place:
            written = [words[place] for words in columns]
            shown = ", ".join(
                f"{quantity} '{one}'" for quantity, one in zip(quantities, written, strict=True) if one
            )
            findings.add(
                "duplicate",
                table.where(place, quantities[-1]),
                f"{what} is entered twice",
                "delete one of the rows, or correct its name",
                found=f"{shown}, as in row {table.row_numbers[earlier]}",
                expected=f"{what} once",
            )


def unique_records(
    records: Sequence[_Record],
    key: Callable[[_Record], tuple[str, ...]],
    quantity: str,
    what: str,
    findings: Findings,
) -> None:
    """Fault a record with the key of an earlier one: names are the trade names, so that CO and carbon monoxide meet."""
    first: dict[tuple[str, ...], _Record] = {}
    for one in records:
        earlier = first.setdefault(key(one), one)
        if earlier is not one:
            findings.add(
                "duplicate",
                one.origin.of(quantity),
                f"{what} is entered twice",
                "delete one of the rows, or correct its names",
                found=f"{', '.join(part for part in key(one) if part)}, as in row {earlier.origin.row}",
                expected=f"{what} once",
            )


def known_names(
    table: TypedTable, quantity: str, known: Sequence[str], what: str, defined_in: str, findings: Findings
) -> None:
    """Fault every name of a column that is not among ``known``, once a name."""
    words = table.words(quantity)
    there = set(known)
    counts = Counter(words)
    reported: set[str] = set()
    for place, word in enumerate(words):
        if word and word not in there and word not in reported:
            reported.add(word)
            rows = counts[word]
            more = f" ({rows} rows)" if rows > 1 else ""
            findings.add(
                "unknown-name",
                table.where(place, quantity),
                f"no {what} of that name is in {defined_in}",
                f"correct the name, or add it to {defined_in}{advice(findings, 'unknown-name', word, known)}",
                found=f"'{word}'{more}",
                expected=", ".join(f"'{one}'" for one in known[:5]) + (", ..." if len(known) > 5 else "")
                or f"a {what} of {defined_in}",
            )


def logs_with_options(file: DayFile, names: Sequence[str], findings: Findings) -> None:
    """Fault a section of [read.traces] for a file that no table names."""
    for key in file.traces.files:
        if key not in names:
            findings.add(
                "unknown-name",
                file.source.where(f"read.traces.{key}"),
                "no table of the day names this file",
                f"correct the name, or delete the section{did_you_mean(key, names)}",
                found=f"'{key}'",
                expected="a trace, voltammogram or spectrum by its path in the day folder",
            )


def windows(runs: Sequence[Run], scans: Sequence[Scan], findings: Findings) -> None:
    """Fault windows that end before they begin."""
    for run in runs:
        if (
            run.start_second is not None
            and run.stop_second is not None
            and run.stop_second <= run.start_second
        ):
            _window(
                findings,
                run.origin,
                "stop",
                f"{run.stop_second:g} s",
                f"after the start, {run.start_second:g} s",
            )
    for scan in scans:
        low, high = scan.window_low_volt, scan.window_high_volt
        if low is not None and high is not None and high <= low:
            _window(findings, scan.origin, "window high", f"{high:g} V", f"above the low end, {low:g} V")


def _window(findings: Findings, origin: RowOrigin, quantity: str, found: str, expected: str) -> None:
    findings.add(
        "not-allowed",
        origin.of(quantity),
        "the window ends before it begins",
        "correct either end, or their units",
        found=found,
        expected=expected,
    )


def relaxation(signals: Sequence[Signal], findings: Findings) -> None:
    """Fault signals with a T1 but no repetition time: how far they were saturated cannot be told."""
    for signal in signals:
        if signal.relaxation_second is not None and signal.repetition_second is None:
            findings.add(
                "missing-value",
                signal.origin.of("repetition time"),
                f"{signal.analyte} {signal.signal} has a T1 but no repetition time",
                "fill in the repetition time, or leave T1 blank: saturation needs both",
                found=f"T1 of {signal.relaxation_second:g} s alone",
                expected="a column 'repetition time / s' with a number above zero",
            )


def flows(
    settings: DaySettings, runs: Sequence[Run], peaks: Sequence[Peak], table: TypedTable, findings: Findings
) -> None:
    """Fault runs with gas peaks that lack the flow which the day's outlet flow is found from."""
    quantity = _FLOW_NEEDED[settings.outlet_flow]
    with_peaks = {peak.run for peak in peaks if peak.used}
    attribute = quantity.replace(" ", "_")
    lacking = [run for run in runs if run.name in with_peaks and getattr(run, attribute) is None]
    if not lacking or quantity in table.unread:
        return
    text = f"outlet_flow = '{settings.outlet_flow}' needs the {quantity} of every run with gas peaks"
    expected = f"'{quantity} / sccm', or another unit of flow"
    if quantity not in table.heads:
        findings.add(
            "missing-column",
            table.table_origin,
            text,
            "add the column, or a default to [defaults], or choose another outlet_flow in [gas]",
            found=", ".join(f"'{head}'" for head in (*table.heads.values(), *table.carried))[:300],
            expected=expected,
        )
        return
    for run in lacking:
        findings.add(
            "missing-value",
            run.origin.of(quantity),
            text,
            "fill in the cell",
            found="nothing",
            expected=expected,
        )


def standards(
    vials: Sequence[Vial], signals: Sequence[Signal], broken: frozenset[str], findings: Findings
) -> None:
    """Fault vials whose internal standard has no rows, or an integral that is not above zero.

    ``broken`` names vials some of whose rows are at fault already.
    """
    rows: dict[str, list[Signal]] = {}
    for signal in signals:
        rows.setdefault(signal.vial, []).append(signal)
    for vial in vials:
        if not vial.used:
            continue
        own = [one for one in rows.get(vial.name, ()) if one.analyte == vial.standard]
        if not own and vial.name not in broken:
            given = sorted({one.analyte for one in rows.get(vial.name, ())})
            findings.add(
                "missing-standard",
                vial.origin.of("standard"),
                "the vial has no rows of its internal standard",
                f"add the standard's signals to liquid{did_you_mean(vial.standard, given)}",
                found=f"vial '{vial.name}' with " + (", ".join(f"'{one}'" for one in given) or "no signals"),
                expected=f"rows of analyte '{vial.standard}'",
            )
        for one in own:
            if not one.integral > 0:
                findings.add(
                    "missing-standard",
                    one.origin.of("integral"),
                    "the integral of the internal standard is not above zero",
                    "integrate the signal again, or mark the vial with use = no",
                    found=f"{one.integral:g}",
                    expected="a number above zero",
                )


def starting_times(
    runs: Sequence[Run], peaks: Sequence[Peak], checks: Sequence[Check], table: TypedTable, findings: Findings
) -> None:
    """Fault runs without a starting time where checks need one, and times with and without zone mixed."""
    if checks:
        with_peaks = {peak.run for peak in peaks}
        lacking = [run for run in runs if run.started is None and run.name in with_peaks]
        if lacking and "started" not in table.heads:
            findings.add(
                "missing-column",
                table.table_origin,
                "check-gas injections need the time at which each run started",
                "add the column 'started', the date-time of t = 0 of the trace",
                found=", ".join(f"'{head}'" for head in table.heads.values())[:300],
                expected="'started'",
            )
        else:
            for run in lacking:
                findings.add(
                    "missing-value",
                    run.origin.of("started"),
                    "check-gas injections need the time at which the run started",
                    "fill in the date-time of t = 0 of the trace",
                    found="nothing",
                    expected="a date-time such as 2043-05-18T09:30:00",
                )
    times: list[tuple[datetime, RowOrigin, str]] = [
        (run.started, run.origin, "started") for run in runs if run.started is not None
    ]
    times += [(check.at, check.origin, "at") for check in checks]
    if not times:
        return
    zoned = [one for one in times if one[0].tzinfo is not None]
    naive = [one for one in times if one[0].tzinfo is None]
    if zoned and naive:
        fewer, more = (zoned, naive) if len(zoned) < len(naive) else (naive, zoned)
        first = fewer[0]
        other = "with" if more is zoned else "without"
        findings.add(
            "not-allowed",
            first[1].of(first[2]),
            "date-times with and without a time zone are mixed",
            f"write every date-time of the day {other} a time zone",
            found=f"'{first[0].isoformat()}'; {len(fewer)} of {len(times)} are so",
            expected=f"a date-time {other} a time zone, as '{more[0][0].isoformat()}'",
        )


def smooth_reference(
    settings: DaySettings, scans: Sequence[Scan], file: DayFile, has_table: bool, findings: Findings
) -> None:
    """Fault a smooth reference that is no electrode of scans."""
    name = settings.smooth_reference
    electrodes = sorted({scan.electrode for scan in scans})
    if name is None or name in electrodes:
        return
    findings.add(
        "unknown-name",
        file.source.where("surface", "smooth_reference"),
        "the smooth reference is no electrode of scans",
        f"correct the name, or add its scans{did_you_mean(name, electrodes)}",
        found=f"'{name}'",
        expected="an electrode of scans" if has_table else "a table scans with that electrode",
    )


def declared_flow_kinds(
    declared: Sequence[Declared], kinds: Sequence[str | None], runs: Sequence[Run], findings: Findings
) -> None:
    """Fault an absolute uncertainty of a flow that is written in another kind of unit than the flow."""
    for one, kind in zip(declared, kinds, strict=True):
        if kind is None:
            continue
        attribute = one.quantity.replace(" ", "_")
        used = {flow.kind for run in runs if (flow := getattr(run, attribute)) is not None}
        other = next((other for other in sorted(used) if other != FlowKind(kind)), None)
        if other is not None:
            findings.add(
                "wrong-dimension",
                one.origin,
                f"the uncertainty of the {one.quantity} is in another kind of unit than the flow",
                "write it in the unit of the column, or relative in %",
                found=f"a flow that is {kind}",
                expected=f"a flow that is {other}, as in the column",
            )


def assumed(
    table: TypedTable,
    defaults: Mapping[str, Default],
    settings: DaySettings,
    with_spectra: Collection[str],
    findings: Findings,
) -> None:
    """Note the defaults that were taken, one finding a column; runs ``with_spectra`` get their resistance there."""
    total = len(table)
    for quantity, taken, kind in (
        ("temperature", "25 degC", "assumed-default"),
        ("pressure", "101.325 kPa", "assumed-default"),
        ("resistance", "0 ohm", "resistance-missing"),
        ("carbonate uptake", "0 umol/s", "assumed-default"),
    ):
        if quantity == "carbonate uptake" and settings.outlet_flow is not OutletFlow.BALANCE:
            continue  # the uptake acts on nothing else
        told = with_spectra if quantity == "resistance" else ()
        missing = sum(
            value is None and run not in told
            for value, run in zip(table.numbers(quantity), table.words("run"), strict=True)
        )
        if not missing or quantity in defaults or quantity in table.unread:
            continue
        runs = f"{missing} of {total} runs" if missing < total else "any run" if total > 1 else "the run"
        potential = ": potentials keep their ohmic drop" if quantity == "resistance" else ""
        findings.add(
            kind,
            table.file if table.sheet is None else f"{table.file}, sheet '{table.sheet}'",
            f"no {quantity} is given for {runs}; {taken} was taken{potential}",
            f"fill in the column '{table.schema.by_quantity[quantity].head}', or give a default in [defaults]",
        )


def expiry(
    calibrations: Sequence[Calibration], settings: DaySettings, runs: Sequence[Run], findings: Findings
) -> None:
    """Warn of calibrations past their validity on the day, or on its last start where no date is given."""
    starts = [run.started.date() for run in runs if run.started is not None]
    day = settings.date or (max(starts) if starts else None)
    for one in calibrations:
        if day is not None and one.valid_until is not None and one.valid_until < day:
            findings.add(
                "calibration-expired",
                one.origin,
                f"calibration '{one.name}' was valid until {one.valid_until}; the day is {day}",
                "calibrate again, or use a calibration that is still valid",
            )
