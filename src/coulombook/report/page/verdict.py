"""The day in a sentence or two for each catalyst."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from coulombook.book import Book, Cell
from coulombook.report.page.html import Child, Html, element, join
from coulombook.report.page.words import JOINED, bare, listed, measured, number_of

Row = Mapping[str, Cell]
HYDROGEN = "hydrogen"
CLOSED = "closed"
_AT_MOST = 4  # open runs told one by one


def show_verdicts(book: Book) -> Html:
    """One entry per catalyst, in the order of the summary."""
    runs: dict[str, list[Row]] = {}
    for row in book.tables["summary"].records():
        runs.setdefault(str(row["catalyst"]), []).append(row)
    ledger: dict[str, list[Row]] = {}
    for row in book.tables["ledger"].records():
        if row["status"] != "below detection":
            ledger.setdefault(str(row["run"]), []).append(row)
    return element(
        "ul",
        (
            element("li", _sentences(catalyst, of_catalyst, ledger), class_="verdict")
            for catalyst, of_catalyst in runs.items()
        ),
        class_="verdicts",
    )


def _sentences(catalyst: str, runs: Sequence[Row], ledger: Mapping[str, list[Row]]) -> Html:
    # a run that does not close shows less, or more, than it made
    sound = [row for row in runs if row["closure"] == CLOSED] or list(runs)
    best = max(sound, key=lambda row: number_of(row["C2+ FE / %"]) or 0.0)
    if (number_of(best["C2+ FE / %"]) or 0.0) > 0.0:
        opening = _of_more_carbon(catalyst, best, ledger.get(str(best["run"]), []))
    else:
        opening = _of_one_product(catalyst, sound, ledger)
    return join(opening, " ", _closing(runs))


def _name(catalyst: str) -> Html:
    return element("b", catalyst, class_="name")


def _strong(text: str) -> Html:
    return element("strong", text)


def _where(row: Row) -> str:
    potential = measured(number_of(row["E vs RHE / V"]), number_of(row["u(E vs RHE) / V"]))
    current = bare(number_of(row["j / mA cm^-2"]), 3)
    return f"{potential}{JOINED}V vs RHE and {current}{JOINED}mA{JOINED}cm⁻² (run {row['run']})"


def _percent(row: Row, head: str) -> str:
    return f"{measured(number_of(row[head]), number_of(row[_u(head)]))}{JOINED}%"


def _u(head: str) -> str:
    quantity, _, unit = head.partition(" / ")
    return f"u({quantity}) / {unit}"


def _largest(rows: Sequence[Row], groups: str) -> Row | None:
    """The product of the largest FE among those whose group begins so."""
    of_groups = [
        row for row in rows if str(row["group"] or "").startswith(groups) and row["group"] not in (None, "C1")
    ]
    return max(of_groups, key=lambda row: number_of(row["FE / %"]) or 0.0, default=None)


def _of_more_carbon(catalyst: str, run: Row, products: Sequence[Row]) -> Html:
    parts: list[Child] = [
        _name(catalyst),
        " puts most charge into C2+ products at ",
        _where(run),
        ": ",
        _strong(_percent(run, "C2+ FE / %")),
        " of it",
    ]
    main = _largest(products, "C")
    if main is not None:
        parts.append(f", of which {main['product']} {_percent(main, 'FE / %')}")
    hydrogen = next((row for row in products if row["product"] == HYDROGEN), None)
    if hydrogen is not None:
        parts.append(f"; {_percent(hydrogen, 'FE / %')} goes to hydrogen")
    if number_of(run["C2+/C1"]) is not None:
        ratio = measured(number_of(run["C2+/C1"]), number_of(run["u(C2+/C1)"]))
        parts.append(f", and C2+/C1 is {ratio}")
    return join(*parts, ".")


def _of_one_product(catalyst: str, runs: Sequence[Row], ledger: Mapping[str, list[Row]]) -> Html:
    found = [
        (number_of(row["FE / %"]) or 0.0, place, row)
        for place, run in enumerate(runs)
        for row in ledger.get(str(run["run"]), [])
        if row["product"] != HYDROGEN
    ]
    if not found:
        return join(_name(catalyst), " shows no product of carbon in any run.")
    _, place, row = max(found, key=lambda one: one[:2])
    return join(
        _name(catalyst),
        f" makes {row['product']} above all, at most ",
        _strong(_percent(row, "FE / %")),
        f" of the charge at {_where(runs[place])}, and no C2+ product.",
    )


def _closing(runs: Sequence[Row]) -> str:
    judged = [row for row in runs if row["closure"] is not None]
    open_runs = [row for row in judged if row["closure"] != CLOSED]
    if not judged:
        return "Whether its runs close cannot be told."
    if not open_runs:
        return "Its run closes." if len(judged) == 1 else f"All its {len(judged)} runs close."
    told = [
        f"{row['run']} is {row['closure']} at {_percent(row, 'total FE / %')}" for row in open_runs[:_AT_MOST]
    ]
    if len(open_runs) > _AT_MOST:
        told.append(f"{len(open_runs) - _AT_MOST} more are open")
    closed = len(judged) - len(open_runs)
    if len(judged) == 1:
        return f"Its run does not close; {listed(told)}."
    if not closed:
        return f"None of its {len(judged)} runs closes; {listed(told)}."
    verb = "closes" if closed == 1 else "close"
    return f"Of its {len(judged)} runs {closed} {verb}; {listed(told)}."
