"""The two tables of a day on the terminal: Faradaic efficiency against potential, and how each run closes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from rich.console import Console
from rich.text import Text

from coulombook.prose.numbers import ABSENT, fixed, plain, with_uncertainty
from coulombook.prose.text import crop, visible
from coulombook.report.grid import GAP, Column, grid
from coulombook.report.pivot import CatalystTable, Level, Row

LONGEST_NAME = 24
LONGEST_LEVEL = 12
LONGEST_RUN = 16

_GROUP_WIDTH = 3  # the longest group of this trade has two characters, and a blank
_LEVEL_HEAD = ("level", "E vs RHE / V", "j / mA cm^-2", "runs")
_CLOSURE_STYLE = {"closed": "green", "short": "yellow", "over": "yellow"}


def show_catalyst(table: CatalystTable, console: Console) -> None:
    """Print Faradaic efficiencies of one catalyst: products down, levels across, in blocks where need be."""
    labels = _labels(table)
    room = console.width - labels.width
    # the most spacious layout that needs no more blocks than the tightest
    layouts = []
    for aligned, gap in ((True, GAP), (False, GAP), (False, 1)):
        columns = [_level_column(table, level, aligned=aligned) for level in table.levels]
        layouts.append((columns, gap, _blocks([column.width + gap for column in columns], room)))
    columns, gap, blocks = min(layouts, key=lambda layout: len(layout[2]))
    console.print(Text(visible(table.catalyst, 200), style="bold"))
    for block in blocks:
        if block is not blocks[0]:
            console.print()
        _print(grid([labels, *(columns[one] for one in block)], rule=_rule(console), gap=gap), console)
    for line in table.marks:
        console.print(Text(line, style="dim"))


def show_runs(runs: Sequence[Row], console: Console) -> None:
    """Print one line per run, with as many of its figures as the width allows."""
    signs = _LETTERS if console.options.ascii_only else _SHADES
    figures = [one for one in _figures(runs, signs) if set(one.column.cells) != {ABSENT}]
    columns = [_parted(one.column, runs) for one in _fitting(figures, console.width)]
    console.print(Text("runs", style="bold"))
    if columns:
        _print(grid(columns, rule=_rule(console)), console)


def _print(text: Text, console: Console) -> None:
    # a terminal narrower than one column wraps the lines itself, and nothing is lost
    console.print(text, soft_wrap=True)


def _rule(console: Console) -> str:
    return "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"


def _labels(table: CatalystTable) -> Column:
    rows, above = [], None
    for group, product in table.products:
        rows.append(_labelled("" if group == above else group, crop(visible(product), LONGEST_NAME)))
        above = group
    head = tuple(_labelled("", line) for line in _LEVEL_HEAD)
    return Column(
        head, (*rows, "", _labelled("", "total FE"), _labelled("", "closure")), True, {len(rows) + 1: "bold"}
    )


def _labelled(group: str, text: str) -> str:
    return f"{crop(visible(group), _GROUP_WIDTH - 1):{_GROUP_WIDTH}}{text}"


def _level_column(table: CatalystTable, level: Level, *, aligned: bool) -> Column:
    cells = [level.efficiency.get(product, ABSENT) for _, product in table.products]
    if aligned:
        cells = points_aligned(cells)
    head = (crop(visible(level.name), LONGEST_LEVEL), level.potential, level.current_density, level.runs)
    styles = {len(cells) + 1: "bold", len(cells) + 2: _CLOSURE_STYLE.get(level.closure, "")}
    return Column(head, (*cells, "", level.total, visible(level.closure, LONGEST_LEVEL)), styles=styles)


def points_aligned(cells: Sequence[str]) -> list[str]:
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

    luxury: float
    column: Column


BAR = 16  # columns that stand for 100 %
_SHADES = "\N{LIGHT SHADE}\N{MEDIUM SHADE}\N{FULL BLOCK}"  # of hydrogen, C1, C2+; within code page 437
_LETTERS = "hc#"  # of the same, where a terminal has no shades

_NEVER_GIVEN_UP = 3  # the luxury of closure


def charge_bar(shares: Sequence[float | None], signs: str) -> str:
    """What the charge became, as a bar of `BAR` columns for 100 %: what is missing stays blank, what is over is cut.

    >>> charge_bar([50.0, 25.0, 12.5], "hc#"), charge_bar([None, 60.0, 60.0], "hc#"), charge_bar([-1.0, 0, 3.2], "hc#")
    ('hhhhhhhhcccc##  ', 'cccccccccc######', '#               ')
    """
    if all(share is None for share in shares):
        return ABSENT
    bar, reached = "", 0.0
    for share, sign in zip(shares, signs, strict=True):
        reached += max(share or 0.0, 0.0)
        bar += sign * (round(min(reached / 100.0, 1.0) * BAR) - len(bar))
    return bar.ljust(BAR)


def _figures(runs: Sequence[Row], signs: str) -> list[_Figure]:
    def pair(head: str, spread: str) -> list[str]:
        return points_aligned([with_uncertainty(_float(row[head]), _float(row[spread])) for row in runs])

    def alone(head: str, digits: int) -> list[str]:
        return [plain(_float(row[head]), digits) for row in runs]

    def percent(head: str) -> list[str]:
        return [fixed(_float(row[head]), 1) for row in runs]

    def words(head: str) -> list[str]:
        return [ABSENT if row[head] is None else crop(visible(str(row[head])), LONGEST_RUN) for row in runs]

    groups = ("H2 FE / %", "C1 FE / %", "C2+ FE / %")
    bars = [charge_bar([_float(row[head]) for head in groups], signs) for row in runs]
    closure = words("closure")
    verdicts = {place: _CLOSURE_STYLE.get(word, "") for place, word in enumerate(closure)}
    return [
        _Figure(0, Column(("", "run"), tuple(words("run")), True)),
        _Figure(12, Column(("", "catalyst"), tuple(words("catalyst")), True)),
        _Figure(13, Column(("", "electrode"), tuple(words("electrode")), True)),
        _Figure(1, Column(("E vs RHE", "V"), tuple(pair("E vs RHE / V", "u(E vs RHE) / V")))),
        _Figure(5.5, Column(("charge went to", "{} H2 {} C1 {} C2+".format(*signs)), tuple(bars), True)),
        _Figure(6, Column(("j", "mA cm^-2"), tuple(alone("j / mA cm^-2", 3)))),
        _Figure(9, Column(("charge", "C"), tuple(alone("charge / C", 4)))),
        _Figure(7, Column(("H2 FE", "%"), tuple(percent("H2 FE / %")))),
        _Figure(8, Column(("C1 FE", "%"), tuple(percent("C1 FE / %")))),
        _Figure(4, Column(("C2+ FE", "%"), tuple(pair("C2+ FE / %", "u(C2+ FE) / %")))),
        _Figure(5, Column(("", "C2+/C1"), tuple(pair("C2+/C1", "u(C2+/C1)")))),
        _Figure(10, Column(("CO2 used", "%"), tuple(percent("CO2 conversion / %")))),
        _Figure(11, Column(("", "roughness"), tuple(pair("roughness factor", "u(roughness factor)")))),
        _Figure(2, Column(("total FE", "%"), tuple(pair("total FE / %", "u(total FE) / %")))),
        _Figure(3, Column(("", "closure"), tuple(closure), True, verdicts)),
    ]


def _fitting(figures: Sequence[_Figure], room: int) -> list[_Figure]:
    """The figures that fit, in the order they were listed."""
    kept = list(figures)
    while sum(one.column.width + GAP for one in kept) - GAP > room:
        dearest = max(kept, key=lambda one: one.luxury)
        if dearest.luxury <= _NEVER_GIVEN_UP:
            break
        kept.remove(dearest)
    return kept


def _parted(column: Column, runs: Sequence[Row]) -> Column:
    """The column with an empty row wherever the catalyst changes."""
    cells: list[str] = []
    styles = {}
    for place, run in enumerate(runs):
        if place and run["catalyst"] != runs[place - 1]["catalyst"]:
            cells.append("")
        styles[len(cells)] = column.styles.get(place, "")
        cells.append(column.cells[place])
    return Column(column.head, tuple(cells), column.words, styles)


def _float(cell: object) -> float | None:
    return float(cell) if isinstance(cell, int | float) else None
