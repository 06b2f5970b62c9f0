"""Why a day does not close, in plain words for a terminal.

Nothing is blamed beyond its evidence: what chance could have done is said to be chance, a weak cause is called weak,
and causes that cannot be told from one another stand together.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from rich.console import Console
from rich.text import Text

from coulombook.book import Book, Cell
from coulombook.prose.numbers import brief, fixed, plain, with_uncertainty
from coulombook.prose.text import crop, visible
from coulombook.report.grid import Column, grid
from coulombook.report.terminal import hanging
from coulombook.report.terminal_tables import LONGEST_RUN

# 2 ln of a Bayes factor (Kass & Raftery, J. Am. Stat. Assoc. 90 (1995) 773); their "positive", 2 to 6, is weak here
STRONG, VERY_STRONG = 6.0, 10.0
AT_MOST = 8  # causes that stand beside the best one
NO_CAUSE = "none"
LEAST_P = 1e-6  # smaller ones say nothing more to anybody

EXCLUDED = (
    "Not to blame: the reference electrode, the pH and the resistance (with its compensation) move potentials; "
    "the electrode area and the window of the voltammograms move current densities and roughness factors. "
    "None of them moves a Faradaic efficiency."
)

Record = Mapping[str, Cell]


def show_explanation(book: Book, console: Console) -> None:
    """Print the closure of every run and of the day, then what may explain it."""
    rows = list(book.tables["closure"].records())
    console.print(Text(visible(book.day, 100), style="bold"))
    _show_runs([row for row in rows if row["run"] is not None], console)
    console.print()
    hanging("", verdict(book), console)
    console.print()
    ranked = list(book.tables["explanations"].records())
    if ranked and ranked[0]["cause"] != NO_CAUSE:
        _show_causes(ranked, console)
        console.print()
    hanging("", EXCLUDED, console)


def verdict(book: Book) -> str:
    """One sentence about the day as a whole, and the best explanation if it does not close."""
    day = next((row for row in book.tables["closure"].records() if row["run"] is None), None)
    ranked = list(book.tables["explanations"].records())
    if day is None:
        return "Nothing is known by which the day as a whole could be judged."
    freedom = f"{day['degrees of freedom']} degree{'' if day['degrees of freedom'] == 1 else 's'} of freedom"
    test = (
        f"chi-square {plain(_float(day['chi-square']), 3)} with {freedom}, "
        f"{_probability(_float(day['p']) or 0.0)}"
    )
    blamed = bool(ranked) and ranked[0]["cause"] != NO_CAUSE
    if day["closure"] == "closed" and not blamed:
        return f"The day as a whole closes ({test}); nothing needs to be explained."
    opening = (
        f"The day as a whole closes ({test}), but its runs leave a pattern"
        if day["closure"] == "closed"
        else f"The day as a whole does not close ({test})"
    )
    if not blamed:
        return f"{opening}, and no single cause explains it better than chance would."
    alike = len(not_told_from(ranked[0], ranked))
    causes = "one other cause" if alike == 1 else f"{alike} other causes"
    # alone, the evidence against no cause would read as evidence against every other
    also = f"; {causes} cannot be told apart from it" if alike else ""
    return f"{opening}: {in_words(ranked[0])} ({evidence_in_words(ranked[0])}){also}."


def _probability(p: float) -> str:
    return f"p = {plain(p, 2)}" if p >= LEAST_P else f"p < {brief(LEAST_P)}"


def evidence_in_words(row: Record) -> str:
    """How strongly the day speaks for a cause."""
    evidence = _float(row["evidence"]) or 0.0
    word = "weak" if evidence < STRONG else "strong" if evidence < VERY_STRONG else "very strong"
    return f"{word} evidence, 2 ln of the Bayes factor {fixed(evidence, 1)}"


def in_words(row: Record) -> str:
    """What a cause would mean, with its size."""
    estimate, u = _float(row["estimate / %"]), _float(row["u(estimate) / %"])
    where = visible(str(row["where"] or ""), 60)
    if estimate is None:
        return f"{row['cause']}{f' ({where})' if where else ''}, though no size of it would do"
    size = f"{with_uncertainty(abs(estimate), u)} %"
    signed = f"{with_uncertainty(estimate, u)} %"
    side = "high" if estimate > 0 else "low"
    match row["cause"]:
        case "outlet-flow":
            return f"the outlet flow was entered {size} too {side}"
        case "gas-response":
            return f"channel {where} read {size} too {side}"
        case "curve":
            return f"{where} was read {size} too {side}"
        case "internal-standard":
            return f"the amount of internal standard was entered {size} too {side}"
        case "compartment-volume":
            return f"the compartment volume was entered {size} too {side}"
        case "current-offset":
            # more products than charge: the log held too little current
            off = "low" if estimate > 0 else "high"
            return f"the current was logged too {off}, in every run by {size} of the day's mean"
        case "gas-lost":
            return f"gas was lost {f'from run {where}' if where else 'in every run'}: {signed}"
        case "crossover":
            if where:
                return f"liquid products of run {where} that no vial was taken of hold {signed} of its charge"
            return f"liquid products crossed to a compartment that was not sampled: {signed} of them"
        case "unmeasured-product":
            growing = f", {where}," if where else ""
            return f"a product that nothing measures{growing} took {signed} of the charge"
        case other:
            return f"{other} {where}: {signed}".replace(" :", ":")


def _show_runs(rows: Sequence[Record], console: Console) -> None:
    names = tuple(crop(visible(str(row["run"])), LONGEST_RUN) for row in rows)
    totals = tuple(
        with_uncertainty(_float(row["total FE / %"]), _float(row["u(total FE) / %"])) for row in rows
    )
    off = tuple(fixed(_float(row["deviation / u"]), 1) for row in rows)
    closure = tuple(str(row["closure"]) for row in rows)
    styles = {place: "green" if word == "closed" else "yellow" for place, word in enumerate(closure)}
    columns = [
        Column(("", "run"), names, True),
        Column(("total FE", "%"), totals),
        Column(("off 100 %", "by so many u"), off),
        Column(("", "closure"), closure, True, styles),
    ]
    rule = "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
    console.print(grid(columns, rule=rule), soft_wrap=True)


def _show_causes(ranked: Sequence[Record], console: Console) -> None:
    best = ranked[0]
    weak = (_float(best["evidence"]) or 0.0) < STRONG
    console.print(
        Text("what may explain it, though weakly" if weak else "what explains it best", style="bold")
    )
    hanging("  ", _sentence(in_words(best)), console)
    hanging("  ", _sentence(evidence_in_words(best)), console)
    if best["bench test"]:
        hanging("  to decide: ", str(best["bench test"]), console)
    near = not_told_from(best, ranked)
    if not near:
        hanging("  ", "It can be told apart from every other cause.", console)
    else:
        console.print()
        console.print(Text("cannot be told apart from it", style="bold"))
        for row in near[:AT_MOST]:
            hanging("  - ", f"{in_words(row)} ({fixed(_float(row['evidence']), 1)})", console)
            if row["bench test"]:
                hanging("    to decide: ", str(row["bench test"]), console)
        if len(near) > AT_MOST:
            hanging("  ", f"and {len(near) - AT_MOST} more, in explanations.csv of a tally", console)
    rest = len(ranked) - 1 - len(near) - sum(row["cause"] == NO_CAUSE for row in ranked)
    if rest:
        console.print()
        causes = "the other cause explains" if rest == 1 else f"the {rest} other causes explain"
        hanging("", _sentence(f"{causes} the day so much less well that they can be left aside."), console)


def not_told_from(best: Record, ranked: Sequence[Record]) -> list[Record]:
    """Rows of the causes that the best one names as its like."""
    names = set(str(best["told apart"]).split("; "))
    return [row for row in ranked[1:] if _name(row) in names]


def _name(row: Record) -> str:
    return f"{row['cause']} ({row['where']})" if row["where"] else str(row["cause"])


def _sentence(text: str) -> str:
    text = text[:1].upper() + text[1:]
    return text if text.endswith(".") else f"{text}."


def _float(cell: Cell) -> float | None:
    return float(cell) if isinstance(cell, int | float) else None
