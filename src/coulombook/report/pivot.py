"""Faradaic efficiency against potential, one table per catalyst: levels across, products down.

Levels go across because a day has more products than levels, so that the table of a usual day fits a
terminal of 80 columns. Every cell is text by `prose.numbers`; nothing is computed here, only selected:
where the runs of a level differ in a figure that the series does not pool (total, current density), the
smallest and largest stand.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from coulombook.book import Book, Cell
from coulombook.prose.numbers import ABSENT, between, fixed, plain, with_uncertainty
from coulombook.species import group_rank

OUTSIDE_MARK = "*"
NOT_DETECTED = "nd"
LEGEND = {
    OUTSIDE_MARK: f"{OUTSIDE_MARK} outside the calibrated range in one run or more",
    NOT_DETECTED: f"{NOT_DETECTED} below detection, and in no total",
    "<": "< below this detection limit, and in no total",
}


@dataclass(frozen=True, slots=True)
class Level:
    """One column: a level of a catalyst, its runs pooled."""

    name: str
    potential: str  # E vs RHE / V
    current_density: str  # mA cm^-2
    runs: str
    efficiency: Mapping[str, str]  # product -> FE / %
    total: str
    closure: str


@dataclass(frozen=True, slots=True)
class CatalystTable:
    """Faradaic efficiencies of one catalyst, in per cent, levels from the least negative potential on."""

    catalyst: str
    products: tuple[tuple[str, str], ...]  # group, product: hydrogen first, then by carbon number
    levels: tuple[Level, ...]

    @property
    def marks(self) -> tuple[str, ...]:
        """Lines that explain the marks in the cells, those used only."""
        cells = "".join(cell for level in self.levels for cell in level.efficiency.values())
        return tuple(text for mark, text in LEGEND.items() if mark in cells)


Row = Mapping[str, Cell]


def catalyst_tables(book: Book) -> tuple[CatalystTable, ...]:
    """The tables of a book, catalysts in the order of the summary."""
    series, summary, ledger = (list(book.tables[name].records()) for name in ("series", "summary", "ledger"))
    group = {row["product"]: str(row["group"] or "") for row in ledger}
    # one order for every catalyst, so that the tables can be compared line by line
    order = {name: place for place, name in enumerate(sorted(group, key=lambda one: group_rank(group[one])))}
    pooled = _gathered(series, "catalyst")
    status = _gathered(ledger, "catalyst", "level", "product")
    tables = []
    for (catalyst,), runs in _gathered(summary, "catalyst").items():
        rows = pooled.get((catalyst,), [])
        of_level, products = _gathered(rows, "level"), _gathered(rows, "product")
        levels = [
            _level(
                name,
                of_level.get((name,), []),
                level_runs,
                {row["product"]: status.get((catalyst, name, row["product"]), []) for row in rows},
            )
            for (name,), level_runs in _gathered(sorted(runs, key=_least_negative_first), "level").items()
        ]
        tables.append(
            CatalystTable(
                _text(catalyst),
                tuple(
                    (group.get(one, ""), _text(one))
                    for (one,) in sorted(products, key=lambda key: order.get(key[0], len(order)))
                ),
                tuple(levels),
            )
        )
    return tuple(tables)


def _level(
    name: Cell, rows: Sequence[Row], runs: Sequence[Row], readings: Mapping[Cell, Sequence[Row]]
) -> Level:
    potentials = [row["E vs RHE / V"] for row in [*rows, *runs]]
    closures = [_text(row["closure"]) for row in runs if row["closure"] is not None]
    return Level(
        _text(name),
        fixed(_number(potentials[0]), 3),
        _extremes([plain(_number(row["j / mA cm^-2"]), 3) for row in _ordered(runs, "j / mA cm^-2")]),
        str(len(runs)),
        {_text(row["product"]): _efficiency(row, readings.get(row["product"], [])) for row in rows},
        _total(runs),
        _closure(closures),
    )


def _efficiency(pooled: Row, readings: Sequence[Row]) -> str:
    status = {row["status"] for row in readings}
    if status == {"below detection"}:
        limits = [limit for row in readings if (limit := _number(row["FE limit / %"])) is not None]
        return f"<{plain(max(limits), 2)}" if limits else NOT_DETECTED
    shown = with_uncertainty(_number(pooled["FE / %"]), _number(pooled["u(FE) / %"]))
    return shown + (OUTSIDE_MARK if status & {"above calibration", "below calibration"} else "")


def _total(runs: Sequence[Row]) -> str:
    ordered = _ordered(runs, "total FE / %")
    if len(ordered) == 1:
        return with_uncertainty(_number(ordered[0]["total FE / %"]), _number(ordered[0]["u(total FE) / %"]))
    return _extremes([fixed(_number(row["total FE / %"]), 1) for row in ordered])


def _closure(words: Sequence[str]) -> str:
    if len(set(words)) <= 1:
        return words[0] if words else ABSENT
    return f"{words.count('closed')}/{len(words)} closed"


def _extremes(ordered: Sequence[str]) -> str:
    return between(ordered[0], ordered[-1]) if ordered else ABSENT


def _ordered(rows: Sequence[Row], head: str) -> list[Row]:
    return sorted(
        (row for row in rows if _number(row[head]) is not None), key=lambda row: _number(row[head]) or 0.0
    )


def _gathered(rows: Iterable[Row], *heads: str) -> dict[tuple[Cell, ...], list[Row]]:
    """Rows by their cells under some heads, in the order those first come up."""
    gathered: dict[tuple[Cell, ...], list[Row]] = {}
    for row in rows:
        gathered.setdefault(tuple(row[head] for head in heads), []).append(row)
    return gathered


def _least_negative_first(row: Row) -> float:
    potential = _number(row["E vs RHE / V"])
    return float("inf") if potential is None else -potential


def _number(cell: Cell) -> float | None:
    return None if cell is None or isinstance(cell, str) else float(cell)


def _text(cell: Cell) -> str:
    return ABSENT if cell is None else str(cell)
