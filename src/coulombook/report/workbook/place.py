"""What every sheet needs of the day: its account, and where in the files a record stands."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.book import Cell, Table
from coulombook.findings import RowOrigin
from coulombook.report.workbook.cells import Sheet
from coulombook.uncertainty.linearised import Number, nominal, standard_uncertainty

CM2 = 1e4  # from m^2
ML = 1e6  # from m^3
KPA = 1e-3  # from Pa
ML_PER_MIN = 6e7  # from m^3/s
MICROFARAD_PER_CM2 = 100.0  # from F/m^2


@dataclass(frozen=True, eq=False)
class Account:
    """A settled day with its tables."""

    settled: Settled
    tables: Mapping[str, Table]

    @property
    def x(self) -> Mapping[str, FloatArray]:
        """The inputs of the measurement function as they were read, without their errors."""
        return self.settled.inputs.nominal

    @cached_property
    def runs(self) -> tuple[str, ...]:
        """Names of the runs."""
        return tuple(run.name for run in self.settled.plan.runs)

    def column(self, table: str, head: str) -> list[Cell]:
        """A column of the tables as they are written beside the workbook."""
        return self.tables[table].column(head)


def found_in(sheet: Sheet, origins: Iterable[RowOrigin | None]) -> None:
    """Add the columns that say where each record was read from."""
    places = list(origins)
    sheet.text("file", ["" if one is None else _file(one) for one in places], "where it was read")
    sheet.text("row", [None if one is None else one.row for one in places], "heads are row 1")


def _file(origin: RowOrigin) -> str:
    return origin.file if origin.sheet is None else f"{origin.file}, sheet {origin.sheet}"


def values(x: Number, unit: float = 1.0) -> FloatArray:
    """Numbers without their errors, in the unit of the page."""
    return nominal(x) * unit


def spreads(x: Number, unit: float = 1.0) -> list[Cell]:
    """Their standard uncertainties."""
    found: list[Cell] = (standard_uncertainty(x) * unit).tolist()
    return found


def picked(cells: Sequence[Cell], places: Iterable[int]) -> list[Cell]:
    """Those at some places."""
    return [cells[place] for place in places]


def any_finite(array: FloatArray) -> bool:
    """Whether there is anything in a column that may be empty."""
    return bool(np.isfinite(array).any())


def runs_of(index: Sequence[int] | Any, groups: int) -> list[tuple[int, int]]:
    """First and one-past-last record of each group of records that are sorted by group."""
    places = np.asarray(index)
    starts = np.searchsorted(places, np.arange(groups))
    stops = np.searchsorted(places, np.arange(groups), side="right")
    return list(zip(starts.tolist(), stops.tolist(), strict=True))


def yes_no(flags: Iterable[Any]) -> list[str]:
    """Flags in words."""
    return ["yes" if flag else "no" for flag in flags]
