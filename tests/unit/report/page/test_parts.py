"""Parts of the page that words and rows make: verdict, findings, causes, cautions, logs, tables nobody placed."""

from __future__ import annotations

import base64
import json
import re
import zlib
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from coulombook import Book, Table, tally
from coulombook.findings import finding
from coulombook.report.page import drawings, page_html
from coulombook.report.page.dangers import show_cautions
from coulombook.report.page.explanation import show_explanation
from coulombook.report.page.findings import FOLDED_BEYOND, MOST, show_findings
from coulombook.report.page.runs import MOST_RUNS
from coulombook.report.page.traces import show_trace
from coulombook.report.page.verdict import show_verdicts

ROOT = Path(__file__).parents[4]


def words(markup: str) -> str:
    return re.sub(r"\s+", " ", re.sub(r"<[^>]+>", "", markup)).replace("&lt;", "<")


def with_rows(book: Book, table: str, *rows: dict[str, str | float | int | None]) -> Book:
    return replace(book, tables={**book.tables, table: Table.of(table, rows)})


@pytest.fixture(scope="module")
def book() -> Book:
    return tally(
        ROOT / "example_experiments" / "2043-06-02-gas-diffusion", calibrations=[ROOT / "calibrations"]
    )


RUN = {
    "catalyst": "mesh", "E vs RHE / V": -1.03, "u(E vs RHE) / V": 0.004, "j / mA cm^-2": 18.3, "total FE / %": 99.8,
    "u(total FE) / %": 1.5, "C2+ FE / %": 55.49, "u(C2+ FE) / %": 0.95, "C2+/C1": 3.424, "u(C2+/C1)": 0.049,
    "closure": "closed",
}  # fmt: skip


def test_the_verdict_takes_the_best_run_that_closes(book: Book) -> None:
    short = RUN | {
        "run": "b",
        "C2+ FE / %": 70.0,
        "closure": "short",
        "total FE / %": 85.8,
        "u(total FE) / %": 1.3,
    }
    shown = words(show_verdicts(with_rows(book, "summary", RUN | {"run": "a"}, short)).text)
    assert (
        "puts most charge into C2+ products at −1.0300(40) V vs RHE and 18.3 mA cm⁻² (run a): 55.49(95) %"
        in shown
    )
    assert "Of its 2 runs 1 closes; b is short at 85.8(13) %." in shown


def test_the_verdict_of_a_day_that_never_closes_takes_what_there_is(book: Book) -> None:
    shown = words(show_verdicts(with_rows(book, "summary", RUN | {"run": "a", "closure": "over"})).text)
    assert "(run a)" in shown
    assert "Its run does not close; a is over at 99.8(15) %." in shown


def test_a_catalyst_without_higher_products_is_told_by_its_main_one(book: Book) -> None:
    day = with_rows(book, "summary", RUN | {"run": "s", "C2+ FE / %": 0.0, "C2+/C1": None})
    day = with_rows(
        day,
        "ledger",
        {
            "run": "s",
            "product": "hydrogen",
            "group": "H2",
            "FE / %": 90.0,
            "u(FE) / %": 1.0,
            "status": "quantified",
        },
        {
            "run": "s",
            "product": "formate",
            "group": "C1",
            "FE / %": 4.0,
            "u(FE) / %": 0.1,
            "status": "quantified",
        },
        {
            "run": "s",
            "product": "methane",
            "group": "C1",
            "FE / %": 6.0,
            "u(FE) / %": 0.1,
            "status": "below detection",
        },
    )
    shown = words(show_verdicts(day).text)
    assert "makes formate above all, at most 4.00(10) % of the charge" in shown
    assert "no C2+ product. Its run closes." in shown


def test_findings_stand_by_kind_the_most_severe_first_with_one_advice() -> None:
    many = [finding("below-calibration", f"run {n}", "it lies below", "add standards") for n in range(7)]
    shown = show_findings([finding("left-out", "gas.csv", "rows were left out"), *many]).text
    assert shown.index("warning") < shown.index(">note")
    assert shown.count("Add standards.") == 1
    assert "7 places" in shown
    assert "run 0; run 1; run 2; run 3; and 3 more:" in words(shown)
    assert "<details><summary>the other 3 places</summary>run 4; run 5; run 6</details>" in shown


def test_long_lists_of_one_kind_are_folded() -> None:
    many = [finding("check-off", f"row {n}", f"it is off by {n}", "recalibrate") for n in range(10)]
    shown = show_findings(many).text
    before, _, folded = shown.partition("<details>")
    assert before.count("<li>") == FOLDED_BEYOND
    assert folded.count("<li>") == 10 - FOLDED_BEYOND


