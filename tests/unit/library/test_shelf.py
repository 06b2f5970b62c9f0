"""Calibrations in folders: which are found, what is said of them."""

from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest
from tests.unit.library.shelves import GAS_HEAD, falling_rows, gas_rows, write_calibration

from coulombook.library.shelf import Library, Validity, Verdict, newest, open_library, validity


def test_every_calibration_of_every_folder_is_found_once(tmp_path: Path) -> None:
    here, there = tmp_path / "here", tmp_path / "there"
    write_calibration(here, "gc-b", gas_rows())
    write_calibration(here, "gc-a", gas_rows() + gas_rows("methane", slope=1.0))
    write_calibration(there, "gc-a", gas_rows("ethane"))  # hidden by the first of its name
    (here / "photographs").mkdir()
    (here / "notes.txt").write_text("x", encoding="utf-8")
    found = open_library([here, there])
    assert [one.full_name for one in found.entries] == [
        "gc-a/ethylene@FID",
        "gc-a/methane@FID",
        "gc-b/ethylene@FID",
    ]
    assert found.broken == ()
    assert found.findings == ()


def test_a_broken_calibration_is_named_and_hides_no_other(tmp_path: Path) -> None:
    write_calibration(tmp_path, "good", gas_rows())
    write_calibration(tmp_path, "bad", ["FID,ethylene,10,many,,"])
    (tmp_path / "half").mkdir()
    (tmp_path / "half" / "standards.csv").write_text(GAS_HEAD, encoding="utf-8")
    found = open_library([tmp_path])
    assert [one.name for one in found.calibrations] == ["good"]
    assert found.broken == ("bad", "half")
    assert {one.kind for one in found.findings} == {"not-a-number", "missing-file"}
    assert {one.where.partition("/")[0] for one in found.findings} == {"bad", "half"}


def test_a_link_out_of_the_folder_is_not_followed(tmp_path: Path) -> None:
    write_calibration(tmp_path / "elsewhere", "gc", gas_rows())
    (tmp_path / "shelf").mkdir()
    (tmp_path / "shelf" / "gc").symlink_to(tmp_path / "elsewhere" / "gc")
    found = open_library([tmp_path / "shelf"])
    assert found.entries == ()
    assert [one.kind for one in found.findings] == ["outside-folder"]


def library(tmp_path: Path, rows: list[str], curve: str = 'form = "line"\nweights = "1/x^2"') -> Library:
    write_calibration(tmp_path, "gc", rows, curve=curve)
    return open_library([tmp_path])


@pytest.mark.parametrize(
    ("rows", "curve", "verdict"),
    [
        (gas_rows(), 'form = "line"\nweights = "1/x^2"', Verdict.SOUND),
        (gas_rows()[:1] + gas_rows()[2:3], 'form = "line"', Verdict.UNKNOWN),
        # one degree of freedom, no repeats: no test has anything to go by
        (gas_rows()[:1] + gas_rows()[2:3] + gas_rows()[4:5], 'form = "line"', Verdict.UNTESTED),
        (falling_rows(), 'form = "line"', Verdict.NO_CURVE),
        # a line through points of a square root: replicates within 0.1 %, levels off by much more
        (
            [f"FID,ethylene,{x},{1000 * x**0.5 * w:.6g},," for x in (1, 4, 9, 16) for w in (0.999, 1.001)],
            'form = "line"',
            Verdict.MISFIT,
        ),
        (
            [
                f"FID,ethylene,{x},{y},,"
                for x, y in enumerate((1.01, 1.98, 3.01, 3.99, 8.0, 6.01, 6.98, 8.01, 9.0), 1)
            ],
            'form = "line"',
            Verdict.OUTLIER,
        ),
        ([f"FID,ethylene,{x},{100 * x - x * x},," for x in range(1, 9)], 'form = "line"', Verdict.BENDS),
        # scatter of 0.5 % over three decades, weighted equally
        (gas_rows() * 2, 'form = "line through zero"\nweights = "equal"', Verdict.UNEVEN),
    ],
)
def test_the_verdict_is_the_gravest_thing_there_is(
    tmp_path: Path, rows: list[str], curve: str, verdict: Verdict
) -> None:
    assert [one.verdict for one in library(tmp_path, rows, curve).entries] == [verdict]


def test_a_borrowed_curve_says_so(tmp_path: Path) -> None:
    found = library(
        tmp_path, gas_rows(), 'form = "line"\nweights = "1/x^2"\n[curve."ethane@FID"]\nlike = "ethylene@FID"'
    )
    assert {one.name: one.verdict for one in found.entries} == {
        "ethylene@FID": Verdict.SOUND,
        "ethane@FID": Verdict.BORROWED,
    }


def test_a_curve_that_cannot_be_fitted_keeps_its_fault(tmp_path: Path) -> None:
    (entry,) = library(tmp_path, falling_rows()).entries
    assert entry.curve is None
    assert [one.kind for one in entry.findings] == ["broken-curve"]


def test_validity_ends_with_the_last_valid_day(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", gas_rows(), "2043-01-01", "2043-07-01")
    write_calibration(tmp_path, "open", gas_rows(), "2043-01-01", "")
    ends, endless = open_library([tmp_path]).calibrations
    assert validity(ends, date(2042, 12, 31)) is Validity.NOT_YET
    assert validity(ends, date(2043, 1, 1)) is Validity.VALID
    assert validity(ends, date(2043, 7, 1)) is Validity.VALID
    assert validity(ends, date(2043, 7, 2)) is Validity.EXPIRED
    assert validity(endless, date(2099, 1, 1)) is Validity.NO_END


def test_the_newest_valid_calibration_is_preferred_to_a_newer_one_that_is_not(tmp_path: Path) -> None:
    write_calibration(tmp_path, "a", gas_rows(), "2043-01-01", "2043-07-01")
    write_calibration(tmp_path, "b", gas_rows(), "2043-03-01", "2043-09-01")
    write_calibration(tmp_path, "c", gas_rows(), "2043-06-01", "2043-12-01")
    entries = open_library([tmp_path]).entries
    assert newest(entries, date(2043, 5, 1)).calibration.name == "b"
    assert newest(entries, date(2043, 6, 2)).calibration.name == "c"
    assert newest(entries, date(2050, 1, 1)).calibration.name == "c"
