"""Tables: a value and its uncertainty in one cell, in full behind it."""

from __future__ import annotations

import re

import pytest

from coulombook.book import Table
from coulombook.report.page.tables import (
    Column,
    Datum,
    book_table,
    columns_of,
    number_datum,
    show_table,
    text_datum,
)


@pytest.fixture
def carbon() -> Table:
    return Table.of(
        "carbon",
        [
            {
                "run": "a",
                "CO2 conversion / %": 12.3456789012345,
                "u(CO2 conversion) / %": 0.34,
                "outlet flow by": "tracer",
            },
            {"run": "=b", "CO2 conversion / %": None, "u(CO2 conversion) / %": None, "outlet flow by": None},
        ],
    )


def test_the_uncertainty_stands_with_its_value_and_empty_columns_are_left_out(carbon: Table) -> None:
    columns = columns_of(carbon, list(carbon.records()))
    assert [(column.head, column.u_head) for column in columns] == [
        ("run", ""),
        ("CO2 conversion / %", "u(CO2 conversion) / %"),
        ("outlet flow by", ""),
    ]
    assert [datum.shown for datum in columns[1].cells] == ["12.35(34)", "–"]


def test_figures_behind_a_cell_have_twelve_digits(carbon: Table) -> None:
    shown = book_table(carbon, "carbon")
    assert shown is not None
    assert "<td data-v=12.3456789012 data-u=0.34>12.35(34)" in shown.text


def test_a_text_that_a_spreadsheet_would_run_is_copied_with_a_guard(carbon: Table) -> None:
    shown = book_table(carbon, "carbon")
    assert shown is not None
    assert re.search(r"<th scope=row data-c=\"'=b\">=b", shown.text)


def test_the_first_column_heads_the_rows_and_what_heads_mean_is_said(carbon: Table) -> None:
    shown = book_table(carbon, "where the carbon went")
    assert shown is not None
    assert shown.text.count("scope=row") == 2
    assert "<caption>where the carbon went</caption>" in shown.text
    assert 'title="CO2 that ended in products over CO2 fed' in shown.text


def test_a_table_without_rows_is_not_shown(carbon: Table) -> None:
    assert book_table(carbon, "carbon", rows=[]) is None


def test_a_caption_that_the_heading_says_already_is_there_for_screen_readers() -> None:
    shown = show_table("", [Column("run", [text_datum("a")], numeric=False)], name="gas readings")
    assert "<caption class=unseen>gas readings</caption>" in shown.text


def test_whole_numbers_stay_whole_and_doubts_stand_out() -> None:
    assert number_datum(3) == Datum("3", 3)
    assert text_datum("short").kind == "doubt"
    assert text_datum("closed").kind == ""
    assert text_datum("x" * 60).kind == "long"
