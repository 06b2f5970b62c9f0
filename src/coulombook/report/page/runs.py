"""Each run by itself, folded: its log, its readings, what they came to, and where the uncertainty comes from."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import TypedDict

import numpy as np

from coulombook.balance.settle import Settled
from coulombook.book import Book, Cell
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.tables import Column, Datum, book_table, number_datum, show_table, text_datum
from coulombook.report.page.traces import show_trace
from coulombook.report.page.words import bare, measured, number_of, to_decimals
from coulombook.uncertainty.linearised import FloatArray, nominal, standard_uncertainty

MOST_RUNS = 120  # shown with all their readings; a page of more would be slow to open
_LEAST_SHARE = 0.5  # per cent of the variance of some output, below which a source is left to budget.csv
_MOST = 25.0  # per cent, from which on a source stands out
Row = Mapping[str, Cell]


def show_runs(book: Book) -> Html:
    """One folded part per run, in the order of the summary."""
    summary = list(book.tables["summary"].records())
    shown = summary[:MOST_RUNS]
    parts = _Parts(book)
    left = len(summary) - len(shown)
    return join(
        [_show_run(book, row, parts) for row in shown],
        element("p", f"The other {left} runs stand in the tables of the results folder.") if left else None,
    )


class _Like(TypedDict):
    like: str
    titled: bool


class _Parts:
    """Rows of the tables by run, gathered once, and the liquid readings."""

    def __init__(self, book: Book) -> None:
        self._rows = {
            name: _by_run(book.tables[name].records())
            for name in ("ledger", "injections", "budget")
            if name in book.tables
        }
        self._kinds: dict[str, int] = {}
        self.liquid = _Liquid(book.settled) if book.settled is not None else None

    def like(self, kind: str) -> _Like:
        """The first table of a kind says what its heads mean."""
        self._kinds[kind] = self._kinds.get(kind, 0) + 1
        return {"like": kind, "titled": self._kinds[kind] == 1}

    def of(self, table: str, run: str) -> list[Row]:
        """Rows of a run."""
        return self._rows.get(table, {}).get(run, [])


def _by_run(rows: Iterable[Row]) -> dict[str, list[Row]]:
    found: dict[str, list[Row]] = {}
    for row in rows:
        found.setdefault(str(row["run"]), []).append(row)
    return found


def _show_run(book: Book, row: Row, parts: _Parts) -> Html:
    run = str(row["run"])
    closure = str(row["closure"] or "")
    of_run = [
        show_trace(book, run),
        _heading("Products", book_table(
            book.tables["ledger"], "", rows=parts.of("ledger", run), name=f"products of run {run}",
            leave_out=("run", "catalyst", "electrode", "level", "E vs RHE / V", "electrons"), **parts.like("products"),
        )),
        _heading("Gas readings", book_table(
            book.tables["injections"], "", rows=parts.of("injections", run), name=f"gas readings of run {run}",
            leave_out=("run",), **parts.like("gas"),
        )),
        _heading("Liquid readings", parts.liquid.show(run, **parts.like("liquid")) if parts.liquid else None),
        _heading("Where the uncertainty comes from", _budget(run, parts.of("budget", run))),
    ]  # fmt: skip
    return element(
        "details",
        element(
            "summary",
            element("span", run, class_="run"),
            element("span", str(row["catalyst"] or ""), class_="catalyst"),
            element("span", f"{to_decimals(number_of(row['E vs RHE / V']), 3)} V", class_="n"),
            element("span", f"{bare(number_of(row['j / mA cm^-2']), 3)} mA cm⁻²", class_="n"),
            element(
                "span",
                f"{measured(number_of(row['total FE / %']), number_of(row['u(total FE) / %']))} %",
                class_="n",
            ),
            element("span", closure, class_=f"closure {closure}"),
        ),
        of_run if any(of_run) else element("p", "Nothing more is known of it."),
        class_="run",
    )


def _heading(title: str, content: Html | None) -> Html | None:
    return None if content is None else join(element("h3", title), content)


class _Liquid:
    """Concentrations of the vials, as the account has them."""

    def __init__(self, settled: Settled) -> None:
        self._plan = settled.plan
        liquid = settled.plan.liquid
        self._value: FloatArray = nominal(settled.liquids.concentration_mol_per_m3)
        self._u: FloatArray = standard_uncertainty(settled.liquids.concentration_mol_per_m3)
        self._of_run: dict[str, list[int]] = {}
        for number, vial in enumerate(liquid.analyte_vial.tolist()):
            run = liquid.vials[vial].run
            if run is not None and not liquid.vials[vial].blank:
                self._of_run.setdefault(run, []).append(number)
        self._signals: dict[int, list[str]] = {}
        for signal, number in zip(liquid.signals, liquid.signal_analyte.tolist(), strict=True):
            self._signals.setdefault(number, []).append(signal.signal)

    def show(self, run: str, like: str, titled: bool) -> Html | None:
        """The readings of a run's vials, blanks taken off."""
        numbers = self._of_run.get(run, [])
        if not numbers:
            return None
        liquid = self._plan.liquid
        vials = [liquid.vials[liquid.analyte_vial[number]] for number in numbers]
        # mol/m^3 is mmol/L
        values, spread = self._value[numbers].tolist(), self._u[numbers].tolist()
        columns = [
            Column("vial", [text_datum(vial.name) for vial in vials], numeric=False),
            Column("compartment", [text_datum(vial.compartment) for vial in vials], numeric=False),
            Column(
                "product", [text_datum(liquid.analyte_species[one].name) for one in numbers], numeric=False
            ),
            Column(
                "signals",
                [text_datum(", ".join(self._signals.get(one, []))) for one in numbers],
                numeric=False,
            ),
            Column(
                "concentration / mmol/L",
                [number_datum(value, u) for value, u in zip(values, spread, strict=True)],
                "u(concentration) / mmol/L",
                "in the compartment, blanks taken off",
            ),
            Column("volume / mL", [_millilitres(vial.compartment_volume_m3) for vial in vials]),
            Column("aliquot / mL", [_millilitres(vial.aliquot_m3) for vial in vials]),
        ]
        return show_table("", columns, name=f"liquid readings of run {run}", like=like, titled=titled)


