"""The command `coulombook curves`: exit status, streams, files."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
from tests.unit.intake.conftest import MINIATURE
from tests.unit.library.shelves import falling_rows, gas_rows, write_calibration

from coulombook.cli import main


@pytest.fixture
def shelf(tmp_path: Path) -> Path:
    folder = tmp_path / "shelf"
    write_calibration(folder, "gc-1", gas_rows(), "2043-01-01")
    write_calibration(folder, "gc-2", gas_rows(slope=1.9), "2043-04-01")
    return folder


def call(shelf: Path, *arguments: str) -> int:
    return main(["curves", *arguments, "--calibrations", str(shelf)])


def test_curves_lists_and_compares_with_status_0(shelf: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert call(shelf) == 0
    assert capsys.readouterr().out.count("ethylene@FID") == 2
    assert call(shelf, "gc-1", "gc-2") == 0
    assert "gc-2 against gc-1" in capsys.readouterr().out
    assert call(shelf, "C2H4@FID", "--on", "2043-05-01") == 0
    printed = capsys.readouterr()
    assert "valid on 2043-05-01" in printed.out
    assert printed.err == ""


def test_the_folder_calibrations_is_the_default(
    shelf: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    shelf.rename(shelf.parent / "calibrations")
    monkeypatch.chdir(shelf.parent)
    assert main(["curves"]) == 0
    assert "gc-1" in capsys.readouterr().out


def test_a_figure_is_written_and_named(
    shelf: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    target = tmp_path / "ethylene.svg"
    assert call(shelf, "gc-1/ethylene@FID", "--figure", str(target)) == 0
    assert f"Drawn into {target}" in capsys.readouterr().out
    assert "ethylene@FID, gc-1" in target.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--on", "yesterday"], "--on takes a date such as 2043-05-18, not 'yesterday'"),
        (["ethlene@FID"], "did you mean 'ethylene@FID'?"),
        (["ethylene@FID", "--figure", "c.bmp"], "'c.bmp' has another ending"),
        (["ethylene@FID", "--figure", "nowhere/c.svg"], "folder of the figure, 'nowhere', does not exist"),
        (["--figure", "c.svg"], "--figure draws one curve"),
        (["gc-1", "gc-2", "--figure", "c.svg"], "--figure draws one curve"),
        (["ethylene@FID", "--checks", "nowhere"], "the folder of the day, 'nowhere', does not exist"),
        (["--figur", "c.svg"], "did you mean '--figure'?"),
    ],
)
def test_a_wrong_call_ends_with_status_2(
    shelf: Path,
    arguments: list[str],
    message: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(shelf.parent)
    assert call(shelf, *arguments) == 2
    printed = capsys.readouterr()
    assert message in printed.err
    assert printed.out == ""
    assert [one.name for one in shelf.parent.iterdir()] == ["shelf"]


def test_a_folder_without_calibrations_ends_with_status_2(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert call(tmp_path) == 2
    assert "there are no calibrations in" in capsys.readouterr().err
    assert call(tmp_path / "gone") == 2
    assert "the folder of the calibrations" in capsys.readouterr().err


def test_a_broken_calibration_ends_the_list_with_status_1(
    shelf: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    write_calibration(shelf, "bad", ["FID,ethylene,10,many,,"])
    assert call(shelf) == 1
    printed = capsys.readouterr()
    assert printed.out.count("ethylene@FID") == 2
    assert "error[not-a-number]: bad/standards.csv, row 2" in printed.err
    assert call(shelf, "ethylene@FID") == 0  # the others are as good as before
    assert call(shelf, "methane@FID") == 2
    assert "error[not-a-number]" in capsys.readouterr().err  # it may be there


def test_a_curve_that_is_none_ends_with_status_1(
    shelf: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    write_calibration(shelf, "gc-3", falling_rows())
    assert call(shelf, "gc-3/ethylene@FID", "--figure", str(tmp_path / "c.svg")) == 1
    assert "error[broken-curve]" in capsys.readouterr().err
    assert not (tmp_path / "c.svg").exists()


def test_the_checks_of_a_day_are_charted(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    day = tmp_path / "a day"
    for name, text in MINIATURE.items():
        (day / name).parent.mkdir(parents=True, exist_ok=True)
        (day / name).write_text(text, encoding="utf-8")
    rows = "at,channel,analyte,mole fraction / ppm,peak area\n2043-05-01T08:00,FID,C2H4,100,20.4\n"
    (day / "checks.csv").write_text(rows, encoding="utf-8")
    heads, run = MINIATURE["runs.csv"].splitlines()
    (day / "runs.csv").write_text(f"{heads},started\n{run},2043-05-01T08:10\n", encoding="utf-8")
    # standards of the miniature day lie on their line exactly: give them some scatter
    standards = day / "calibrations" / "mini" / "standards.csv"
    standards.write_text(standards.read_text(encoding="utf-8") + "FID,ethylene,500,101\n", encoding="utf-8")
    assert call(day / "calibrations", "ethylene@FID", "--checks", str(day)) == 0
    printed = capsys.readouterr().out
    assert "checks of ethylene@FID in a day, against mini" in printed
    assert "2043-05-01 08:00" in printed
    assert call(day / "calibrations", "CO@FID", "--checks", str(day)) == 2
    assert "no check injection of carbon monoxide@FID" in capsys.readouterr().err
    assert call(day / "calibrations", "--checks", str(day)) == 2
    assert "--checks charts one curve" in capsys.readouterr().err
    (day / "runs.csv").write_text("run\na1\n", encoding="utf-8")
    assert call(day / "calibrations", "ethylene@FID", "--checks", str(day)) == 1
    assert "error[missing-column]" in capsys.readouterr().err


def test_nothing_is_drawn_with_matplotlib_unless_a_figure_is_asked_for(shelf: Path) -> None:
    code = (
        "import sys; from coulombook.cli import main; "
        f"assert main(['curves', 'ethylene@FID', '--calibrations', {str(shelf)!r}]) == 0; "
        "assert not {'matplotlib', 'pandas', 'scipy.stats'} & set(sys.modules)"
    )
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60, capture_output=True)
