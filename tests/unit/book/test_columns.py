"""Every column of the results is described, and holds what its description says."""

from __future__ import annotations

from pathlib import Path

import pytest

import coulombook
from coulombook.book import TABLES
from coulombook.book.columns import Kind, about_tables

ROOT = Path(__file__).resolve().parents[3]
EXAMPLES = sorted(path for path in (ROOT / "example_experiments").iterdir() if path.is_dir())


@pytest.fixture(scope="module", params=EXAMPLES, ids=lambda path: path.name)
def book(request: pytest.FixtureRequest) -> coulombook.Book:
    return coulombook.tally(request.param, calibrations=[ROOT / "calibrations"], draws=200, reconcile=True)


def test_every_table_has_its_columns_described_in_their_order() -> None:
    for name, heads in TABLES.items():
        about = about_tables()[name]
        assert tuple(one.head for one in about.columns) == heads
        assert all(one.meaning for one in about.columns)
        assert set(about.key) <= set(heads)


def test_cells_are_of_the_kind_that_is_said(book: coulombook.Book) -> None:
    kinds = {Kind.TEXT: str, Kind.WHOLE: int, Kind.NUMBER: (int, float)}
    for name, table in book.tables.items():
        for column in about_tables()[name].columns:
            wrong = [
                cell for cell in table.column(column.head)
                if cell is not None and not isinstance(cell, kinds[column.kind])
            ]  # fmt: skip
            assert not wrong, (name, column.head)


def test_rows_are_told_apart_by_their_key(book: coulombook.Book) -> None:
    for name, table in book.tables.items():
        key = about_tables()[name].key
        if key:
            keys = list(zip(*(table.column(head) for head in key), strict=True))
            assert len(set(keys)) == len(keys), name
            # the standard of data packages asks for a value in every cell of a key
            assert all(cell is not None for one in keys for cell in one), name


def test_units_stand_behind_the_heads() -> None:
    units = {one.head: one.unit for one in about_tables()["ledger"].columns}
    assert units["amount / umol"] == "umol"
    assert units["electrons"] == ""
