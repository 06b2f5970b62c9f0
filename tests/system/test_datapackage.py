"""The description of a results folder, read by the reference implementation of the standard (`frictionless`)."""

from __future__ import annotations

import warnings
from pathlib import Path

import pytest

import coulombook
from coulombook.book import TABLES
from coulombook.report.results import write_results

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # of packages it stands on, none of ours
    import frictionless

ROOT = Path(__file__).resolve().parents[2]
DAY = ROOT / "example_experiments" / "2043-05-18-mesh-foil-foam"


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("day") / "results"
    return write_results(coulombook.tally(DAY, calibrations=[ROOT / "calibrations"], draws=200), out)


@pytest.mark.filterwarnings("ignore")
def test_folder_is_valid_by_the_standard(results: Path) -> None:
    report = frictionless.validate(str(results / "datapackage.json"))
    assert report.valid, report.flatten(["type", "message"])
    assert {task.name for task in report.tasks} == set(TABLES)


@pytest.mark.filterwarnings("ignore")
def test_a_table_that_was_changed_afterwards_is_found(results: Path, tmp_path: Path) -> None:
    for file in results.iterdir():
        (tmp_path / file.name).write_bytes(file.read_bytes())
    summary = tmp_path / "summary.csv"
    summary.write_bytes(summary.read_bytes().replace(b"closed", b"clos3d", 1))
    report = frictionless.validate(str(tmp_path / "datapackage.json"))
    assert [kind for (kind,) in report.flatten(["type"])] == ["hash-count"]


@pytest.mark.filterwarnings("ignore")
def test_numbers_come_back_as_they_were_written(results: Path) -> None:
    package = frictionless.Package(str(results / "datapackage.json"))
    book = coulombook.tally(DAY, calibrations=[ROOT / "calibrations"])
    read = package.get_resource("ledger").read_rows()
    assert [float(row["FE / %"]) for row in read] == book.tables["ledger"].column("FE / %")
