from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from tests.unit.report.sample import PRODUCTS, sample_book

from coulombook.book import Book, Table
from coulombook.report.pivot import catalyst_tables


def changed(book: Book, name: str, change: Any) -> Book:
    """The book with each row of one table passed through ``change``."""
    rows = [change(dict(row)) for row in book.tables[name].records()]
    return replace(book, tables={**book.tables, name: Table.of(name, rows)})


def test_levels_go_from_the_least_negative_potential_on() -> None:
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",), levels=(-1.0, -0.6, -0.8)))
    assert [one.potential for one in table.levels] == ["-0.599", "-0.799", "-0.999"]
    assert [one.name for one in table.levels] == ["-1.4", "-1.6", "-1.2"]


def test_products_stand_by_group_hydrogen_first_then_by_carbon_number() -> None:
    shuffled = (PRODUCTS[10], PRODUCTS[5], PRODUCTS[0], ("decane", "C10", "liquid", 62, 0.1), PRODUCTS[1])
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",), products=shuffled))
    assert [group for group, _ in table.products] == ["H2", "C1", "C2", "C3", "C10"]
    assert table.products[0] == ("H2", "hydrogen")


def test_the_total_of_a_single_run_has_its_uncertainty_and_that_of_several_their_extremes() -> None:
    (single,) = catalyst_tables(sample_book(catalysts=("mesh",), levels=(-0.6,), replicates=1))
    assert single.levels[0].total == "94.6(16)"
    (several,) = catalyst_tables(sample_book(catalysts=("mesh",), levels=(-0.6,), replicates=3))
    # 94.6, 96.3 and 98.0 %
    assert several.levels[0].total == "94.6-98.0"
    assert several.levels[0].runs == "3"


def test_runs_that_close_differently_are_counted() -> None:
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",), levels=(-0.6, -0.8)))
    assert [one.closure for one in table.levels] == ["1/2 closed", "closed"]


def test_a_product_below_detection_in_every_run_shows_no_number() -> None:
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",)))
    assert [one.efficiency["ethane"] for one in table.levels] == [
        "nd",
        "0.03503(84)",
        "0.03906(94)",
        "0.0431(10)",
        "0.0471(11)",
    ]
    assert "nd below detection, and in no total" in table.marks


def test_a_detection_limit_stands_in_for_the_number() -> None:
    def with_limit(row: dict[str, Any]) -> dict[str, Any]:
        return row | ({"FE limit / %": 0.0512} if row["status"] == "below detection" else {})

    (table,) = catalyst_tables(changed(sample_book(catalysts=("mesh",)), "ledger", with_limit))
    assert table.levels[0].efficiency["ethane"] == "<0.051"


def test_a_product_outside_the_calibrated_range_is_marked_and_explained() -> None:
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",)))
    assert [one.efficiency["ethylene"].endswith("*") for one in table.levels] == [False] * 4 + [True]
    assert [line for line in table.marks if line.startswith("*")]


def test_no_mark_is_explained_that_does_not_occur() -> None:
    (table,) = catalyst_tables(sample_book(catalysts=("mesh",), products=PRODUCTS[:3]))
    assert table.marks == ()


def test_a_run_without_any_product_still_has_its_column() -> None:
    book = sample_book(catalysts=("mesh",), levels=(-0.6, -0.8))
    series = [row for row in book.tables["series"].records() if row["level"] != "-1.4"]
    book = replace(book, tables={**book.tables, "series": Table.of("series", series)})
    (table,) = catalyst_tables(book)
    assert [one.potential for one in table.levels] == ["-0.599", "-0.798"]
    assert table.levels[1].efficiency == {}


@pytest.mark.parametrize("head", ["j / mA cm^-2", "total FE / %", "E vs RHE / V", "closure", "level"])
def test_an_absent_figure_is_shown_as_absent(head: str) -> None:
    book = changed(
        sample_book(catalysts=("mesh",), levels=(-0.6,)), "summary", lambda row: row | {head: None}
    )
    (table,) = catalyst_tables(book)
    level = table.levels[0]
    assert "-" in (level.current_density, level.total, level.closure, level.name, level.potential) or (
        # the series has a potential of its own
        head == "E vs RHE / V" and level.potential == "-0.599"
    )


def test_every_catalyst_has_its_products_in_the_same_order() -> None:
    book = sample_book(catalysts=("mesh", "foil"))
    # the foil makes fewer products, and its series lists them the other way round
    series = list(book.tables["series"].records())
    foil = [row for row in series if row["catalyst"] == "foil" and row["product"] != "ethane"]
    rows = [row for row in series if row["catalyst"] == "mesh"] + foil[::-1]
    mesh, bare = catalyst_tables(replace(book, tables={**book.tables, "series": Table.of("series", rows)}))
    assert list(bare.products) == [one for one in mesh.products if one[1] != "ethane"]
