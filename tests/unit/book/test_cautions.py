"""Concentrations of the outlet beside published limits."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from tests.faults.day import add, write_day

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
    assert len(safety_sources()) == 5
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


def _rows(folder: Path) -> dict[object, dict[str, object]]:
    return {row["substance"]: dict(row) for row in tally(folder).tables["cautions"].records()}


def test_a_product_without_a_limit_still_burns(tmp_path: Path) -> None:
    changes = {
        "gas.csv": add("a2,1,1800,FID,dimethyl ether,60\n"),
        "day.toml": add('\n[species."dimethyl ether"]\nformula = "C2H6O"\nphase = "gas"\n'),
        "calibrations/gases/standards.csv": add(
            "FID,dimethyl ether,20,4.1\nFID,dimethyl ether,100,19.8\nFID,dimethyl ether,300,60.1\n"
        ),
    }
    rows = _rows(write_day(tmp_path, changes))
    ether = rows["dimethyl ether"]
    assert ether["highest / ppm"] == pytest.approx(300, rel=0.01)
    assert ether["lower flammable limit / %"] is None
    # by hand: hydrogen 1380 ppm of 4 %, CO 1060 ppm of 10.9 %, ethylene 115 ppm of 2.3 %, and 300 ppm of the lowest of
    # all limits, butane's 1.4 % (IEC 60079-20-1, from memory)
    together = 100 * (1380e-6 / 0.04 + 1060e-6 / 0.109 + 115e-6 / 0.023 + 300e-6 / 0.014)
    assert rows["all together"]["of flammable limit / %"] == pytest.approx(together, rel=0.02)


def test_propane_counts_with_its_own_limit(tmp_path: Path) -> None:
    changes = {
        "gas.csv": add("a2,1,1800,FID,propane,60\n"),
        "calibrations/gases/standards.csv": add(
            "FID,propane,20,4.1\nFID,propane,100,19.8\nFID,propane,300,60.1\n"
        ),
    }
    propane = _rows(write_day(tmp_path, changes))["propane"]
    assert propane["lower flammable limit / %"] == pytest.approx(1.7)
    assert propane["of flammable limit / %"] == pytest.approx(100 * 300e-6 / 0.017, rel=0.01)


def test_a_peak_above_what_its_curve_reaches_is_not_taken_for_nothing(tmp_path: Path) -> None:
    # an unused peak beyond the vertex of a curve that bends down: its mole fraction is at least that of the vertex
    standards = "".join(
        f"TCD,hydrogen,{x * 1e4:g},{1000 * x - 40 * x**2:g}\n" for x in (0.02, 0.1, 0.5, 1, 2, 4, 8)
    )
    changes = {
        "gas.csv": lambda text: (
            text.replace("peak area\n", "peak area,use\n")
            .replace("hydrogen,69\n", "hydrogen,9000,no\n")
            .replace("hydrogen,70\n", "hydrogen,70,\n")
        ),
        "calibrations/gases/standards.csv": lambda text: (
            "".join(line for line in text.splitlines(keepends=True) if "hydrogen" not in line) + standards
        ),
        "calibrations/gases/calibration.toml": add('\n[curve."hydrogen@TCD"]\nform = "quadratic"\n'),
    }
    hydrogen = _rows(write_day(tmp_path, changes))["hydrogen"]
    # y = 1000 x - 40 x^2 with x in percent has its vertex at 12.5 %
    assert hydrogen["highest / ppm"] == pytest.approx(125_000, rel=0.01)
    assert (hydrogen["run"], hydrogen["injection"]) == ("a2", "1")


def test_what_is_below_detection_keeps_its_row_and_its_reading(tmp_path: Path) -> None:
    def faint(text: str) -> str:
        return text.replace("CO,105", "CO,0.6").replace("CO,104", "CO,0.5").replace("CO,106", "CO,0.4")

    book = tally(write_day(tmp_path, {"gas.csv": faint}))
    status = {row["status"] for row in book.tables["ledger"].records() if row["product"] == "carbon monoxide"}
    assert status == {"below detection"}
    injections = [row for row in book.tables["injections"].records() if row["product"] == "carbon monoxide"]
    row = next(one for one in book.tables["cautions"].records() if one["substance"] == "carbon monoxide")
    assert row["highest / ppm"] == pytest.approx(max(one["mole fraction / ppm"] for one in injections))
    assert row["times exposure limit"] == pytest.approx(row["highest / ppm"] / 35.0)
