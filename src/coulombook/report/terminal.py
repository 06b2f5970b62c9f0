"""A day on the terminal: what a tired person needs of it, at 80 columns or more.

First Faradaic efficiency against potential for each catalyst, then how each run closes, then what the
reader should know, and last where the files are. Text from the bench's files goes through `report.text` and
is never taken for markup; colour repeats what words say already.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import TextIO

from rich import box
from rich.console import Console
from rich.padding import Padding
from rich.table import Table as Grid
from rich.text import Text

from coulombook.book import Book
from coulombook.findings import KINDS, Finding, Severity
from coulombook.report.numbers import ABSENT, fixed, plain, with_uncertainty
from coulombook.report.pivot import CatalystTable, Level, Row, catalyst_tables
from coulombook.report.text import crop, visible

AT_MOST = 10  # findings of one kind; the rest are counted
LONGEST_NAME = 24

CAUTIONS = (
    "Carbon monoxide poisons, hydrogen burns, and gas under pressure can burst a cell: vent, detect and "
    "relieve them as your local codes and licensed professionals require. No figure here stands in for that."
)
HOW_TO_READ = "FE in %; 31.2(14) is 31.2 with a standard uncertainty (k = 1) of 1.4."

_WORD = {Severity.STOP: "error", Severity.WARN: "warning", Severity.NOTE: "note"}
_STYLE = {Severity.STOP: "bold red", Severity.WARN: "bold yellow", Severity.NOTE: "bold cyan"}
_RANK = {Severity.STOP: 0, Severity.WARN: 1, Severity.NOTE: 2}
_CLOSURE_STYLE = {"closed": "green", "short": "yellow", "over": "yellow"}
_KIND_RANK = {kind: place for place, kind in enumerate(KINDS)}


def console_for(stream: TextIO) -> Console:
    """A console that takes no text for markup, links or emoji names."""
    return Console(file=stream, markup=False, emoji=False, highlight=False, soft_wrap=False)


def show_book(book: Book, console: Console, *, written: Path | None = None) -> None:
    """Print a whole book; ``written`` is the folder its files went to."""
    title = f"{visible(book.day, 100)}: {visible(book.title, 200)}" if book.title else visible(book.day, 100)
    console.print(Text(title, style="bold"))
    console.print(Text(HOW_TO_READ, style="dim"))
    for table in catalyst_tables(book):
        console.print()
        _show_catalyst(table, console)
    console.print()
    console.print(Text("runs", style="bold"))
    _show_runs(list(book.tables["summary"].records()), console)
    show_findings(book.findings, console)
    console.print()
    console.print(Text(CAUTIONS, style="dim"))
    if written is not None:
        # one line even if it is long, so that it can be copied
        console.print(Text(f"Written to {visible(str(written), 1000)}"), soft_wrap=True)


def show_check(lines: Sequence[str], findings: Sequence[Finding], console: Console) -> None:
    """Print what a tally would compute, and every finding."""
    for line in lines:
        console.print(Text(visible(line, 1000)))
    show_findings(findings, console)
    console.print()
    stops = sum(one.severity is Severity.STOP for one in findings)
    if stops:
        console.print(
            Text(f"{_count(stops, 'fault')} to mend before this day can be tallied.", style="bold red")
        )
    else:
        console.print(Text("This day can be tallied.", style="bold green"))


def show_findings(findings: Iterable[Finding], console: Console, *, least: Severity = Severity.NOTE) -> None:
    """Print findings: faults first, causes before consequences, at most ten of one kind.

    ``least`` leaves out what is milder than that severity.
    """
    kinds: dict[tuple[int, int, str], list[Finding]] = {}
    for one in findings:
        if _RANK[one.severity] <= _RANK[least]:
            rank = (_RANK[one.severity], _KIND_RANK.get(one.kind, len(_KIND_RANK)), one.kind)
            kinds.setdefault(rank, []).append(one)
    for _, same in sorted(kinds.items(), key=lambda item: item[0]):
        console.print()
        _show_kind(same, console)


def _show_kind(same: Sequence[Finding], console: Console) -> None:
    """Findings of one kind; equal ones at several places stand together, a common advice once."""
    places: dict[Finding, list[str]] = {}
    for one in same:
        places.setdefault(replace(one, where=""), []).append(one.where)
    shown = list(places.items())[:AT_MOST]
    advice = {one.mend for one, _ in shown}
    for place, (one, wheres) in enumerate(shown):
        last = place == len(shown) - 1
        _show_finding(
            one, wheres, console, with_mend=last or len(advice) > 1 or one.severity is Severity.STOP
        )
    if len(places) > AT_MOST:
        console.print(Text(f"and {len(places) - AT_MOST} more of {_WORD[same[0].severity]}[{same[0].kind}]"))


def _show_finding(one: Finding, wheres: Sequence[str], console: Console, *, with_mend: bool) -> None:
    where = "; ".join(map(visible, wheres[:AT_MOST]))
    if len(wheres) > AT_MOST:
        where += f"; and {len(wheres) - AT_MOST} more"
    kind = Text(f"{_WORD[one.severity]}[{visible(one.kind, 60)}]", style=_STYLE[one.severity])
    console.print(kind + Text(f": {where}", style="default"))
    if one.text:
        console.print(Padding(_wrapping(visible(one.text)), (0, 0, 0, 2)))
    for label, text in (
        ("found:", one.found),
        ("expected:", one.expected),
        ("mend:", one.mend if with_mend else ""),
    ):
        if text:
            line = Grid.grid()
            line.add_column(width=12, no_wrap=True)
            line.add_column(overflow="fold")
            line.add_row(f"  {label}", _wrapping(visible(text)))
            console.print(line)


def _wrapping(text: str) -> Text:
    return Text(text, overflow="fold")


def _show_catalyst(table: CatalystTable, console: Console) -> None:
    names = [crop(visible(name), LONGEST_NAME) for _, name in table.products]
    room = console.width - max(map(len, [*_LEVEL_HEAD, *names])) - _GROUP_WIDTH
    # the most spacious layout that needs no more blocks than the tightest
    layouts = []
    for aligned, gap in ((True, GAP), (False, GAP), (False, 1)):
        columns = [_column(table, level, aligned=aligned) for level in table.levels]
        layouts.append((columns, gap, _blocks([column.width + gap for column in columns], room)))
    columns, gap, blocks = min(layouts, key=lambda layout: len(layout[2]))
    console.print(Text(visible(table.catalyst, 200), style="bold"))
    for block in blocks:
        grid = _grid(gap)
        grid.add_column("\n".join(f"{'':{_GROUP_WIDTH}}{line}" for line in _LEVEL_HEAD), no_wrap=True)
        for column in block:
            grid.add_column(Text("\n".join(columns[column].head)), justify="right", no_wrap=True)
        above = None
        for row, (group, _) in enumerate(table.products):
            grid.add_row(
                Text.assemble((_group_label("" if group == above else group), "dim"), names[row]),
                *(Text(columns[column].cells[row]) for column in block),
            )
            above = group
        grid.add_row()
        grid.add_row(
            _group_label("") + "total FE", *(Text(columns[column].total) for column in block), style="bold"
        )
        grid.add_row(
            _group_label("") + "closure", *(_verdict(table.levels[column].closure) for column in block)
        )
        console.print(grid)
        if block is not blocks[-1]:
            console.print()
    for line in table.marks:
        console.print(Text(line, style="dim"))


GAP = 2  # blanks between two columns
_GROUP_WIDTH = 3  # the longest group of this trade has two characters, and a blank
_LEVEL_HEAD = ("level", "E vs RHE / V", "j / mA cm^-2", "runs")


def _grid(gap: int = GAP) -> Grid:
    # no edges, and padding on the right alone: every column costs its width and the gap
    return Grid(box=box.SIMPLE_HEAD, show_edge=False, padding=(0, gap - 1, 0, 0), pad_edge=False)


def _group_label(group: str) -> str:
    return f"{crop(visible(group), _GROUP_WIDTH - 1):{_GROUP_WIDTH}}"


@dataclass(frozen=True, slots=True)
class _Column:
    head: tuple[str, ...]
    cells: tuple[str, ...]
    total: str
    width: int


def _column(table: CatalystTable, level: Level, *, aligned: bool) -> _Column:
    cells = [level.efficiency.get(product, ABSENT) for _, product in table.products]
    if aligned:
        cells = _points_aligned(cells)
    head = (crop(visible(level.name), 12), level.potential, level.current_density, level.runs)
    width = max(map(len, [*cells, *head, level.total, level.closure]))
    return _Column(head, tuple(cells), level.total, width)


def _points_aligned(cells: Sequence[str]) -> list[str]:
    """Numbers padded so that their decimal points (or last digits) stand under one another."""
    whole = [cell.partition(".")[0].partition("(")[0].rstrip() for cell in cells]
    rest = [cell[len(first) :] for cell, first in zip(cells, whole, strict=True)]
    left, right = max(map(len, whole), default=0), max(map(len, rest), default=0)
    return [f"{first:>{left}}{last:<{right}}" for first, last in zip(whole, rest, strict=True)]


def _blocks(widths: Sequence[int], room: int) -> list[range]:
    """Columns cut into as few blocks as fit the room, of about equal number, never an empty one."""
    for count in range(1, len(widths) + 1):
        ends = [len(widths) * place // count for place in range(count + 1)]
        blocks = [range(first, last) for first, last in pairwise(ends)]
        if all(sum(widths[column] for column in block) <= room for block in blocks):
            return blocks
    return [range(column, column + 1) for column in range(len(widths))]


@dataclass(frozen=True, slots=True)
class _Figure:
    """A column of the table of runs; those of the highest ``luxury`` are first to go for want of room."""

    luxury: int
    head: str
    cells: tuple[str, ...]
    words: bool = False

    @property
    def width(self) -> int:
        return max(map(len, [*self.head.split("\n"), *self.cells]))


def _show_runs(runs: Sequence[Row], console: Console) -> None:
    figures = _fitting([one for one in _figures(runs) if set(one.cells) != {ABSENT}], console.width)
    grid = _grid()
    for figure in figures:
        grid.add_column(figure.head, justify="left" if figure.words else "right", no_wrap=True)
    above = runs[0]["catalyst"] if runs else None
    for place, run in enumerate(runs):
        if run["catalyst"] != above:
            grid.add_row()
            above = run["catalyst"]
        grid.add_row(
            *(
                _verdict(figure.cells[place]) if figure.words else Text(figure.cells[place])
                for figure in figures
            )
        )
    console.print(grid)


def _figures(runs: Sequence[Row]) -> list[_Figure]:
    def pair(head: str, spread: str) -> tuple[str, ...]:
        return tuple(
            _points_aligned([with_uncertainty(_float(row[head]), _float(row[spread])) for row in runs])
        )

    def alone(head: str, digits: int) -> tuple[str, ...]:
        return tuple(plain(_float(row[head]), digits) for row in runs)

    def percent(head: str) -> tuple[str, ...]:
        return tuple(fixed(_float(row[head]), 1) for row in runs)

    def words(head: str) -> tuple[str, ...]:
        return tuple(ABSENT if row[head] is None else crop(visible(str(row[head])), 16) for row in runs)

    return [
        _Figure(0, "\nrun", words("run"), True),
        _Figure(12, "\ncatalyst", words("catalyst"), True),
        _Figure(13, "\nelectrode", words("electrode"), True),
        _Figure(1, "E vs RHE\nV", pair("E vs RHE / V", "u(E vs RHE) / V")),
        _Figure(6, "j\nmA cm^-2", alone("j / mA cm^-2", 3)),
        _Figure(9, "charge\nC", alone("charge / C", 4)),
        _Figure(7, "H2 FE\n%", percent("H2 FE / %")),
        _Figure(8, "C1 FE\n%", percent("C1 FE / %")),
        _Figure(4, "C2+ FE\n%", pair("C2+ FE / %", "u(C2+ FE) / %")),
        _Figure(5, "\nC2+/C1", pair("C2+/C1", "u(C2+/C1)")),
        _Figure(10, "CO2 used\n%", percent("CO2 conversion / %")),
        _Figure(11, "\nroughness", pair("roughness factor", "u(roughness factor)")),
        _Figure(2, "total FE\n%", pair("total FE / %", "u(total FE) / %")),
        _Figure(3, "\nclosure", words("closure"), True),
    ]


_NEVER_GIVEN_UP = 3


def _fitting(figures: Sequence[_Figure], room: int) -> list[_Figure]:
    """The figures that fit, in the order they were listed."""
    kept = list(figures)
    while sum(one.width + GAP for one in kept) - GAP > room:
        dearest = max(kept, key=lambda one: one.luxury, default=None)
        if dearest is None or dearest.luxury <= _NEVER_GIVEN_UP:
            break
        kept.remove(dearest)
    return kept


def _verdict(word: str) -> Text:
    return Text(word, style=_CLOSURE_STYLE.get(word, ""))


def _float(cell: object) -> float | None:
    return float(cell) if isinstance(cell, int | float) else None


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
