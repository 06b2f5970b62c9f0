"""The invented example days: they are what their generator makes, and they can be tallied as they stand."""

from __future__ import annotations

from pathlib import Path

import pytest
from openpyxl import load_workbook
from tests import make_examples
from tests.forward.truth import DayTruth

import coulombook

ROOT = Path(__file__).resolve().parents[2]


def _files(folder: Path) -> set[Path]:
    results = ("results", "README.md")
    return {
        path.relative_to(folder)
        for path in folder.rglob("*")
        if path.is_file() and not any(part in results for part in path.relative_to(folder).parts)
    }


def _cells(path: Path) -> dict[str, list[tuple[object, ...]]]:
    return {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in load_workbook(path)}


def test_example_days_and_calibrations_are_what_the_generator_writes(tmp_path: Path) -> None:
    make_examples.write_calibrations(tmp_path / "calibrations")
    make_examples.write_examples(tmp_path / "example_experiments")
    for name in ("calibrations", "example_experiments"):
        fresh, kept = tmp_path / name, ROOT / name
        assert _files(fresh) == _files(kept)
        for file in sorted(_files(fresh)):
            if file.suffix == ".xlsx":
                # the packing of a workbook depends on the library's version; its cells must not
                assert _cells(fresh / file) == _cells(kept / file), file
            else:
                assert (fresh / file).read_bytes() == (kept / file).read_bytes(), file


def test_example_folder_stays_small() -> None:
    size = sum(
        (ROOT / "example_experiments" / file).stat().st_size for file in _files(ROOT / "example_experiments")
    )
    assert size < 5e6


@pytest.mark.parametrize("name", [make_examples.DAY_A, make_examples.DAY_B])
def test_example_day_says_that_it_is_invented(name: str) -> None:
    assert "# Invented data" in (ROOT / "example_experiments" / name / "day.toml").read_text(encoding="utf-8")


@pytest.fixture(scope="module", params=["a", "b"])
def example(request: pytest.FixtureRequest) -> tuple[DayTruth, coulombook.Book]:
    name, truth = {
        "a": (make_examples.DAY_A, make_examples.day_a),
        "b": (make_examples.DAY_B, make_examples.day_b),
    }[request.param]
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(ROOT)  # calibrations are looked up where the command is given
        return truth(), coulombook.tally(ROOT / "example_experiments" / name)


def test_example_day_has_every_run_and_no_fault(example: tuple[DayTruth, coulombook.Book]) -> None:
    day, book = example
    assert list(book.summary["run"]) == [hold.name for hold in day.holds]
    assert not [one for one in book.findings if one.severity == "stop"]


def test_example_efficiencies_lie_about_the_truth_as_their_uncertainty_says(
    example: tuple[DayTruth, coulombook.Book],
) -> None:
    day, book = example
    truth = {(hold.name, name): 100 * share for hold in day.holds for name, share in hold.efficiency.items()}
    spared = {hold.name for hold in day.holds if hold.leak} | {
        "q1-150"
    }  # mishaps that no declared error covers
    deviations = [
        (row["FE / %"] - truth[(row["run"], row["product"])]) / row["u(FE) / %"]
        for _, row in book.ledger.iterrows()
        if row["run"] not in spared and row["status"] == "quantified"
    ]
    assert len(deviations) > 70
    inside = sum(abs(one) < 2 for one in deviations) / len(deviations)
    # 95 % of a normal variable; deviations of a day share errors of flow and standard, hence the band
    assert inside > 0.85
    assert max(abs(one) for one in deviations) < 5


def test_example_balances_close_except_where_a_mishap_was_drawn(
    example: tuple[DayTruth, coulombook.Book],
) -> None:
    _, book = example
    closure = dict(zip(book.summary["run"], book.summary["closure"], strict=True))
    short = [run for run in ("m2-4", "q1-150") if run in closure]
    assert len(short) == 1
    assert closure[short[0]] == "short"
    closed = sum(one == "closed" for one in closure.values())
    assert closed >= 0.7 * len(closure)


def test_example_findings_name_the_mess_that_was_put_in(example: tuple[DayTruth, coulombook.Book]) -> None:
    day, book = example
    kinds = {one.kind for one in book.findings}
    assert {"left-out", "balance-open", "unread-column"} <= kinds
    if day.outlet_flow == "measured":
        assert "above-calibration" in kinds


def test_example_unused_injection_is_shown_and_not_counted(example: tuple[DayTruth, coulombook.Book]) -> None:
    day, book = example
    spoiled = next(hold for hold in day.holds if hold.spoiled)
    number = next(iter(spoiled.spoiled)) + 1
    rows = book.injections[book.injections["run"] == spoiled.name]
    unused = set(rows.loc[rows["used"] == "no", "injection"].astype(str))
    assert unused == {str(number)}
