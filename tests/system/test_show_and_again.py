"""Results are read back as they were written, shown, and made again to the bit."""

from __future__ import annotations

import json
import math
import os
import re
import shutil
import subprocess
from pathlib import Path

import pytest

import coulombook
from coulombook.book import TABLES, Table
from coulombook.cli import DONE, FAULTS, WRONG_CALL, main
from coulombook.report.rerun import table_difference
from coulombook.report.results import write_results
from coulombook.report.stored import StoredError, open_results, read_book
from coulombook.report.table_view import print_plain

ROOT = Path(__file__).resolve().parents[2]
DAY = ROOT / "example_experiments" / "2043-05-18-mesh-foil-foam"
CALIBRATIONS = ["--calibrations", str(ROOT / "calibrations")]


@pytest.fixture(scope="module")
def tallied(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A day folder with results of its tables."""
    day = tmp_path_factory.mktemp("bench") / "day"
    shutil.copytree(DAY, day, ignore=shutil.ignore_patterns("results"))
    assert main(["tally", str(day), "--quiet", "--tables-only", *CALIBRATIONS]) == DONE
    return day


@pytest.fixture
def day(tallied: Path, tmp_path: Path) -> Path:
    """A copy that a test may change."""
    shutil.copytree(tallied, tmp_path / "day")
    return tmp_path / "day"


def test_the_book_comes_back_as_it_was_written(tallied: Path) -> None:
    book = coulombook.tally(tallied, calibrations=[ROOT / "calibrations"])
    stored = read_book(open_results(tallied))
    assert stored.day == book.day
    assert stored.title == book.title
    for name, table in book.tables.items():
        assert stored.tables[name].heads == table.heads
        assert table_difference(table, stored.tables[name]) is None, name
    assert [one.kind for one in stored.findings] == [one.kind for one in book.findings]
    assert [(one.path, one.sha256) for one in stored.inputs] == [
        (one.path, one.sha256) for one in book.inputs
    ]


def test_texts_that_a_spreadsheet_would_run_come_back_unguarded(tmp_path: Path) -> None:
    rows = [{"run": "=1+1", "catalyst": "'=x", "total FE / %": 99.5, "closure": "closed"}]
    tables = {name: Table.of(name, rows if name == "summary" else []) for name in TABLES}
    write_results(coulombook.Book("day", "", tables, (), (), {}), tmp_path / "results", tables_only=True)
    assert read_book(open_results(tmp_path)).tables["summary"].rows == tables["summary"].rows


def test_show_prints_the_day_as_the_tally_did(tallied: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["tally", str(tallied), "--tables-only", *CALIBRATIONS]) == DONE
    printed = capsys.readouterr().out
    assert main(["show", str(tallied)]) == DONE
    assert capsys.readouterr().out == printed


@pytest.mark.parametrize("columns", ["80", "120"])
def test_show_tells_one_run_within_the_width(
    tallied: Path, columns: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    assert main(["show", str(tallied / "results"), "--run", "m1-3"]) == DONE
    out = capsys.readouterr().out
    assert max(map(len, out.splitlines())) <= int(columns)
    summary = next(
        row for row in read_book(open_results(tallied)).tables["summary"].records() if row["run"] == "m1-3"
    )
    assert f"total FE              {summary['total FE / %']:.1f}(" in out
    for words in ("ethylene", "injections", "The variance of its total FE comes from", "below-calibration"):
        assert words in out
    assert "m2-1" not in out


@pytest.mark.parametrize("name", [one for one in TABLES if one not in ("spectra", "findings")])
def test_show_prints_every_table_at_80_columns(
    tallied: Path, name: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    assert main(["show", str(tallied), "--table", name]) == DONE
    out = capsys.readouterr().out
    table = read_book(open_results(tallied)).tables[name]
    heads = [head for head in table.heads if any(cell is not None for cell in table.column(head))]
    words = out.split()
    for head in heads:
        assert set(head.partition(" / ")[0].split()) <= set(words), head


def test_plain_lines_hold_the_table_in_full(tallied: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["show", str(tallied), "--plain", "--run", "m1-3"]) == DONE
    lines = [line.split("\t") for line in capsys.readouterr().out.splitlines()]
    ledger = read_book(open_results(tallied)).tables["ledger"]
    assert tuple(lines[0]) == ledger.heads
    expected = [row for row in ledger.records() if row["run"] == "m1-3"]
    place = ledger.heads.index("FE / %")
    assert [float(line[place]) for line in lines[1:]] == [row["FE / %"] for row in expected]


def test_a_plain_tally_prints_its_summary_for_programs(
    tallied: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = ["--out", str(tmp_path / "out")]
    assert main(["tally", str(tallied), "--plain", "--tables-only", *out, *CALIBRATIONS]) == DONE
    tally = capsys.readouterr().out
    assert main(["show", str(tallied), "--plain"]) == DONE
    assert capsys.readouterr().out == tally
    assert len(tally.splitlines()) == 31


def test_bar_of_the_runs_shows_what_the_charge_became(
    tallied: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    assert main(["show", str(tallied)]) == DONE
    runs = capsys.readouterr().out.partition("\nruns\n")[2].partition("\n\n")[0].splitlines()
    assert max(map(len, runs)) <= 80
    summary = {row["run"]: row for row in read_book(open_results(tallied)).tables["summary"].records()}
    for line in runs[3:]:
        if line:
            row = summary[line.split()[0]]
            for sign, head in zip(_signs(line), ("H2 FE / %", "C1 FE / %", "C2+ FE / %"), strict=True):
                share = row[head]
                assert isinstance(share, float)
                # two ends of a stretch, each rounded to a sixteenth of the charge
                assert abs(sign - 16 * share / 100) <= 1.0


def _signs(line: str) -> list[int]:
    shades = [line.count(sign) for sign in "\u2591\u2592\u2588"]
    return shades if sum(shades) else [line.count(sign) for sign in "hc#"]


def test_a_break_within_a_text_does_not_part_a_plain_line(capsys: pytest.CaptureFixture[str]) -> None:
    import sys

    print_plain(Table.of("findings", [{"severity": "warn", "text": "two\tparts\nof it"}]), sys.stdout)
    assert len({len(line.split("\t")) for line in capsys.readouterr().out.splitlines()}) == 1


def test_show_names_what_it_does_not_find(
    tallied: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    for arguments, words in (
        (["show", str(tallied), "--run", "m1-33"], "has no run|have no run 'm1-33'; did you mean"),
        (["show", str(tallied), "--table", "legder"], "did you mean 'ledger'"),
        (["show", str(tmp_path)], "there are no results in"),
        (["show", str(tmp_path / "nowhere")], "does not exist"),
    ):
        assert main(arguments) == WRONG_CALL
        assert re.search(words, capsys.readouterr().err)


def test_a_changed_table_is_named_and_still_shown(day: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with open(day / "results" / "series.csv", "ab") as stream:
        stream.write(b"\n")
    (day / "results" / "carbon.csv").unlink()
    assert open_results(day).changed == ("series.csv",)
    assert open_results(day).missing == ("carbon.csv",)


def test_a_table_that_is_no_table_is_refused(day: Path) -> None:
    (day / "results" / "series.csv").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(StoredError, match=r"series\.csv' cannot be read as a table"):
        read_book(open_results(day))


def test_again_finds_everything_as_it_was(tallied: Path, capsys: pytest.CaptureFixture[str]) -> None:
    before = {path: path.read_bytes() for path in tallied.rglob("*") if path.is_file()}
    assert main(["again", str(tallied), *CALIBRATIONS]) == DONE
    assert "the same to the bit" in capsys.readouterr().out
    assert {path: path.read_bytes() for path in tallied.rglob("*") if path.is_file()} == before


def test_again_repeats_draws_with_their_seed(day: Path, capsys: pytest.CaptureFixture[str]) -> None:
    options = ["--quiet", "--tables-only", "--draws", "300", "--seed", "11", "--reconcile", *CALIBRATIONS]
    assert main(["tally", str(day), *options]) == DONE
    assert main(["again", str(day)]) == DONE
    assert "These results stand." in capsys.readouterr().out


def test_again_needs_no_option_where_the_calibrations_were_named(day: Path) -> None:
    manifest = json.loads((day / "results" / "manifest.json").read_text(encoding="utf-8"))
    assert manifest["options"]["calibrations"] == str(ROOT / "calibrations")
    assert main(["again", str(day)]) == DONE


def test_again_says_which_file_of_the_day_changed_and_what_it_moves(
    day: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    gas = day / "gas.csv"
    lines = gas.read_text(encoding="utf-8").splitlines(keepends=True)
    place = next(number for number, line in enumerate(lines) if "m1-3" in line)
    area = re.search(r"\d{3,},\d+", lines[place])
    assert area
    lines[place] = lines[place].replace(area[0], f"1{area[0]}", 1)
    gas.write_text("".join(lines), encoding="utf-8")
    assert main(["again", str(day), *CALIBRATIONS]) == FAULTS
    out = capsys.readouterr().out
    assert re.search(r"^inputs +not the same: gas\.csv$", out, re.MULTILINE)
    assert re.search(r"outputs come out otherwise: .*ledger\.csv", " ".join(out.split()))
    assert "injections.csv: " in out
    assert "These results do not stand as they are." in out


def test_again_says_when_the_results_themselves_were_changed(
    day: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    summary = day / "results" / "summary.csv"
    summary.write_bytes(summary.read_bytes().replace(b"closed", b"short", 1))
    assert main(["again", str(day), *CALIBRATIONS]) == FAULTS
    out = capsys.readouterr().out
    assert re.search(r"^results +changed since: summary\.csv$", out, re.MULTILINE)
    assert "summary.csv: 1 cell row 2, 'closure': 'short' written, 'closed' now" in out


def test_again_on_results_that_lie_elsewhere_asks_for_the_day(
    day: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    shutil.move(day / "results", tmp_path / "elsewhere" / "results")
    assert main(["again", str(tmp_path / "elsewhere" / "results"), "--day", str(day), *CALIBRATIONS]) == DONE
    assert main(["again", str(tmp_path / "elsewhere" / "results"), *CALIBRATIONS]) == FAULTS
    assert "cannot be made again" in capsys.readouterr().err


def test_difference_of_tables_is_told_at_the_cell_that_parts_most() -> None:
    one = Table.of(
        "carbon", [{"run": "a", "CO2 conversion / %": 1.0}, {"run": "b", "CO2 conversion / %": 2.0}]
    )
    other = Table.of(
        "carbon", [{"run": "a", "CO2 conversion / %": 1.5}, {"run": "b", "CO2 conversion / %": 2.2}]
    )
    found = table_difference(one, other)
    assert found is not None
    assert (found.cells, found.where, found.written, found.again) == (2, "row 2", "1.0", "1.5")
    assert found.size == pytest.approx(1 / 3)
    longer = table_difference(one, Table.of("carbon", [*one.records(), {"run": "c"}]))
    assert longer is not None
    assert math.isinf(longer.size)


@pytest.mark.parametrize("shell", ["bash", "zsh", "tcsh"])
def test_completion_script_knows_every_command(shell: str, capsys: pytest.CaptureFixture[str]) -> None:
    from coulombook.cli.texts import COMMANDS

    assert main(["completion", shell]) == DONE
    script = capsys.readouterr().out
    assert all(name in script for name in COMMANDS)
    assert "--calibrations" in script


def test_bash_completes_an_option_and_a_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    bash = shutil.which("bash")
    if bash is None:
        pytest.skip("there is no bash on this machine")
    assert main(["completion", "bash"]) == DONE
    (tmp_path / "script").write_text(capsys.readouterr().out, encoding="utf-8")
    ask = (
        f"source '{tmp_path / 'script'}'; COMP_WORDS=($1); COMP_CWORD=$((${{#COMP_WORDS[@]}} - 1)); "
        "_shtab_coulombook; echo ${COMPREPLY[@]}"
    )

    def completed(words: str) -> list[str]:
        done = subprocess.run(
            [bash, "-c", ask, "bash", words],
            capture_output=True,
            encoding="utf-8",
            env=dict(os.environ),
            check=False,
        )
        return done.stdout.split()

    assert completed("coulombook tal") == ["tally"]
    assert completed("coulombook tally --tables") == ["--tables-only"]