def test_of_thousands_of_findings_some_hundreds_are_shown_and_the_file_is_named() -> None:
    many = [finding("check-off", f"row {n}", f"it is off by {n}", "recalibrate") for n in range(5000)]
    shown = show_findings(many).text
    assert shown.count("<li>") == MOST
    assert f"The other {5000 - MOST} stand in findings.csv." in shown
    alike = show_findings([finding("check-off", f"row {n}", "it is off") for n in range(5000)]).text
    assert "the other 4996 places" in alike
    assert alike.count("; row") < MOST + FOLDED_BEYOND


def test_a_day_without_findings_says_so() -> None:
    assert "Nothing was assumed" in show_findings([]).text


def test_causes_are_shown_with_the_test_that_would_decide(book: Book) -> None:
    shown = show_explanation(book)
    assert shown is not None
    first = next(iter(book.tables["explanations"].records()))
    assert str(first["bench test"]) in words(shown.text)
    assert "Not to blame" in shown.text


def test_a_day_that_closes_has_no_causes(book: Book) -> None:
    none = {"rank": 1, "cause": "none", "estimate / %": 0.0, "evidence": 0.0, "told apart": "yes"}
    assert show_explanation(with_rows(book, "explanations", none)) is None


def test_cautions_tell_when_the_outlet_could_burn_and_when_not(book: Book) -> None:
    row = {"substance": "all together", "run": "r", "injection": "2"}
    lean = words(show_cautions(with_rows(book, "cautions", row | {"of flammable limit / %": 40.0})).text)
    rich = words(show_cautions(with_rows(book, "cautions", row | {"of flammable limit / %": 140.0})).text)
    assert "reached 40.0 % of the lower flammable limit" in lean
    assert "it can pass through its flammable range" in rich
    for shown in (lean, rich):
        assert "local codes" in shown


def test_cautions_stay_even_where_no_gas_was_measured(book: Book) -> None:
    shown = words(show_cautions(with_rows(book, "cautions")).text)
    assert "Carbon monoxide poisons" in shown
    assert "licensed professionals" in shown


def test_a_log_unpacks_to_what_was_logged(book: Book) -> None:
    shown = show_trace(book, "p1-50")
    assert shown is not None
    packed = re.search(r'data-log="([^"]+)"', shown.text)
    assert packed
    log = json.loads(packed[1].replace("&quot;", '"'))
    steps = np.frombuffer(zlib.decompress(base64.b64decode(log["steps"])), dtype="<u2").reshape(
        len(log["ends"]), -1
    )
    ends = np.array(log["ends"])
    columns = ends[:, :1] + (ends[:, 1:] - ends[:, :1]) * np.cumsum(steps, axis=1, dtype=np.uint16) / 65535
    picture = book.pictures[0]
    # half of one of 65535 steps
    for column, logged, unit in (
        (columns[0], picture.time_second, 1.0),
        (columns[1], picture.lowest_current_ampere, 1e3),
        (columns[-1], picture.highest_potential_volt, 1.0),
    ):
        half = np.ptp(logged) * unit / 65535 / 2
        assert np.abs(column - logged * unit).max() <= half * 1.001
    assert len(log["injections"]) == len(
        {row["injection"] for row in book.tables["injections"].records() if row["run"] == "p1-50"}
    )


def test_a_table_that_no_part_knows_appears_by_itself(book: Book) -> None:
    new = Table("rumours", ("run", "size / mm"), (("p1-50", 1.25),))
    page = page_html(replace(book, tables={**book.tables, "rumours": new}))
    assert "<summary>rumours (1 row)</summary>" in page
    assert 'data-h="size / mm"' in page


def test_a_book_that_has_lost_its_account_is_shown_from_its_tables(book: Book) -> None:
    page = page_html(replace(book, settled=None, pictures=()))
    assert "copper on carbon paper" in page
    assert "class=still" not in page


def test_a_day_of_very_many_runs_shows_some_and_says_where_the_others_are(book: Book) -> None:
    rows = [RUN | {"run": f"r{n}", "level": str(n)} for n in range(MOST_RUNS + 30)]
    page = page_html(replace(with_rows(book, "summary", *rows), settled=None, pictures=()))
    assert page.count("<details class=run>") == MOST_RUNS
    assert "The other 30 runs stand in the tables of the results folder." in page


def test_of_very_many_figures_some_are_drawn(book: Book, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(drawings, "MOST", 2)
    page = page_html(book)
    curves = len(book.tables["calibrations"])
    assert f"{curves - 2} more: coulombook figures draws them." in page
    assert page.count('<figure class="figure curve">') == 2
