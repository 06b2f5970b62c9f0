"""Invented books for figures: the sample of the report's tests with partial currents, and odd ones."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence

from tests.unit.report.sample import PRODUCTS, sample_book

from coulombook.book import Book, Table

HOSTILE = (
    r"$\frac{1}{0}$",
    "<script>alert(1)</script>",
    "two\nlines",
    "right\u202eto left",
    "=cmd|' /C calc'!A0",
    "../../x",
    "a" * 5000,
    "100 % & more",
    "\N{TEST TUBE}\N{MICROSCOPE}",
    "bell\x07",
)
Product = tuple[str, str, str, int, float]


def book(
    catalysts: Sequence[str] = ("annealed copper mesh", "silver foam"),
    levels: Sequence[float] = (-0.62, -0.85, -1.05),
    products: Sequence[Product] = PRODUCTS,
    replicates: int = 1,
) -> Book:
    """Partial currents follow the shares: j = FE x 3 mA/cm^2 x 2^(10 (-0.7 V - E))."""
    made = sample_book(catalysts, levels, products, replicates)
    rows = []
    for row in made.tables["series"].records():
        share, potential = row["FE / %"], row["E vs RHE / V"]
        assert isinstance(share, float)
        assert isinstance(potential, float)
        j = share / 100.0 * 3.0 * 2.0 ** (-10.0 * (potential + 0.7))
        rows.append(row | {"j / mA cm^-2": j, "u(j) / mA cm^-2": 0.05 * abs(j),
                           "j real / mA cm^-2": j / 60.0, "u(j real) / mA cm^-2": 1.2 * abs(j) / 60.0})  # fmt: skip
    return dataclasses.replace(made, tables=dict(made.tables) | {"series": Table.of("series", rows)})


def hostile_book() -> Book:
    """Every name of the day would do harm if it were obeyed."""
    products = [(name, "C2", "gas", 12, 9.0) for name in HOSTILE]
    made = book(HOSTILE[:4], (-0.7, -0.9), products)
    tables = dict(made.tables)
    rows = [
        row | {"run": f"{row['run']} {HOSTILE[place % len(HOSTILE)]} {place}"}
        for place, row in enumerate(tables["summary"].records())
    ]
    return dataclasses.replace(made, tables=tables | {"summary": Table.of("summary", rows)})


def odd_books() -> dict[str, Book]:
    """Days that are unlike the usual one."""
    many = [(f"product {number:02d}", f"C{number % 6 + 1}", "gas", 2, 100.0 / 40.0) for number in range(40)]
    names = [
        (f"{number} an exceedingly long trade name of a product", "C2", "gas", 12, 20.0)
        for number in range(5)
    ]
    return {
        "usual": book(),
        "one run": book(["one"], [-0.8]),
        "one catalyst": book(["one"]),
        "many products": book(["one"], products=many),
        "long names": book(
            ["a catalyst whose name goes on and on until nobody reads it any more"], products=names
        ),
        "no gas": book(products=[one for one in PRODUCTS if one[2] == "liquid"]),
        "negative": book(products=[("hydrogen", "H2", "gas", 2, -12.0), ("ethylene", "C2", "gas", 12, 60.0)]),
        "far over": book(products=[("hydrogen", "H2", "gas", 2, 80.0), ("ethylene", "C2", "gas", 12, 90.0)]),
        "many levels": book(["one"], [-0.4 - 0.03 * number for number in range(24)]),
        "many runs": book(
            [f"c{number}" for number in range(9)], [-0.4 - 0.03 * one for one in range(22)], PRODUCTS[:2]
        ),
        "hostile": hostile_book(),
    }
