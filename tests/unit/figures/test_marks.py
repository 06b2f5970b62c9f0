"""Colours, hatches and markers, and the ids of marks."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from coulombook.figures.marks import mark_id, style_of_product, styles_of_catalysts
from coulombook.species import load_species

NO_PRODUCTS = {"water", "oxygen", "carbon dioxide", "nitrogen", "argon", "helium"}


def products() -> list[str]:
    species = load_species()
    found = {one.name for name in species.names() if (one := species.find(name)) is not None}
    return sorted(found - NO_PRODUCTS)


def test_every_product_of_the_shipped_table_differs_from_every_other_in_a_bar_and_as_a_point() -> None:
    styles = [style_of_product(name) for name in products()]
    assert len(styles) > 30
    assert len({(one.colour, one.hatch) for one in styles}) == len(styles)
    assert len({(one.colour, one.marker) for one in styles}) == len(styles)


def test_the_products_of_most_days_differ_without_any_colour() -> None:
    usual = (
        "hydrogen", "carbon monoxide", "methane", "formate", "methanol", "ethylene", "ethane", "ethanol", "acetate",
        "acetaldehyde", "n-propanol", "allyl alcohol", "propionaldehyde", "acetone", "propylene",
    )  # fmt: skip
    assert len({style_of_product(name).hatch for name in usual}) == len(usual)
    assert len({style_of_product(name).marker for name in usual}) == len(usual)


def test_nothing_but_hydrogen_is_drawn_without_a_hatch() -> None:
    names = [*products(), *(f"unknown {number}" for number in range(300))]
    assert [name for name in names if not style_of_product(name).hatch] == ["hydrogen"]


def test_unknown_products_spread_over_many_styles_and_keep_off_those_of_known_ones() -> None:
    styles = [style_of_product(f"unknown {number}") for number in range(300)]
    known = {(one.colour, one.hatch) for one in map(style_of_product, products())}
    found = {(one.colour, one.hatch) for one in styles}
    assert not found & known
    # 300 names thrown into some 80 pairs leave hardly one empty (expected share of empty ones e^-3.75, 2 %)
    assert len(found) > 60


@given(st.text())
def test_a_product_of_any_name_has_always_the_same_style(name: str) -> None:
    assert style_of_product(name) == style_of_product(str(name))


@given(st.lists(st.text(), min_size=1, max_size=4), st.lists(st.text(), min_size=1, max_size=4))
def test_ids_are_the_same_only_for_the_same_parts(one: list[str], other: list[str]) -> None:
    assert (mark_id(*one) == mark_id(*other)) == (one == other)


@given(st.text(st.characters(codec=None), min_size=1))
def test_an_id_holds_nothing_that_a_document_would_take_for_more_than_a_letter(name: str) -> None:
    assert all(sign.isascii() and (sign.isalnum() or sign in "%:_.-~") for sign in mark_id("fe", name))


@pytest.mark.parametrize("count", [1, 7, 8, 40])
def test_catalysts_of_a_book_differ_from_each_other(count: int) -> None:
    styles = styles_of_catalysts([f"c{number}" for number in range(count)])
    assert len({(one.colour, one.marker) for one in styles.values()}) == count
