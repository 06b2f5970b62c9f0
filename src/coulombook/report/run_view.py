"""One run on the terminal: its products, its injections, what its uncertainty comes from, what to know of it."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from rich.console import Console
from rich.text import Text

from coulombook.book import Book, Cell
from coulombook.book.shares import TOTAL, largest, source_shares
from coulombook.findings import Finding
from coulombook.prose.numbers import fixed, plain, with_uncertainty
from coulombook.prose.text import crop, visible
from coulombook.report.grid import Column, grid
from coulombook.report.terminal import HOW_TO_READ, hanging, show_findings
from coulombook.report.terminal_tables import points_aligned

LONGEST_CELL = 20
LEAST_SHARE = 0.05  # of the variance of the total; smaller sources are left to `budget`

Record = Mapping[str, Cell]


def show_run(book: Book, run: str, console: Console) -> None:
    """Print one run of a book; ``run`` is one of its summary."""
    summary = next(row for row in book.tables["summary"].records() if row["run"] == run)
    head = [f"run {visible(run, 60)}", visible(str(summary["catalyst"] or ""), 60)]
    if summary["electrode"]:
        head.append(f"electrode {visible(str(summary['electrode']), 40)}")
    console.print(Text(", ".join(head), style="bold"), soft_wrap=True)
    console.print(Text(HOW_TO_READ, style="dim"))
    console.print()
    for label, value in _figures(summary):
        console.print(Text(f"{label:22}{value}"), soft_wrap=True)
    console.print()
    _show_products([row for row in book.tables["ledger"].records() if row["run"] == run], console)
    _show_injections(_of_run(book, "injections", run), console)
    _show_sources(book, run, console)
    about = findings_about(book.findings, run)
    if about:
        console.print()
        show_findings(about, console)


def _of_run(book: Book, table: str, run: str) -> list[Record]:
    return [row for row in book.tables[table].records() if row["run"] == run] if table in book.tables else []


def _figures(row: Record) -> list[tuple[str, str]]:
    def pair(head: str, spread: str, unit: str) -> str:
        return f"{with_uncertainty(_number(row[head]), _number(row[spread]))}{unit}"

    figures = [
        ("potential", pair("E vs RHE / V", "u(E vs RHE) / V", " V vs RHE")),
        ("current density", f"{plain(_number(row['j / mA cm^-2']), 4)} mA cm^-2, geometric"),
        ("charge", f"{plain(_number(row['charge / C']), 4)} C"),
        ("total FE", f"{pair('total FE / %', 'u(total FE) / %', ' %')}, {row['closure'] or 'not judged'}"),
        ("C2+ FE", pair("C2+ FE / %", "u(C2+ FE) / %", " %")),
        ("C2+/C1", pair("C2+/C1", "u(C2+/C1)", " by charge")),
        ("roughness factor", pair("roughness factor", "u(roughness factor)", "")),
        ("CO2 conversion", f"{fixed(_number(row['CO2 conversion / %']), 2)} %"),
    ]
    # what the run does not have is left out
    return [(label, value) for label, value in figures if not value.startswith("-") or value[1:2].isdigit()]


def _show_products(rows: Sequence[Record], console: Console) -> None:
    columns = [
        Column(("", "product"), tuple(_words(row["product"]) for row in rows), True),
        _aligned(("FE", "%"), [_pair(row, "FE / %", "u(FE) / %") for row in rows]),
        _aligned(("amount", "umol"), [plain(_number(row["amount / umol"]), 4) for row in rows]),
        _aligned(("j", "mA cm^-2"), [_pair(row, "j / mA cm^-2", "u(j) / mA cm^-2") for row in rows]),
        Column(("", "status"), tuple(_words(row["status"]) for row in rows), True),
    ]
    if rows:
        console.print(grid(columns, rule=_rule(console)), soft_wrap=True)
    else:
        console.print(Text("No product was measured."))


def _show_injections(rows: Sequence[Record], console: Console) -> None:
    """FE of every injection, products across, as many as fit."""
    if not rows:
        return
    labels = list(dict.fromkeys(row["injection"] for row in rows))
    cell = {(row["injection"], row["product"]): row for row in rows}
    times = {row["injection"]: row["time / s"] for row in rows}
    used = {row["injection"]: row["used"] for row in rows}
    columns = [
        Column(("", "injection"), tuple(_words(one) for one in labels), True),
        Column(("time", "s"), tuple(plain(_number(times[one]), 4) for one in labels)),
        Column(("", "used"), tuple(_words(used[one]) for one in labels), True),
    ]
    left = []
    for product in dict.fromkeys(row["product"] for row in rows):
        held = [cell.get((one, product)) for one in labels]
        cells = tuple("-" if row is None else _pair(row, "FE / %", "u(FE) / %") for row in held)
        column = Column((_words(product), "FE / %"), cells)
        if sum(one.width + 2 for one in [*columns, column]) - 2 <= console.width:
            columns.append(column)
        else:
            left.append(_words(product))
    console.print()
    console.print(Text("injections", style="bold"))
    console.print(grid(columns, rule=_rule(console)), soft_wrap=True)
    if left:
        hanging("", f"Not shown for want of room: {', '.join(left)}; they stand in injections.csv.", console)


def _show_sources(book: Book, run: str, console: Console) -> None:
    if "budget" not in book.tables:
        return
    _, shares = source_shares(book.tables["budget"], TOTAL, run)
    shown, rest = largest(shares, LEAST_SHARE)
    if not shown:
        return
    told = [f"{visible(one.source, 40)} {fixed(100 * one.share, 0)} %" for one in shown]
    if rest:
        told.append(f"{len(rest)} smaller ones {fixed(100 * sum(one.share for one in rest), 0)} %")
    console.print()
    hanging("", f"The variance of its total FE comes from {', '.join(told)}.", console)


def findings_about(findings: Sequence[Finding], run: str) -> list[Finding]:
    """The findings that name a run, as a word of its own, by where they are or in their text."""
    name = re.compile(rf"(?<![\w.-]){re.escape(run)}(?![\w-])")
    return [one for one in findings if name.search(one.where) or name.search(one.text)]


def _aligned(head: tuple[str, str], cells: Sequence[str]) -> Column:
    return Column(head, tuple(points_aligned(cells)))


def _rule(console: Console) -> str:
    return "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"


def _pair(row: Record, head: str, spread: str) -> str:
    return with_uncertainty(_number(row[head]), _number(row[spread]))


def _words(cell: Cell) -> str:
    return crop(visible("-" if cell is None else str(cell)), LONGEST_CELL)


def _number(cell: Cell) -> float | None:
    return None if cell is None or isinstance(cell, str) else float(cell)
