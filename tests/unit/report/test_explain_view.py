"""Explanations in words: sizes, sides, and no more blame than evidence."""

from __future__ import annotations

import io
from collections.abc import Sequence

import pytest

from coulombook.book import Book, Cell, Table
from coulombook.report.explain_view import evidence_in_words, in_words, show_explanation, verdict
from coulombook.report.terminal import console_for

Row = dict[str, Cell]


def cause(
    kind: str, estimate: float = 5.1, where: str = "", evidence: float = 12.0, apart: str = "yes"
) -> Row:
    return {
        "cause": kind,
        "where": where,
        "estimate / %": estimate,
        "u(estimate) / %": 0.82,
        "evidence": evidence,
        "told apart": apart,
        "bench test": f"test of {kind}",
    }


NONE = cause("none", 0.0, evidence=0.0)
RUN: Row = {
    "run": "a1",
    "total FE / %": 83.0,
    "u(total FE) / %": 1.6,
    "deviation / u": -10.6,
    "closure": "short",
}


def book(ranked: Sequence[Row], closure: str | None, p: float = 0.2) -> Book:
    rows = [RUN]
    if closure:
        rows.append({"closure": closure, "chi-square": 4.2, "degrees of freedom": 3, "p": p})
    tables = {
        "closure": Table.of("closure", rows),
        "explanations": Table.of(
            "explanations", [row | {"rank": place} for place, row in enumerate(ranked, 1)]
        ),
    }
    return Book("a day", "", tables, (), (), {})


def shown(a_book: Book, width: int = 80) -> str:
    stream = io.StringIO()
    console = console_for(stream)
    console.width = width
    show_explanation(a_book, console)
    return stream.getvalue()


@pytest.mark.parametrize(
    ("row", "text"),
    [
        (cause("outlet-flow"), "the outlet flow was entered 5.10(82) % too high"),
        (cause("outlet-flow", -5.1), "the outlet flow was entered 5.10(82) % too low"),
        (cause("gas-response", -5.1, "FID"), "channel FID read 5.10(82) % too low"),
        (cause("curve", 5.1, "ethylene"), "ethylene was read 5.10(82) % too high"),
        (cause("internal-standard"), "the amount of internal standard was entered 5.10(82) % too high"),
        (cause("compartment-volume"), "the compartment volume was entered 5.10(82) % too high"),
        (
            cause("current-offset"),
            "the current was logged too low, in every run by 5.10(82) % of the day's mean",
        ),
        (cause("gas-lost", 24.0, "m2-4"), "gas was lost from run m2-4: 24.00(82) %"),
        (cause("gas-lost", 24.0), "gas was lost in every run: 24.00(82) %"),
        (
            cause("crossover"),
            "liquid products crossed to a compartment that was not sampled: 5.10(82) % of them",
        ),
        (
            cause("crossover", 5.1, "q1"),
            "liquid products of run q1 that no vial was taken of hold 5.10(82) % of its charge",
        ),
        (cause("unmeasured-product"), "a product that nothing measures took 5.10(82) % of the charge"),
        (
            cause("unmeasured-product", 5.1, "growing with potential"),
            "a product that nothing measures, growing with potential, took 5.10(82) % of the charge",
        ),
        (
            cause("curve", float("nan"), "acetate"),
            "curve (acetate), though no size of it would do",
        ),
    ],
)
def test_every_cause_has_its_words(row: Row, text: str) -> None:
    table = Table.of("explanations", [row])
    assert in_words(next(table.records())) == text


@pytest.mark.parametrize(
    ("evidence", "word"),
    [(1.0, "weak"), (5.99, "weak"), (6.0, "strong"), (9.9, "strong"), (10.0, "very strong")],
)
def test_evidence_is_called_what_it_is(evidence: float, word: str) -> None:
    assert evidence_in_words(cause("curve", evidence=evidence)).startswith(f"{word} evidence")


def test_a_day_that_closes_says_so_and_blames_nothing() -> None:
    one = book([NONE, cause("outlet-flow", evidence=1.0)], "closed")
    assert verdict(one).startswith(
        "The day as a whole closes (chi-square 4.20 with 3 degrees of freedom, p = 0.20)"
    )
    assert "nothing needs to be explained" in verdict(one)
    assert "outlet flow" not in shown(one)


def test_a_day_that_does_not_close_without_a_cause_says_that_none_is_known() -> None:
    one = book([NONE, cause("outlet-flow", evidence=1.0)], "open", 1e-9)
    assert "does not close (chi-square 4.20 with 3 degrees of freedom, p < 1e-6)" in verdict(one)
    assert "no single cause explains it better than chance" in verdict(one)
    assert "outlet flow" not in shown(one)


def test_a_pattern_on_a_day_that_closes_is_told_as_such() -> None:
    one = book([cause("curve", where="ethanol", evidence=7.0), NONE], "closed")
    assert "closes" in verdict(one)
    assert "leave a pattern: ethanol was read 5.10(82) % too high (strong evidence" in verdict(one)


def test_weak_causes_are_called_weak() -> None:
    printed = shown(book([cause("outlet-flow", evidence=5.0), NONE], "open"))
    assert "what may explain it, though weakly" in printed
    assert "what explains it best" not in printed


def test_causes_alike_stand_together_with_their_tests_and_the_rest_is_counted() -> None:
    ranked = [
        cause("outlet-flow", apart="gas-response (FID); gas-lost"),
        cause("gas-response", where="FID", evidence=11.0),
        cause("gas-lost", evidence=10.0),
        NONE,
        cause("curve", where="ethylene", evidence=-3.0),
    ]
    printed = " ".join(shown(book(ranked, "open")).split())
    beside = printed.partition("cannot be told apart from it")[2]
    assert "channel FID read 5.10(82) % too high (11.0) to decide: test of gas-response" in beside
    assert "gas was lost in every run" in beside
    assert "The other cause explains the day so much less well" in beside


@pytest.mark.parametrize(
    ("apart", "ending"),
    [
        ("yes", "39.5)."),
        ("gas-lost", "39.5); one other cause cannot be told apart from it."),
        ("gas-lost; crossover (a1)", "39.5); 2 other causes cannot be told apart from it."),
    ],
)
def test_the_sentence_of_a_day_says_how_many_causes_fit_as_well(apart: str, ending: str) -> None:
    ranked = [
        cause("outlet-flow", evidence=39.5, apart=apart),
        cause("gas-lost", evidence=39.0),
        cause("crossover", where="a1", evidence=38.0),
        NONE,
    ]
    assert verdict(book(ranked, "open")).endswith(ending)


def test_what_moves_no_efficiency_is_excluded_by_name() -> None:
    printed = " ".join(shown(book([NONE], "closed")).split())
    assert "Not to blame: the reference electrode, the pH and the resistance" in printed


def test_a_day_nothing_can_judge_says_so() -> None:
    assert verdict(book([NONE], None)) == "Nothing is known by which the day as a whole could be judged."


@pytest.mark.parametrize("width", [40, 80])
def test_lines_keep_to_the_width(width: int) -> None:
    ranked = [cause("outlet-flow", apart="gas-lost"), cause("gas-lost", evidence=11.0), NONE]
    assert max(map(len, shown(book(ranked, "open"), width).splitlines())) <= max(width, 44)


def test_text_of_the_bench_is_shown_and_not_obeyed() -> None:
    printed = shown(book([cause("gas-response", where="a\x1b[2Jb"), NONE], "open"))
    assert "\x1b" not in printed
