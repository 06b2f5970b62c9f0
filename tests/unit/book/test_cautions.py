"""Concentrations of the outlet beside published limits."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from coulombook import tally
from coulombook.book.cautions import flammable_share, safety_limits, safety_sources

EXAMPLES = Path(__file__).parents[3] / "example_experiments"


def test_of_two_limits_the_more_cautious_one_is_taken() -> None:
    # NFPA 497 says 12.5 %, IEC 60079-20-1 10.9 %; OSHA 50 ppm, NIOSH 35 ppm, ceiling 200 ppm, IDLH 1200 ppm
    limits = safety_limits()["carbon monoxide"]
    assert limits.lower_flammable == pytest.approx(0.109, abs=1e-12)
    assert (limits.exposure_ppm, limits.ceiling_ppm, limits.danger_ppm) == (35.0, 200.0, 1200.0)


def test_a_substance_of_one_list_alone_has_no_limit_of_the_other() -> None:
    assert safety_limits()["hydrogen"].exposure_ppm is None
    assert safety_limits()["carbon dioxide"].lower_flammable is None


def test_gases_burn_together_by_le_chatelier() -> None:
    # by hand: 0.02/0.04 + 0.01/0.05 = 0.7; the second mixture 0.01/0.04 = 0.25; what does not burn adds nothing
    share = flammable_share(
        np.array([0.02, 0.01, 0.5, 0.01]), np.array([0.04, 0.05, np.nan, 0.04]), np.array([0, 0, 0, 1])
    )
    assert share == pytest.approx([0.7, 0.25], abs=1e-12)


def test_a_mixture_whose_limit_le_chatelier_gives_reaches_its_limit_exactly() -> None:
    # a blend of 80 % methane (5 %), 15 % ethane (3 %), 5 % propane (2.1 %) has the limit
    # 100 / (80/5 + 15/3 + 5/2.1) = 4.28 %: a common worked example of the rule (from memory, no page)
    parts, limits = np.array([0.80, 0.15, 0.05]), np.array([0.05, 0.03, 0.021])
    blend = 1.0 / float((parts / limits).sum())
    assert blend == pytest.approx(0.0428, abs=0.00005)
    assert flammable_share(parts * blend, limits, np.zeros(3, dtype=int)) == pytest.approx([1.0], abs=1e-12)


def test_a_negative_reading_takes_nothing_off() -> None:
    share = flammable_share(np.array([-0.02, 0.01]), np.array([0.04, 0.05]), np.array([0, 0]))
    assert share == pytest.approx([0.2], abs=1e-12)


def test_every_source_has_its_year() -> None:
    assert len(safety_sources()) == 4
    assert all(any(str(year) in one for year in range(2000, 2030)) for one in safety_sources())


@pytest.fixture(scope="module")
def book() -> object:
    return tally(EXAMPLES / "2043-06-02-gas-diffusion", calibrations=[EXAMPLES.parent / "calibrations"])


def test_the_highest_reading_of_the_day_stands_beside_its_limit(book: object) -> None:
    tables = book.tables  # type: ignore[attr-defined] # a Book; fixtures are untyped
    rows = {row["substance"]: row for row in tables["cautions"].records()}
    injections = list(tables["injections"].records())
    highest = max(
        (row for row in injections if row["product"] == "carbon monoxide"),
        key=lambda row: row["mole fraction / ppm"],
    )
    carbon_monoxide = rows["carbon monoxide"]
    assert carbon_monoxide["highest / ppm"] == pytest.approx(highest["mole fraction / ppm"], rel=1e-12)
    assert (carbon_monoxide["run"], carbon_monoxide["injection"]) == (highest["run"], highest["injection"])
    assert carbon_monoxide["times exposure limit"] == pytest.approx(
        carbon_monoxide["highest / ppm"] / 35.0, rel=1e-12
    )
    assert rows["carbon dioxide"]["highest / ppm"] is None
    assert next(iter(rows)) == "all together"


def test_what_burns_together_is_at_least_each_part_of_it(book: object) -> None:
    rows = list(book.tables["cautions"].records())  # type: ignore[attr-defined] # a Book; fixtures are untyped
    together, *alone = [
        row["of flammable limit / %"] for row in rows if row["of flammable limit / %"] is not None
    ]
    assert together >= max(alone)
