"""Potentiostat logs, voltammograms and spectra: long tables of numbers, read fast and checked whole.

The first lines say how the file is written (`layout`); the body is then read by the fastest reader at hand
(`fast_body`). Where that fails, or finds something wrong, a patient reader goes through the file row by row
(`patient_body`), interprets what is sure and names the place of what is not. What it took long for is kept
(`log_cache`).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime
from functools import partial
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from coulombook.balance.readings import FloatArray, SpectrumRecord, Trace, Voltammogram
from coulombook.findings import Findings, Origin
from coulombook.intake import log_cache, schema, text
from coulombook.intake.clock import Times
from coulombook.intake.fast_body import read_fast
from coulombook.intake.files import Folder, report_outside, unreadable
from coulombook.intake.layout import Layout, layout_of
from coulombook.intake.patient_body import numbered_rows, read_patiently
from coulombook.intake.schema import Schema
from coulombook.intake.settings import TraceOptions
from coulombook.intake.tables import quoted
from coulombook.intake.time_axis import Axis, from_zero, increasing, report_holes
from coulombook.units import SMALLEST_NUMBER

_DAY_SECOND = 86_400.0
_TAIL_BYTE = 4_096  # of the last rows


@dataclass(frozen=True, slots=True)
class _LongFile:
    """A file to be read, and what it is read with."""

    folder: Folder
    path: Path
    table: Schema
    options: TraceOptions
    broken: str  # kind of the fault of a file without readings
    all_byte: int  # size of all files that will be read
    started: datetime | None = None  # of the run

    @property
    def name(self) -> str:
        return self.folder.name_of(self.path)


@dataclass(frozen=True, slots=True, eq=False)
class _Numbers:
    """What a file holds, in SI, and what its times are judged with."""

    values: dict[str, FloatArray]
    axis: Axis


def read_trace(
    folder: Folder,
    path: Path,
    area_m2: float,
    options: TraceOptions,
    findings: Findings,
    all_byte: int = 0,
    *,
    started: datetime | None = None,
    window: tuple[float | None, float | None] = (None, None),
) -> Trace | None:
    """A potentiostat log in SI, or None after a fault.

    ``area_m2`` turns a current density into a current. ``all_byte`` is the size of all the files that will be read,
    for the choice of the reader. ``started`` is t = 0 of a log with a clock, ``window`` the part that counts.
    """
    file = _LongFile(folder, path, schema.TRACE, options, "broken-trace", all_byte, started)
    read = _read(file, area_m2, findings)
    if read is None:
        return None
    if read.values["t"].size < 2:
        _report_single(file.name, findings)
        return None
    values = increasing(read.values, read.axis, findings)
    if values is None:
        return None
    report_holes(values["t"], read.axis, window, findings)
    for array in values.values():
        array.setflags(write=False)
    return Trace(values["t"], values["e"], values["i"], values.get("u"))


def read_voltammogram(
    folder: Folder,
    path: Path,
    area_m2: float,
    options: TraceOptions,
    findings: Findings,
    all_byte: int = 0,
) -> Voltammogram | None:
    """A voltammogram in SI, or None after a fault.

    Heads given in [read.traces] are understood here too, for both mostly come from the same instrument.
    """
    file = _LongFile(folder, path, schema.VOLTAMMOGRAM, options, "broken-scan", all_byte)
    read = _read(file, area_m2, findings)
    if read is None:
        return None
    values = read.values
    return Voltammogram(values["e"], values["i"], values.get("t"), values.get("cycle"))


def read_spectrum(
    folder: Folder, path: Path, options: TraceOptions, findings: Findings, all_byte: int = 0
) -> SpectrumRecord | None:
    """An impedance spectrum in SI, or None after a fault."""
    file = _LongFile(folder, path, schema.SPECTRUM, options, "broken-spectrum", all_byte)
    read = _read(file, 1.0, findings)
    if read is None:
        return None
    impedance = read.values["zre"] + 1j * read.values["zim"]
    impedance.setflags(write=False)
    return SpectrumRecord(read.values["f"], impedance)


def _read(file: _LongFile, area_m2: float, findings: Findings) -> _Numbers | None:
    """The numbers of a file in SI, its times from zero; None after a fault."""
    name = file.name
    if not file.folder.holds(file.path):
        report_outside(findings, name, name)
        return None
    own = Findings()
    try:
        read = _numbers(file, own)
    except FileNotFoundError:
        findings.add("missing-file", name, "there is no such file", "add the file", found="nothing there")
        return None
    except OSError as error:
        unreadable(findings, name, error.strerror or "an error of the file system", "a file that can be read")
        return None
    except text.UnreadableText as error:
        unreadable(findings, name, error.found, error.expected)
        return None
    findings.extend(own)
    if read is None:
        return None
    values = read.values
    if "j" in values:
        density = values.pop("j")
        values.setdefault("i", density * area_m2)
    for array in values.values():
        array.setflags(write=False)
    return read


def _numbers(file: _LongFile, findings: Findings) -> _Numbers | None:
    size = file.path.stat().st_size
    if not file.path.is_file():
        raise FileNotFoundError
    report_empty = partial(_report_empty, findings, file.broken, file.name)
    if size == 0:
        report_empty()
        return None
    layout = layout_of(file.path, size, file.name, file.table, file.options, findings)
    if layout is None:
        return None
    values = read_fast(file.path, size, max(size, file.all_byte), layout)
    rows: NDArray[np.int64] | None = None
    stamp: datetime | None = None
    if values is None:
        kept = _untidy(file, size, layout, report_empty, findings)
        if kept is None:
            return None
        values, rows, stamp = dict(kept.values), kept.rows, kept.first_stamp
    if layout.units_row is not None:
        _note_units(file.name, layout, findings)
    _note_last_number(file, layout, findings)
    for quantity, array in values.items():
        if layout.factors[quantity] != 1.0:
            array *= layout.factors[quantity]
    axis = _axis(file, layout, rows)
    if "t" in values:
        time = from_zero(values["t"], axis, stamp, findings)
        if time is None:
            return None
        values["t"] = time
    return None if _report_denormal(file.name, layout, values, findings) else _Numbers(values, axis)


def _untidy(
    file: _LongFile, size: int, layout: Layout, report_empty: Callable[[], None], findings: Findings
) -> log_cache.Kept | None:
    """What the patient reader makes of a file, or made of it before."""
    options = file.options
    key = None
    if size >= log_cache.FROM_BYTE and log_cache.folder() is not None:
        told = (file.name, file.table.name, sorted(options.columns.items()), options.separator, options.decimal,
                options.skip, options.time, options.dates, options.clock_put_forward)  # fmt: skip
        key = log_cache.key_of(file.path, told)
        kept = log_cache.load(key)
        if kept is not None and set(kept.values) == set(layout.columns):
            findings.extend(kept.findings)
            return kept
    before = file.path.stat()
    own = Findings()
    read = read_patiently(file.path, file.name, layout, file.table, options, report_empty, own)
    findings.extend(own)
    if read is None:
        return None
    kept = log_cache.Kept(read.values, read.rows, read.first_stamp, tuple(own))
    after = file.path.stat()
    # a log that is still being written to must not be kept under the content it had
    if key is not None and (before.st_mtime_ns, before.st_size) == (after.st_mtime_ns, after.st_size):
        log_cache.keep(key, kept)
    return kept


def _axis(file: _LongFile, layout: Layout, rows: NDArray[np.int64] | None) -> Axis:
    def noted(place: int) -> int | None:
        return None if rows is None else int(rows[place])

    def sought(place: int) -> int | None:
        if rows is not None:
            return int(rows[place])
        return next(
            (number for at, (number, _) in enumerate(numbered_rows(file.path, layout)) if at == place), None
        )

    return Axis(
        file.name,
        layout.head_of("t") if "t" in layout.columns else "",
        layout.times is Times.NUMBER and layout.factors.get("t") == _DAY_SECOND,
        layout.times,
        file.options,
        sought,
        noted,
        file.started,
    )


# --- what is told ---


def _report_empty(findings: Findings, broken: str, name: str) -> None:
    findings.add(
        broken,
        name,
        "the file holds no readings",
        {
            "broken-trace": "put in the log of this run, or delete its row",
            "broken-scan": "put in the voltammogram",
        }.get(broken, "put in the spectrum"),
        found="no rows of numbers",
        expected="a row of heads and rows of numbers",
    )


def _report_single(name: str, findings: Findings) -> None:
    findings.add(
        "broken-trace",
        name,
        "the file holds a single reading",
        "put in the log of this run, or delete its row",
        found="one row of numbers",
        expected="two rows or more, for charge is current over time",
    )


def _report_denormal(name: str, layout: Layout, values: dict[str, FloatArray], findings: Findings) -> bool:
    """Fault a column whose numbers are all too small to be computed with, though not zero; whether there is one."""
    found = False
    for quantity, array in values.items():
        largest = max(abs(float(array.min())), abs(float(array.max())))
        if 0.0 < largest < SMALLEST_NUMBER:
            found = True
            findings.add(
                "not-a-number",
                Origin(name, None, None, layout.head_of(quantity)),
                "no quantity of the bench has this size",
                "correct the values, or the unit in the head",
                found=f"nothing larger than {largest:g} in SI units",
                expected=f"zero, or a size from {SMALLEST_NUMBER:g}",
            )
    return found


def _note_units(name: str, layout: Layout, findings: Findings) -> None:
    units = ", ".join(
        f"{layout.head_of(quantity)}: {layout.units[place]}"
        for quantity, place in layout.columns.items()
        if place < len(layout.units) and layout.units[place]
    )
    findings.add(
        "units-row",
        Origin(name, None, layout.units_row),
        f"the row under the heads was taken for their units ({quoted(units)[1:-1]})",
    )


def _note_last_number(file: _LongFile, layout: Layout, findings: Findings) -> None:
    """Tell of a last number that may be cut short: the file ends right behind it, with fewer decimals than above."""
    with file.path.open("rb") as stream:
        stream.seek(max(file.path.stat().st_size - 2, 0))
        if stream.read().strip(b"\0")[-1:] in (b"\n", b"\r"):
            return
        stream.seek(max(file.path.stat().st_size - _TAIL_BYTE, 0))
        tail = stream.read()
    codec = "utf-16-le" if layout.encoding == "utf-16" else "latin-1"
    rows = [
        line.split(layout.separator)
        for line in tail.decode(codec, "replace").splitlines()[1:]
        if line.strip()
    ]
    if len(rows) < 3 or len({len(row) for row in rows[-3:]}) > 1:
        return
    two, one, last = (_decimals(row[-1], layout.decimal) for row in rows[-3:])
    if last < one == two and one > 1:
        findings.add(
            "last-line-cut",
            file.name,
            f"the file ends right behind its last number, {quoted(rows[-1][-1].strip())}, which may be cut short; "
            "it was taken as it stands",
            "check that nothing is missing at the end",
        )


def _decimals(cell: str, decimal: str) -> int:
    return len(cell.strip().partition(decimal)[2])