def _millilitres(volume_m3: float | None) -> Datum:
    value = None if volume_m3 is None or not np.isfinite(volume_m3) else volume_m3 * 1e6
    return number_datum(value)


def _budget(run: str, rows: Sequence[Row]) -> Html | None:
    """Share of each source in the variance of each output, sources down and outputs across."""
    outputs = list(
        dict.fromkeys(str(row["output"]) for row in rows if not str(row["output"]).startswith("j real"))
    )
    share: dict[tuple[str, str], dict[str, float]] = {}
    for row in rows:
        value = number_of(row["share / %"])
        if value is not None and str(row["output"]) in outputs:
            share.setdefault((str(row["source"]), str(row["shared"])), {})[str(row["output"])] = value
    kept = [key for key, found in share.items() if max(found.values()) >= _LEAST_SHARE]
    if not kept:
        return None
    # wholes first, then the products
    outputs.sort(key=lambda one: one not in ("total FE", "C2+ FE", "C2+/C1"))
    kept.sort(key=lambda key: -max(share[key].get("total FE", 0.0), 0.0))
    columns = [
        Column("source", [text_datum(source) for source, _ in kept], numeric=False),
        Column("shared by", [text_datum(shared) for _, shared in kept], numeric=False),
        *(
            Column(output, [_share(share[key].get(output)) for key in kept], shares=True)
            for output in outputs
        ),
    ]
    return show_table(
        "Share of the variance in per cent; sources below 0.5 % everywhere are left out.",
        columns,
        name=f"sources of uncertainty of run {run}",
    )


def _share(value: float | None) -> Datum:
    return Datum(
        "" if value is None else to_decimals(value, 1), kind="most" if (value or 0.0) >= _MOST else ""
    )
