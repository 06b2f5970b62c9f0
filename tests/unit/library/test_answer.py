"""What names mean, and what is shown for them."""

from __future__ import annotations

import math
from datetime import date
from pathlib import Path

import pytest
from tests.unit.library.shelves import falling_rows, gas_rows, write_calibration

from coulombook.library.answer import Answer, answer
from coulombook.library.names import UnknownCurve
from coulombook.library.shelf import Library, open_library
from coulombook.species import load_species

ON = date(2043, 5, 1)


@pytest.fixture
def library(tmp_path: Path) -> Library:
    """Ethylene falls by 1 % a month from January; methane and hydrogen are in the last calibration too."""
    for month, slope in ((1, 2.0), (2, 1.98), (3, 1.96), (4, 1.94)):
        rows = gas_rows(slope=slope)
        if month == 4:
            rows += gas_rows("methane", slope=1.0) + gas_rows("methane", "TCD", slope=0.3)
        write_calibration(tmp_path, f"gc-{month}", rows, f"2043-0{month}-01")
    return open_library([tmp_path])


def ask(library: Library, *names: str) -> Answer:
    return answer(library, names, load_species(), ON)


def test_without_a_name_every_calibration_is_listed(library: Library) -> None:
    assert ask(library).listed == ("gc-1", "gc-2", "gc-3", "gc-4")


def test_a_calibration_is_listed_alone(library: Library) -> None:
    assert ask(library, "gc-2").listed == ("gc-2",)


@pytest.mark.parametrize("name", ["ethylene@FID", "C2H4@fid", "Ethene@ FID ", "ethylene"])
def test_a_curve_goes_by_every_name_of_its_analyte(library: Library, name: str) -> None:
    found = ask(library, name)
    assert found.entry is not None
    assert found.entry.full_name == "gc-4/ethylene@FID"  # the newest
    assert found.comparison is not None
    assert len(found.comparison.entries) == 4


def test_a_curve_of_one_calibration_is_shown_without_its_history(library: Library) -> None:
    found = ask(library, "gc-2/C2H4@FID")
    assert found.entry is not None
    assert found.entry.full_name == "gc-2/ethylene@FID"
    assert found.comparison is None


def test_two_calibrations_are_compared_curve_by_curve(library: Library) -> None:
    found = ask(library, "gc-3", "gc-4")
    (pair,) = found.pairs
    assert pair.ratios[0].ratio == pytest.approx(1.94 / 1.96, rel=1e-9)
    assert found.alone == ("gc-4/methane@FID", "gc-4/methane@TCD")


@pytest.mark.parametrize(
    "names",
    [
        ("ethylene@FID", "gc-1", "gc-3"),
        ("gc-1/ethylene@FID", "gc-3/ethylene@FID"),
        ("gc-1/ethylene", "gc-3/C2H4"),
    ],
)
def test_a_curve_at_two_dates_is_compared(library: Library, names: tuple[str, ...]) -> None:
    found = ask(library, *names).comparison
    assert found is not None
    assert found.one_curve
    assert found.ratios[0].ratio == pytest.approx(0.98, rel=1e-9)
    assert found.months(1) == pytest.approx(59 / (365.25 / 12))
    assert found.drift is None  # two dates


def test_the_drift_over_the_months_is_that_of_all_calibrations(library: Library) -> None:
    found = ask(library, "ethylene@FID").comparison
    assert found is not None
    assert found.drift is not None
    # -1.01 % a month of 30.4 days: ln(1.94/2)/(90/30.4375)
    assert found.drift.rate.value == pytest.approx(math.log(0.97) / (90 / 30.4375), rel=0.02)


def test_different_curves_are_compared_but_make_no_drift(library: Library) -> None:
    found = ask(library, "ethylene@FID", "methane@FID").comparison
    assert found is not None
    assert not found.one_curve
    assert found.ratios[0].ratio == pytest.approx(1.0 / 1.94, rel=1e-9)


@pytest.mark.parametrize(
    ("names", "message"),
    [
        (["ethlene@FID"], "no curve 'ethlene@FID'; did you mean 'ethylene@FID'"),
        (["gc-7"], "no curve or calibration 'gc-7'; did you mean 'gc-"),
        (["gc-7/ethylene@FID"], "no calibration 'gc-7'"),
        (["gc-1/methane@FID"], "no curve 'methane@FID'"),
        (["ethylene@TCD"], "no curve 'ethylene@TCD'"),
        (["methane"], "several channels or signals; name one: 'methane@FID', 'methane@TCD'"),
        (["methane@FID", "gc-1", "gc-4"], "calibration 'gc-1' has no curve methane@FID"),
        (["ethylene@FID", "C2H4@FID"], "named twice"),
        (["gc-1", "gc-2", "gc-3"], "one curve at a time"),
        (["ethylene@FID", "methane@FID", "gc-1"], "name curves, or one curve and calibrations"),
        ([""], "no curve or calibration ''"),
        (["@"], "no curve '@'"),
    ],
)
def test_a_name_that_means_nothing_or_too_much_is_refused(
    library: Library, names: list[str], message: str
) -> None:
    with pytest.raises(UnknownCurve) as refused:
        ask(library, *names)
    assert message in str(refused.value)


def test_calibrations_from_one_cylinder_share_its_error(tmp_path: Path) -> None:
    for name, parent in (("gc-1", "C-1"), ("gc-2", "C-1"), ("gc-3", "C-2")):
        write_calibration(tmp_path, name, gas_rows(parent=parent), f"2043-0{name[-1]}-01")
    shelf = open_library([tmp_path])
    same, other = (
        ask(shelf, "ethylene@FID", "gc-1", "gc-2").comparison,
        ask(shelf, "ethylene@FID", "gc-1", "gc-3").comparison,
    )
    assert same is not None
    assert other is not None
    assert (same.shared, other.shared) == (("C-1",), ())
    # 0.5 % from each of two cylinders, or from none
    assert other.ratios[0].log.u ** 2 - same.ratios[0].log.u ** 2 == pytest.approx(2 * 0.005**2, rel=0.01)


def test_a_curve_that_cannot_be_fitted_is_an_answer_with_a_fault(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc-1", falling_rows())
    write_calibration(tmp_path, "gc-2", gas_rows())
    shelf = open_library([tmp_path])
    curves = ["gc-1/ethylene@FID"], ["gc-1", "gc-2"], ["ethylene@FID", "gc-1", "gc-2"], ["ethylene@FID"], []
    for names in curves:
        assert [one.kind for one in ask(shelf, *names).findings] == ["broken-curve"]
    shown = ask(shelf, "ethylene@FID").entry
    assert shown is not None
    assert shown.calibration.name == "gc-2"  # of the same date, and the one there is
