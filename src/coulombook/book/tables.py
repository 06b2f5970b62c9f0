"""The book: everything a tally produced, as plain tables that every output medium shares.

A table is columns of Python or numpy values under heads `quantity / unit`; media (CSV, terminal, frames) only
show it. pandas is imported when a frame is first asked for.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from coulombook.findings import Finding

if TYPE_CHECKING:
    import pandas as pd

    from coulombook.balance.settle import Settled
    from coulombook.balance.trace_picture import TracePicture

Cell = str | float | int | None

# The heads of every table, in the order of the files: the contract with readers of the results.
LEDGER = (
    "run", "catalyst", "electrode", "level", "E vs RHE / V", "product", "group", "phase", "electrons",
    "amount / umol", "FE / %", "u(FE) / %", "j / mA cm^-2", "u(j) / mA cm^-2", "j real / mA cm^-2",
    "u(j real) / mA cm^-2", "FE limit / %", "status",
)  # fmt: skip
SUMMARY = (
    "run", "catalyst", "electrode", "level", "E vs RHE / V", "u(E vs RHE) / V", "charge / C", "j / mA cm^-2",
    "total FE / %", "u(total FE) / %", "H2 FE / %", "C1 FE / %", "C2+ FE / %", "u(C2+ FE) / %", "C2+/C1",
    "u(C2+/C1)", "C2+/C1 molar", "roughness factor", "u(roughness factor)", "CO2 conversion / %", "closure",
)  # fmt: skip
INJECTIONS = (
    "run", "injection", "time / s", "product", "mole fraction / ppm", "outlet flow / umol/s", "current / mA",
    "FE / %", "u(FE) / %", "used",
)  # fmt: skip
SERIES = (
    "catalyst", "level", "E vs RHE / V", "product", "runs", "FE / %", "s(FE) / %", "u(FE) / %", "j / mA cm^-2",
    "u(j) / mA cm^-2", "j real / mA cm^-2", "u(j real) / mA cm^-2",
)  # fmt: skip
SURFACE = (
    "electrode", "capacitance / mF", "u(capacitance) / mF", "roughness factor", "u(roughness factor)",
    "linearity", "exponent", "purpose", "u(exponent)", "form", "capacitance by window / mF",
    "capacitance by charge / mF", "capacitance by Brug / mF", "capacitance by Hsu-Mansfeld / mF",
)  # fmt: skip
SPECTRA = (
    "file", "run", "electrode", "purpose", "points", "resistance / ohm", "u(resistance) / ohm",
    "charge transfer / ohm", "u(charge transfer) / ohm", "constant phase / F s^(a-1)", "u(constant phase) / F s^(a-1)",
    "exponent", "u(exponent)", "capacitance by Brug / mF", "capacitance by Hsu-Mansfeld / mF", "misfit / %",
    "Kramers-Kronig residual / %", "Kramers-Kronig",
)  # fmt: skip
CALIBRATIONS = (
    "calibration", "channel", "analyte", "form", "weights", "points", "a0", "u(a0)", "a1", "u(a1)", "a2", "u(a2)",
    "residual sd", "lack of fit p", "detection limit / ppm", "quantification limit / ppm", "lowest / ppm",
    "highest / ppm",
)  # fmt: skip
BUDGET = ("run", "output", "source", "shared", "u / %", "share / %")
CLOSURE = (
    "run", "total FE / %", "u(total FE) / %", "deviation / u", "closure", "chi-square", "degrees of freedom", "p",
)  # fmt: skip
EXPLANATIONS = (
    "rank", "cause", "where", "estimate / %", "u(estimate) / %", "evidence", "told apart", "bench test",
)  # fmt: skip
INTERVALS = (
    "run", "output", "value / %", "u / %", "u(draws) / %", "low / %", "high / %", "propagation",
)  # fmt: skip
RECONCILIATION = (
    "run", "product", "FE / %", "u(FE) / %", "adjusted FE / %", "u(adjusted FE) / %", "z",
)  # fmt: skip
CARBON = (
    "run", "CO2 conversion / %", "u(CO2 conversion) / %", "carbonate bound / %", "total FE at inlet flow / %",
    "total FE at outlet flow / %", "outlet flow by",
)  # fmt: skip
EFFICIENCIES = (
    "run", "product", "carbon efficiency / %", "u(carbon efficiency) / %", "share of converted CO2 / %",
    "u(share of converted CO2) / %", "E equilibrium vs RHE / V", "cathodic energy efficiency / %",
    "u(cathodic energy efficiency) / %", "full-cell energy efficiency / %", "u(full-cell energy efficiency) / %",
)  # fmt: skip
CAUTIONS = (
    "substance", "highest / ppm", "run", "injection", "lower flammable limit / %", "of flammable limit / %",
    "exposure limit / ppm", "times exposure limit", "ceiling / ppm", "dangerous / ppm",
)  # fmt: skip
KINETICS = (
    "catalyst", "product", "basis", "runs", "levels", "straight levels", "range", "from E vs RHE / V",
    "to E vs RHE / V", "Tafel slope / mV", "u(Tafel slope) / mV", "Tafel slope low / mV", "Tafel slope high / mV",
    "p of bend", "verdict", "onset j / mA cm^-2", "E onset vs RHE / V", "u(E onset) / V", "onset",
)  # fmt: skip
STABILITY = (
    "run", "product", "quantity", "injections", "span / h", "charge / C", "start", "mean", "u(mean)", "drift / h^-1",
    "u(drift) / h^-1", "drift low / h^-1", "drift high / h^-1", "p", "time to 80 % / h", "earliest / h", "latest / h",
    "verdict",
)  # fmt: skip
FINDINGS = ("severity", "kind", "where", "text", "mend")

TABLES: Mapping[str, tuple[str, ...]] = {
    "ledger": LEDGER,
    "summary": SUMMARY,
    "injections": INJECTIONS,
    "series": SERIES,
    "surface": SURFACE,
    "spectra": SPECTRA,
    "calibrations": CALIBRATIONS,
    "budget": BUDGET,
    "closure": CLOSURE,
    "explanations": EXPLANATIONS,
    "intervals": INTERVALS,
    "reconciliation": RECONCILIATION,
    "carbon": CARBON,
    "efficiencies": EFFICIENCIES,
    "cautions": CAUTIONS,
    "kinetics": KINETICS,
    "stability": STABILITY,
    "findings": FINDINGS,
}


@dataclass(frozen=True, slots=True, eq=False)
class Table:
    """Rows under heads; an absent value is None (a NaN is turned into None when a row is added)."""

    name: str
    heads: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]

    @classmethod
    def of(cls, name: str, rows: Iterable[Mapping[str, Cell]]) -> Table:
        """Table ``name`` of `TABLES` from rows keyed by head; a head that a row lacks is absent there.

        Raises KeyError when a row holds a head the table does not have.
        """
        return cls.under(name, TABLES[name], rows)

    @classmethod
    def under(cls, name: str, heads: tuple[str, ...], rows: Iterable[Mapping[str, Cell]]) -> Table:
        """A table under heads of its own; otherwise like `of`."""
        known = set(heads)
        cells = []
        for row in rows:
            if not row.keys() <= known:
                raise KeyError(f"table {name} has no head {sorted(row.keys() - known)}")
            cells.append(tuple(map(_absent, map(row.get, heads))))
        return cls(name, heads, tuple(cells))

    def __len__(self) -> int:
        return len(self.rows)

    def column(self, head: str) -> list[Cell]:
        """All cells under one head."""
        place = self.heads.index(head)
        return [row[place] for row in self.rows]

    def records(self) -> Iterator[dict[str, Cell]]:
        """Each row as a dict keyed by head."""
        for row in self.rows:
            yield dict(zip(self.heads, row, strict=True))

    def frame(self) -> pd.DataFrame:
        """The table as a pandas frame; absent numbers are NaN."""
        import pandas as pd

        frame = pd.DataFrame.from_records(list(self.rows), columns=list(self.heads))
        # a column without any value would otherwise hold None, with which nothing can be computed
        empty = [head for head in self.heads if len(frame) and frame[head].isna().all()]
        return frame.astype(dict.fromkeys(empty, float))

    def _repr_html_(self) -> str:
        from coulombook.book.display import table_html

        return table_html(self)


def _absent(cell: Cell) -> Cell:
    # NaN alone differs from itself
    return None if cell != cell else cell


@dataclass(frozen=True, slots=True, eq=False)
class InputFile:
    """A file that was read, with its SHA-256 as it was then."""

    path: str  # relative to the day folder, or calibrations/<name>/... for a calibration
    sha256: str
    size_byte: int


@dataclass(frozen=True, slots=True, eq=False)
class Book:
    """Everything a tally produced.

    The attributes `ledger`, `summary`, `injections`, `series`, `surface` and `calibrations` are pandas frames;
    `tables` holds the same as plain `Table` records. What they were computed from is in ``settled``, with the logs as
    they are drawn in ``pictures``, in the order of the runs; a book without them shows its tables alone.
    """

    day: str
    title: str
    tables: Mapping[str, Table]
    findings: tuple[Finding, ...]
    inputs: tuple[InputFile, ...]
    options: Mapping[str, str]
    settled: Settled | None = None
    pictures: tuple[TracePicture, ...] = ()

    def _repr_html_(self) -> str:
        from coulombook.book.display import book_html

        return book_html(self)

    @property
    def ledger(self) -> pd.DataFrame:
        """Run x product: amount, FE, partial current density."""
        return self.tables["ledger"].frame()

    @property
    def summary(self) -> pd.DataFrame:
        """One row per run: charge, totals, C2+/C1, closure."""
        return self.tables["summary"].frame()

    @property
    def injections(self) -> pd.DataFrame:
        """One row per gas injection and product."""
        return self.tables["injections"].frame()

    @property
    def series(self) -> pd.DataFrame:
        """Catalyst x level x product, replicates pooled."""
        return self.tables["series"].frame()

    @property
    def surface(self) -> pd.DataFrame:
        """One row per electrode with scans."""
        return self.tables["surface"].frame()

    @property
    def calibrations(self) -> pd.DataFrame:
        """One row per curve used."""
        return self.tables["calibrations"].frame()
