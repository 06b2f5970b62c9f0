"""Potentiostat logs and voltammograms: long tables of numbers, read fast and checked whole.

The first lines say how the file is written; the body is then read by the fastest reader at hand. Where that fails, or
finds something wrong, a slow reader goes through the file row by row and names the place.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from coulombook.balance.readings import FloatArray, SpectrumRecord, Trace, Voltammogram
from coulombook.findings import Findings, Origin
from coulombook.intake import schema, text
from coulombook.intake.files import Folder, report_outside, unreadable
from coulombook.intake.schema import Column, Schema
from coulombook.intake.settings import TraceOptions
from coulombook.intake.tables import quoted, shortened, unit_conversion
from coulombook.units import LARGEST_NUMBER, UnitError, conversion, nearest, parse_head

HEAD_BYTE = 65_536
_LONGEST_HEAD_BYTE = 4_194_304  # instruments that write their whole method above the heads stay well below
LARGEST_TRACE_BYTE = 4_000_000_000
# Without pandas at hand, its import is paid back by its speed from about this size on: measured, numpy takes three to
# four times as long for a megabyte, and the import as long as 100 MB with pandas or 30 MB with numpy.
PANDAS_PAYS_BYTE = 50_000_000

_BRACKET_UNIT = re.compile(r"(.*?)\s*[\[(]\s*([^\[\]()]*?)\s*[\])]")
_DECIMAL_COMMA = re.compile(r"[+-]?\d*,\d+([eE][+-]?\d+)?")
_LINE_END = re.compile(r"\r\n|\n|\r")


@dataclass(frozen=True, slots=True)
class Layout:
    """How a long table is written: what its first lines say."""

    encoding: str  # "utf-8" also stands for Windows-1252: only numbers are read from the body
    separator: str
    decimal: str
    head_row: int  # as the spreadsheet counts
    above: int  # lines above the heads that are not blank
    quotes: bool  # whether cells of the body may stand in quotes
    heads: tuple[str, ...]
    columns: Mapping[str, int]  # quantity -> place of its column
    width: int  # cells in a row, blank ones at the end with them
    careful: bool = False  # only the slow reader tells the rows apart rightly
    lone_returns: bool = False  # lines that end in CR alone, which pandas miscounts when it skips them


def read_trace(
    folder: Folder,
    path: Path,
    area_m2: float,
    options: TraceOptions,
    findings: Findings,
    all_byte: int = 0,
) -> Trace | None:
    """A potentiostat log in SI, or None after a fault.

    ``area_m2`` turns a current density into a current. ``all_byte`` is the size of all the files that will be read,
    for the choice of the reader.
    """
    read = _read(folder, path, schema.TRACE, options, "broken-trace", area_m2, all_byte, findings)
    if read is None:
        return None
    values, layout = read
    time = values["t"]
    if time.size < 2:
        findings.add(
            "broken-trace",
            folder.name_of(path),
            "the file holds a single reading",
            "put in the log of this run, or delete its row",
            found="one row of numbers",
            expected="two rows or more, for charge is current over time",
        )
        return None
    wrong = np.flatnonzero(~(np.diff(time) > 0))
    if wrong.size:
        _report_time(folder, path, layout, time, wrong, findings)
        return None
    return Trace(time, values["e"], values["i"], values.get("u"))


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
    read = _read(folder, path, schema.VOLTAMMOGRAM, options, "broken-scan", area_m2, all_byte, findings)
    if read is None:
        return None
    values, _ = read
    return Voltammogram(values["e"], values["i"], values.get("t"), values.get("cycle"))


def read_spectrum(
    folder: Folder, path: Path, options: TraceOptions, findings: Findings, all_byte: int = 0
) -> SpectrumRecord | None:
    """An impedance spectrum in SI, or None after a fault."""
    read = _read(folder, path, schema.SPECTRUM, options, "broken-spectrum", 1.0, all_byte, findings)
    if read is None:
        return None
    values, _ = read
    impedance = values["zre"] + 1j * values["zim"]
    impedance.setflags(write=False)
    return SpectrumRecord(values["f"], impedance)


def _read(
    folder: Folder,
    path: Path,
    table: Schema,
    options: TraceOptions,
    broken: str,
    area_m2: float,
    all_byte: int,
    findings: Findings,
) -> tuple[dict[str, FloatArray], Layout] | None:
    name = folder.name_of(path)
    if not folder.holds(path):
        report_outside(findings, name, name)
        return None
    own = Findings()
    try:
        size = path.stat().st_size
        if not path.is_file():
            raise FileNotFoundError
        layout = _layout(path, size, name, table, options, broken, own)
        how = None if layout is None else _conversions(layout, name, table, options, own)
        if layout is None or how is None:
            findings.extend(own)
            return None
        values = _fast(path, max(size, all_byte), layout)
        if values is None:
            values = _slow(path, name, layout, broken, own)
    except FileNotFoundError:
        findings.add("missing-file", name, "there is no such file", "add the file", found="nothing there")
        return None
    except OSError as error:
        unreadable(findings, name, error.strerror or "an error of the file system", "a file that can be read")
        return None
    except text.UnreadableText as error:
        unreadable(findings, name, error.found, error.expected)
        return None
    if values is None:
        findings.extend(own)
        return None
    if "i" in table.by_quantity and "i" not in values:
        values["i"] = values.pop("j")
        how["i"] = how["j"] * area_m2
    values.pop("j", None)
    for quantity, array in values.items():
        if how[quantity] != 1.0:
            array *= how[quantity]
        array.setflags(write=False)
    return values, layout


def _layout(
    path: Path, size: int, name: str, table: Schema, options: TraceOptions, broken: str, findings: Findings
) -> Layout | None:
    """How a file is written, from its first bytes; None after a fault."""
    if size == 0:
        _report_empty(findings, broken, name)
        return None
    if size > LARGEST_TRACE_BYTE:
        unreadable(
            findings, name, f"{size / 1e9:.0f} GB", f"a file of at most {LARGEST_TRACE_BYTE / 1e9:.0f} GB"
        )
        return None
    take = HEAD_BYTE
    while True:
        with path.open("rb") as stream:
            data = stream.read(take)
        lines, encoding = _first_lines(data, cut=take < size)
        found = _find_heads(lines, table, options)
        complete = found is not None and found[2]
        if complete or take >= min(size, _LONGEST_HEAD_BYTE):
            break
        take *= 8
    if found is None or not complete:
        _report_no_heads(findings, name, lines, found, table, options)
        return None
    place, separator, _ = found
    heads = text.split_line(lines[place], separator)
    columns = _columns(heads, table, options, name, place + 1, findings)
    if columns is None:
        return None
    below = [line for line in lines[place + 1 : place + 201] if line.strip()]
    cells = [text.split_line(line, separator) for line in below]
    if _report_overlong(findings, name, heads, list(enumerate(cells, place + 2))):
        return None
    used = [row[column] for row in cells for column in columns.values() if column < len(row)]
    decimal = options.decimal or ("," if any(map(_DECIMAL_COMMA.fullmatch, used)) else ".")
    if separator == "," and decimal == "," and not any('"' in line for line in below):
        decimal = "."
    quotes = any('"' in line for line in below)
    # a stray quote in the free text would make a fast reader that minds quotes swallow rows
    careful = quotes and any('"' in line for line in lines[:place])
    width = max(map(len, [heads, *cells]))
    lone_returns = any(line.endswith("\r") for line in lines[: place + 2])
    # a tab is no blank where it parts the cells
    above = sum(bool(line.strip("\r\n \t".replace(separator, ""))) for line in lines[:place])
    return Layout(
        encoding, separator, decimal, place + 1, above, quotes, tuple(heads), columns, width, careful, lone_returns
    )  # fmt: skip


def _first_lines(data: bytes, *, cut: bool) -> tuple[list[str], str]:
    """The whole lines at the start of a file and its encoding; ``cut`` says that the file goes on."""
    encoding = text.encoding_of(data)
    if encoding == "utf-16" and len(data) % 2:
        data = data[:-1]
    if encoding == "utf-8-sig" and cut:
        # the cut may fall inside a character; an ASCII line end is never part of one
        data = data[: max(data.rfind(b"\n"), data.rfind(b"\r")) + 1] or data
    lines = text.lines_of(text.decode(data))
    if cut and lines and not lines[-1].endswith(("\n", "\r")):
        if len(lines) == 1:
            raise text.UnreadableText(
                f"a line of more than {len(lines[0]) - 1} characters in row 1",
                f"lines of at most {text.LONGEST_LINE} characters",
            )
        lines.pop()
    return lines, "utf-16" if encoding == "utf-16" else "utf-8"


def _find_heads(lines: Sequence[str], table: Schema, options: TraceOptions) -> tuple[int, str, bool] | None:
    """Place of the heads, separator, and whether every needed column is there; None when no line is like heads."""

    def score(cells: Sequence[Any]) -> float:
        known = {quantity for cell in cells if (quantity := _quantity_of(cell, table, options))}
        if not known:
            return 0.0
        needed = {column.quantity for column in table.needed()}
        if needed <= known and ("i" not in table.by_quantity or known & {"i", "j"}):
            return 1.0
        return len(known) / (len(table.columns) + 1)

    separators = (options.separator,) if options.separator else text.SEPARATORS
    candidates: Iterator[tuple[int, str]] = enumerate(lines)
    if options.skip is not None and options.skip < len(lines):
        candidates = iter([(options.skip, lines[options.skip])])
    best: tuple[float, int, str] | None = None
    for place, line in candidates:
        for separator in separators:
            if separator in line:
                value = score(text.split_line(line, separator))
                if value > 0 and (best is None or value > best[0]):
                    best = value, place, separator
        if best is not None and best[0] >= 1:
            break
    return None if best is None else (best[1], best[2], best[0] >= 1)


def _quantity_of(head: str, table: Schema, options: TraceOptions) -> str | None:
    """The quantity a head stands for: as day.toml maps it, else as the contract names it."""
    folded = " ".join(head.split())
    for quantity, (mapped, _) in options.columns.items():
        if folded.casefold() == mapped.casefold():
            return quantity if quantity in table.by_quantity else None
    column = table.by_name.get(parse_head(folded).quantity)
    return None if column is None else column.quantity


def _columns(
    heads: Sequence[str], table: Schema, options: TraceOptions, name: str, row: int, findings: Findings
) -> dict[str, int] | None:
    columns: dict[str, int] = {}
    mapped = {quantity for quantity, (head, _) in options.columns.items() if head.casefold() in
              {" ".join(one.split()).casefold() for one in heads}}  # fmt: skip
    for place, head in enumerate(heads):
        quantity = _quantity_of(head, table, options)
        if quantity is None:
            continue
        is_mapped = " ".join(head.split()).casefold() in {
            one.casefold() for one, _ in options.columns.values()
        }
        if quantity in mapped and not is_mapped:
            continue  # day.toml says which of the two it is
        if quantity in columns:
            findings.add(
                "repeated-column",
                Origin(name, None, row, shortened(head)),
                "two columns carry the same quantity",
                "say which one counts: [read.traces] columns in day.toml",
                found=f"'{heads[columns[quantity]]}' and '{head}'",
                expected=f"one column '{table.by_quantity[quantity].head}'",
            )
            return None
        columns[quantity] = place
    if "i" in columns:
        columns.pop("j", None)
    return columns


def _conversions(
    layout: Layout, name: str, table: Schema, options: TraceOptions, findings: Findings
) -> dict[str, float] | None:
    """Factor to SI of every column read; None after a fault."""
    factors: dict[str, float] = {}
    for quantity, place in layout.columns.items():
        column = table.by_quantity[quantity]
        head = layout.heads[place]
        unit = _unit_of(head, quantity, options)
        try:
            factors[quantity] = (
                unit_conversion(column, unit) if column.dimension is None else _with_unit(column, unit)
            ).factor
        except UnitError as error:
            hint = f"; did you mean '{error.suggestion}'?" if error.suggestion else ""
            findings.add(
                error.kind,
                Origin(name, None, layout.head_row, shortened(head)),
                "the unit measures something else" if error.kind == "wrong-dimension" else "the unit is not known"
                if unit else "the head gives no unit",
                f"write the head as '{column.head}', or map it in day.toml: "
                f"[read.traces] columns = {{ \"{column.head}\" = \"{shortened(head)}\" }}{hint}",
                found=f"unit {quoted(unit)}" if unit else "no unit in the head",
                expected=error.expected,
            )  # fmt: skip
    return factors if len(factors) == len(layout.columns) else None


def _with_unit(column: Column, unit: str | None) -> Any:
    if unit is None:
        raise UnitError("unknown-unit", "", f"the head '{column.head}'", None)
    return conversion(unit, column.dimension or "fraction")


def _unit_of(head: str, quantity: str, options: TraceOptions) -> str | None:
    """The unit of a column: that of its key in day.toml, after the slash of its head, or in brackets."""
    folded = " ".join(head.split())
    mapped = options.columns.get(quantity)
    if mapped is not None and mapped[0].casefold() == folded.casefold():
        if mapped[1] is not None:
            return mapped[1]
        bracket = _BRACKET_UNIT.fullmatch(folded)
        if bracket:
            return bracket[2]
    return parse_head(folded).unit


def _report_no_heads(
    findings: Findings,
    name: str,
    lines: Sequence[str],
    found: tuple[int, str, bool] | None,
    table: Schema,
    options: TraceOptions,
) -> None:
    if found is None:
        shown = next((line.strip() for line in lines if line.strip()), "")
        findings.add(
            "missing-column",
            name,
            "no line of the file is a line of heads",
            "write the heads as expected, or map them in day.toml: [read.traces] columns",
            found=quoted(shown),
            expected=", ".join(f"'{column.head}'" for column in table.columns[:3]),
        )
        return
    place, separator, _ = found
    heads = [head for head in text.split_line(lines[place], separator) if head]
    known = {_quantity_of(head, table, options) for head in heads}
    missing = [column for column in table.needed() if column.quantity not in known]
    if "i" in table.by_quantity and not known & {"i", "j"}:
        missing.append(table.by_quantity["i"])
    for column in missing:
        names = [head for head in heads if _quantity_of(head, table, options) is None]
        near = _meant(column, names)
        findings.add(
            "missing-column",
            Origin(name, None, place + 1),
            f"the file has no column '{column.head}'",
            f"write the head '{near}' as '{column.head}'" if near
            else "add the column, or map its head in day.toml: [read.traces] columns",
            found=", ".join(f"'{head}'" for head in heads)[:300],
            expected=f"'{column.head}'",
        )  # fmt: skip


def _meant(column: Column, heads: Sequence[str]) -> str | None:
    """The head that may be meant by a column: its words are near a name of the column, or begin with its symbol."""
    for head in heads:
        # "I/mA", "I [mA]" and "I (mA)" are how heads come from instruments
        words = re.split(r"\s*[/\[(]", head, maxsplit=1)[0].casefold()
        names = [column.quantity, *column.synonyms]
        if nearest(words, names) or (len(words) <= 3 and words.startswith(column.quantity)):
            return head
    return None


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


def _report_overlong(
    findings: Findings, name: str, heads: Sequence[str], rows: Sequence[tuple[int, Sequence[str]]]
) -> bool:
    """Fault rows with more cells than heads: a decimal comma between commas would shift every number unseen."""
    wrong = [
        (number, cells) for number, cells in rows if len(cells) > len(heads) and any(cells[len(heads) :])
    ]
    if not wrong:
        return False
    number, cells = wrong[0]
    more = f"; {len(wrong) - 1} more rows are so" if len(wrong) > 1 else ""
    findings.add(
        "unreadable-file",
        Origin(name, None, number),
        "the row has more cells than there are heads",
        "write decimals with a point, or put semicolons between the cells",
        found=f"{len(cells)} cells{more}",
        expected=f"{len(heads)} cells",
    )
    return True


# --- reading the body ---


def _fast(path: Path, all_byte: int, layout: Layout) -> dict[str, FloatArray] | None:
    """The columns read by the fastest reader at hand; None when the slow reader must look."""
    if layout.careful:
        return None
    # a text in UTF-16 must be decoded in any case, which is what pandas would save
    pays = "pandas" in sys.modules or all_byte >= PANDAS_PAYS_BYTE
    with_pandas = pays and layout.encoding == "utf-8" and not layout.lone_returns
    try:
        values = _with_pandas(path, layout) if with_pandas else _with_numpy(path, layout)
    except (ValueError, OverflowError, IndexError):
        return None
    arrays = list(values.values())
    # too few rows are the slow reader's to judge, and so is anything that is no finite number
    if not arrays[0].size:
        return None
    # the extremes of an array with a NaN are NaN, and no comparison with it holds
    if not all(array.min() >= -LARGEST_NUMBER and array.max() <= LARGEST_NUMBER for array in arrays):
        return None
    return values


def _with_pandas(path: Path, layout: Layout) -> dict[str, FloatArray]:
    import pandas as pd

    places = sorted(layout.columns.values())
    # picking columns costs as much as reading one; a file of nothing else needs no picking
    pick = None if places == list(range(layout.width)) else places
    # skipping rows costs a look-up at every row below, a quarter of the time; heads do not, but pandas takes the first
    # column for an index unless told otherwise, and heads that are fewer than the cells for a mistake
    start: dict[str, Any] = {"header": layout.above, "index_col": False}
    if len(layout.heads) < layout.width:
        start = {"header": None, "skiprows": layout.head_row}
    # a path with UTF-8 is three times as fast as any other way; numbers are ASCII, whatever the free text is
    frame = pd.read_csv(
        path,
        sep=layout.separator,
        decimal=layout.decimal,
        **start,
        usecols=pick,
        dtype=np.float64,
        engine="c",
        na_filter=False,
        quoting=0 if layout.quotes else 3,
        encoding="utf-8",
        encoding_errors="replace",
    )
    return {
        quantity: np.array(frame.iloc[:, places.index(place)].to_numpy(), dtype=np.float64)
        for quantity, place in layout.columns.items()
    }


def _with_numpy(path: Path, layout: Layout) -> dict[str, FloatArray]:
    # surrogates keep bytes that are no text from becoming anything a number could hold
    body = path.read_bytes().decode(layout.encoding, "surrogateescape")
    if "\0" in body:
        raise ValueError("binary data")
    start = 0
    for _ in range(layout.head_row):
        end = _LINE_END.search(body, start)
        if end is None:
            raise ValueError("no rows")
        start = end.end()
    body = body[start:]
    if layout.decimal == ",":
        if "." in body or layout.separator == ",":
            raise ValueError("two decimal signs")
        body = body.replace(",", ".")
    if "\r" in body:
        body = body.replace("\r\n", "\n").replace("\r", "\n")
    if not body.strip():
        raise ValueError("no rows")
    lines = [line for line in body.split("\n") if line.strip()]
    # loadtxt picks its columns and is blind to extra cells; rows of one width are what the heads promise
    if not layout.quotes and body.count(layout.separator) != len(lines) * lines[0].count(layout.separator):
        raise ValueError("rows of several widths")
    table = np.loadtxt(
        lines,
        delimiter=layout.separator,
        comments=None,
        usecols=list(layout.columns.values()),
        quotechar='"' if layout.quotes else None,
        ndmin=2,
    )
    return {quantity: np.ascontiguousarray(table[:, place]) for place, quantity in enumerate(layout.columns)}


def _numbered_rows(path: Path, layout: Layout) -> list[tuple[int, list[str]]]:
    """Every row below the heads that is not blank, with its number."""
    lines = text.lines_of(text.decode(path.read_bytes()))
    rows = text.rows_below(lines, layout.head_row, layout.separator)
    return [(number, cells) for number, cells in rows if any(cells)]


def _slow(
    path: Path, name: str, layout: Layout, broken: str, findings: Findings
) -> dict[str, FloatArray] | None:
    """The columns read row by row, every column with a cell that is no number reported; None after a fault."""
    rows = _numbered_rows(path, layout)
    if not rows:
        _report_empty(findings, broken, name)
        return None
    if _report_overlong(findings, name, layout.heads, rows):
        return None
    if layout.separator != ",":
        # the first rows may have held whole numbers only
        used = [cells[place] for _, cells in rows for place in layout.columns.values() if place < len(cells)]
        commas = sum("," in cell for cell in used)
        if commas > sum("." in cell for cell in used):
            layout = replace(layout, decimal=",")
    values: dict[str, FloatArray] = {}
    faults = 0
    for quantity, place in layout.columns.items():
        cells = [cells[place] if place < len(cells) else "" for _, cells in rows]
        array = np.array([_number(cell, layout.decimal) for cell in cells])
        wrong = np.flatnonzero(~(np.abs(array) <= LARGEST_NUMBER))
        if wrong.size:
            faults += 1
            first = int(wrong[0])
            more = f"; {wrong.size - 1} more cells of the column are so" if wrong.size > 1 else ""
            sign = "comma" if layout.decimal == "," else "point"
            findings.add(
                "not-a-number",
                Origin(name, None, rows[first][0], layout.heads[place]),
                "the cell must hold a number",
                "correct the cell, or delete the row; text below the last reading goes too",
                found=(quoted(cells[first]) if cells[first] else "nothing") + more,
                expected=f"a finite number with a decimal {sign}"
                + (f", of a size up to {LARGEST_NUMBER:g}" if np.isfinite(array[first]) else ""),
            )
        values[quantity] = array
    return None if faults else values


def _number(cell: str, decimal: str) -> float:
    tidy = cell.strip().replace("\N{MINUS SIGN}", "-")
    if decimal == ",":
        if "." in tidy:
            return float("nan")
        tidy = tidy.replace(",", ".")
    try:
        # Python reads "1_000" as a number; no instrument writes so
        return float("nan") if "_" in tidy else float(tidy)
    except ValueError:
        return float("nan")


def _report_time(
    folder: Folder, path: Path, layout: Layout, time: FloatArray, wrong: Any, findings: Findings
) -> None:
    first = int(wrong[0])
    rows = _numbered_rows(path, layout)
    number = rows[first + 1][0] if first + 1 < len(rows) else None
    head = layout.heads[layout.columns["t"]]
    more = f"; {wrong.size - 1} more rows are so" if wrong.size > 1 else ""
    findings.add(
        "broken-trace",
        Origin(folder.name_of(path), None, number, head),
        "the time does not increase",
        "keep one log a file; delete rows logged twice",
        found=f"{time[first + 1]:.10g} s after {time[first]:.10g} s{more}",
        expected="a time later than that of the row above",
    )
