"""What the charts show: for each catalyst, FE and partial current densities of every product against potential."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from coulombook.book import Cell
from coulombook.report.workbook.cells import FIRST_ROW, Sheet
from coulombook.report.workbook.place import Account

MOST_CATALYSTS = 20  # more charts than that nobody reads
_FE, _J = "FE / %", "j / mA cm^-2"
_DRAWN = {_FE: "u(FE) / %", _J: "u(j) / mA cm^-2"}  # with the uncertainties that decide their digits


@dataclass(frozen=True, slots=True, eq=False)
class Series:
    """One product in one chart: cells of its name, of the potentials and of its values, as formulas name them."""

    product: str
    name: str
    potentials: str
    heights: str


@dataclass(frozen=True, slots=True, eq=False)
class Chart:
    """One chart of one catalyst, whose name stands in the cell ``title``.

    FE as ``stacked`` columns, or partial current densities as lines on a logarithmic axis.
    """

    title: str
    stacked: bool
    series: tuple[Series, ...]


def chart_data(account: Account, series: Sheet) -> tuple[Sheet, list[Chart]]:
    """The sheet that the charts are drawn from, and the charts.

    One row per catalyst and level, by potential; one column per product, for FE and for partial current densities.
    """
    table = account.tables["series"]
    columns = {
        head: table.column(head)
        for head in ("catalyst", "level", "product", "E vs RHE / V", *_DRAWN.values(), *_DRAWN)
    }
    points: dict[tuple[str, str], dict[str, int]] = {}
    for row, key in enumerate(zip(columns["catalyst"], columns["level"], columns["product"], strict=True)):
        points.setdefault((str(key[0]), str(key[1])), {})[str(key[2])] = row
    catalysts = {name: place for place, name in enumerate(dict.fromkeys(one for one, _ in points))}

    def order(key: tuple[str, str]) -> tuple[int, float]:
        potential = columns["E vs RHE / V"][min(points[key].values())]
        return catalysts[key[0]], -potential if isinstance(potential, float) else 0.0

    keys = sorted(points, key=order)
    products = list(dict.fromkeys(map(str, columns["product"])))
    sheet = Sheet(
        "chart data",
        "What the charts are drawn from",
        "The series again, one column per product; a chart on a logarithmic axis leaves out what is not above zero.",
        len(keys),
        frozen=3,
        parted="catalyst",
    )
    sheet.text("catalyst", [catalyst for catalyst, _ in keys])
    sheet.text("level", [level for _, level in keys])
    first = [min(points[key].values()) for key in keys]
    sheet.formula(
        "E vs RHE / V",
        (f"={series['E vs RHE / V']}{FIRST_ROW + row}" for row in first),
        [columns["E vs RHE / V"][row] for row in first],
        "of the series",
    )
    for head in _DRAWN:
        for product in products:
            rows = [points[key].get(product) for key in keys]
            shown = [None if row is None or not _drawn(columns[head][row], head) else row for row in rows]
            sheet.formula(
                f"{product}: {head}",
                (None if row is None else f"={series[head]}{FIRST_ROW + row}" for row in shown),
                [None if row is None else columns[head][row] for row in shown],
                "of the series",
                u=[None if row is None else columns[_DRAWN[head]][row] for row in shown],
            )
    # a name given as a cell and not as text: text of the files must not be taken for a formula
    names = {
        product: f"={series.quoted}!${series.letters['product']}${FIRST_ROW + columns['product'].index(product)}"
        for product in products
    }
    return sheet, _charts(sheet, [catalyst for catalyst, _ in keys], names)


def _drawn(value: Cell, head: str) -> bool:
    return head == _FE or (isinstance(value, float) and value > 0.0)


def _charts(sheet: Sheet, catalysts: Sequence[str], names: Mapping[str, str]) -> list[Chart]:
    charts = []
    for catalyst in list(dict.fromkeys(catalysts))[:MOST_CATALYSTS]:
        held = [row for row, name in enumerate(catalysts) if name == catalyst]
        first, stop = held[0], held[-1] + 1
        for head in _DRAWN:
            series = tuple(
                Series(
                    product,
                    name,
                    _absolute(sheet, "E vs RHE / V", first, stop),
                    _absolute(sheet, f"{product}: {head}", first, stop),
                )
                for product, name in names.items()
                if any(value is not None for value in _values(sheet, f"{product}: {head}")[first:stop])
            )
            if series:  # where nothing is above zero a logarithmic axis has nothing to show
                charts.append(Chart(_absolute(sheet, "catalyst", first, first + 1), head == _FE, series))
    return charts


def _values(sheet: Sheet, head: str) -> Sequence[Cell]:
    return next(column.values for column in sheet.columns if column.head == head)


def _absolute(sheet: Sheet, head: str, first: int, stop: int) -> str:
    letter = sheet.letters[head]
    cell = f"={sheet.quoted}!${letter}${FIRST_ROW + first}"
    return cell if stop - first == 1 else f"{cell}:${letter}${FIRST_ROW + stop - 1}"
