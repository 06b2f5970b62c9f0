"""What an open balance may come from, and the tests at the bench that would decide."""

from __future__ import annotations

from collections.abc import Sequence

from coulombook.book import Book
from coulombook.report.explain_view import EXCLUDED, NO_CAUSE, Record, in_words, not_told_from
from coulombook.report.page.html import Html, element, join
from coulombook.report.page.tables import Column, book_table, number_datum, show_table, text_datum
from coulombook.report.page.words import number_of, sentence

_WORTH_A_WORD = (
    2.0  # 2 ln of a Bayes factor; less is "not worth more than a bare mention" (Kass & Raftery 1995)
)
SHOWN = 6  # causes that stand open, below the best
ALIKE_SHOWN = 3  # causes named beside the best as its like


def show_explanation(book: Book) -> Html | None:
    """The causes, best first; None where nothing needs to be explained."""
    ranked = list(book.tables["explanations"].records()) if "explanations" in book.tables else []
    if not ranked or ranked[0]["cause"] == NO_CAUSE:
        return None
    blamed = [
        row
        for row in ranked
        if row["cause"] != NO_CAUSE and (number_of(row["evidence"]) or 0.0) >= _WORTH_A_WORD
    ]
    best, others = blamed[:1], blamed[1:]
    return join(
        [_best(row, ranked) for row in best],
        _table(blamed[:SHOWN]) if others else None,
        element("p", EXCLUDED, class_="aside"),
        element(
            "details",
            element("summary", f"All {len(ranked)} causes that were tried"),
            book_table(
                book.tables["explanations"], "Every cause, best first, with all that it cannot be told from"
            ),
        ),
    )


def _best(row: Record, ranked: Sequence[Record]) -> Html:
    alike = not_told_from(row, ranked)
    named = [in_words(one) for one in alike[:ALIKE_SHOWN]]
    if len(alike) > ALIKE_SHOWN:
        named.append(f"and {len(alike) - ALIKE_SHOWN} more")
    return element(
        "p",
        element("strong", _sentence(in_words(row))),
        " It can be told apart from every other cause."
        if not alike
        else f" It cannot be told apart from: {'; '.join(named)}.",
        join(" ", element("span", "To decide: ", class_="lead"), f"{row['bench test']}.")
        if row["bench test"]
        else None,
        class_="best",
    )


def _table(rows: Sequence[Record]) -> Html:
    columns = [
        Column("what may be so", [text_datum(_sentence(in_words(row))) for row in rows], numeric=False),
        Column(
            "evidence",
            [number_datum(row["evidence"]) for row in rows],
            meaning="2 ln of the Bayes factor against no cause: above 6 strong, above 10 very strong",
        ),
        Column("to decide", [text_datum(row["bench test"]) for row in rows], numeric=False),
    ]
    return show_table(
        "Causes that the day speaks for, best first. Evidence is 2 ln of the Bayes factor against no cause: above 6 "
        "strong, above 10 very strong; those below 2 are left out.",
        columns,
        name="causes of the open balance",
    )


def _sentence(text: str) -> str:
    text = sentence(text[:1].upper() + text[1:])
    return text if text.endswith(".") else f"{text}."
