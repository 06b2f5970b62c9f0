"""What a notebook shows: values with their uncertainties, and no text of a file as markup."""

from __future__ import annotations

from html.parser import HTMLParser

import numpy as np

from coulombook.book import Book, Table
from coulombook.book.display import FindingList
from coulombook.curves.fit import fit_curve
from coulombook.findings import finding
from coulombook.prose.display import MOST_ROWS, html_table


class Cells(HTMLParser):
    """The texts of the cells, row by row, and every tag there is."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.rows: list[list[str]] = []
        self.tags: set[str] = set()
        self._open: list[str] = []
        self.feed(text)
        assert not self._open, "a tag is not closed"

    def handle_starttag(self, tag: str, attrs: object) -> None:
        self.tags.add(tag)
        self._open.append(tag)
        if tag == "tr":
            self.rows.append([])
        if tag in ("td", "th"):
            self.rows[-1].append("")

    def handle_endtag(self, tag: str) -> None:
        assert self._open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self._open and self._open[-1] in ("td", "th"):
            self.rows[-1][-1] += data


TAGS = {"table", "caption", "thead", "tbody", "tr", "th", "td"}
HOSTILE = "<script>alert(1)</script>\u202e"


def test_values_stand_with_two_digits_of_their_uncertainty() -> None:
    table = Table.of(
        "closure", [{"run": "a1", "total FE / %": 97.314, "u(total FE) / %": 1.462, "closure": "closed"}]
    )
    shown = Cells(table._repr_html_())
    assert shown.rows == [["run", "total FE / %", "closure"], ["a1", "97.3(15)", "closed"]]


def test_a_book_shows_its_runs_and_counts_its_findings() -> None:
    summary = Table.of("summary", [{"run": HOSTILE, "total FE / %": 97.3, "u(total FE) / %": 1.4}])
    findings = FindingList([finding("balance-open", HOSTILE, "x", "y")])
    book = Book(HOSTILE, "title", {"summary": summary}, findings, (), {})
    text = book._repr_html_()
    shown = Cells(text)
    assert shown.tags == TAGS
    assert "findings: 1 of severity warn, 0 of severity note" in text
    assert shown.rows[1] == ["<script>alert(1)</script>\\u202e", "97.3(14)"]


def test_findings_are_a_tuple_that_shows_itself() -> None:
    findings = FindingList([finding("balance-open", HOSTILE, "a & b", "mend it")])
    assert isinstance(findings, tuple)
    shown = Cells(findings._repr_html_())
    assert shown.tags == TAGS
    assert shown.rows[1][1:4] == ["balance-open", "<script>alert(1)</script>\\u202e", "a & b"]


def test_a_curve_shows_its_coefficients_and_how_it_was_fitted() -> None:
    curve = fit_curve(np.array([1.0, 2.0, 3.0, 4.0]), np.array([2.1, 3.9, 6.2, 7.8]), "line", "equal")
    shown = curve._repr_html_()
    # by hand: slope 1.94, intercept 0.15; residuals 0.01, -0.13, 0.23, -0.11, so s^2 = 0.082/2 and u(slope) = s/sqrt(5)
    assert Cells(shown).rows[2] == ["a1", "1.940(91)"]
    assert "4 points from 1.000 to 4.000" in shown


def test_a_long_table_is_cut_and_says_so() -> None:
    shown = Cells(html_table("long", ["x"], [[str(one)] for one in range(MOST_ROWS + 5)]))
    assert len(shown.rows) == 1 + MOST_ROWS + 1
    assert shown.rows[-1] == ["and 5 more rows"]
