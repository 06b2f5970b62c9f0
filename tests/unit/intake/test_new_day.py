"""An empty day folder to fill in."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path

import openpyxl
import pytest
from tests.unit.intake.conftest import MINIATURE, Opened

from coulombook.intake import schema
from coulombook.intake.new_day import write_new_day


@pytest.mark.parametrize("workbook", [False, True])
def test_a_new_day_lacks_nothing_but_its_values(tmp_path: Path, workbook: bool) -> None:
    folder = tmp_path / "new"
    written = write_new_day(folder, workbook)
    assert all(path.is_file() for path in written)
    assert (folder / "traces").is_dir()
    opened = Opened(folder)
    # no head, no unit and no key is at fault: only the reference and the rows are missing
    assert [(one.kind, one.where.split(",")[0]) for one in opened.findings.stops] == [
        ("missing-value", "day.toml"),
        ("missing-value", "day.xlsx" if workbook else "runs.csv"),
    ]


@pytest.mark.parametrize("workbook", [False, True])
def test_a_new_day_is_accepted_once_filled_in(tmp_path: Path, workbook: bool) -> None:
    folder = tmp_path / "new"
    write_new_day(folder, workbook)
    settings = folder / "day.toml"
    text = settings.read_text(encoding="utf-8")
    settings.write_text(text.replace('# potential = "0.210 V"', 'potential = "0.210 V"'), encoding="utf-8")
    (folder / "traces" / "a1.csv").write_text(MINIATURE["traces/a1.csv"], encoding="utf-8")
    cells = {
        "run": "a1",
        "catalyst": "mesh",
        "electrode": "m1",
        "electrode area": 1.0,
        "pH": 6.8,
        "resistance": 10,
    }
    row = [cells.get(column.head.partition(" / ")[0], "") for column in schema.RUNS.columns]
    if workbook:
        book = openpyxl.load_workbook(folder / "day.xlsx")
        book["runs"].append([cell or None for cell in row])
        book.save(folder / "day.xlsx")
    else:
        with (folder / "runs.csv").open("a", encoding="utf-8") as stream:
            stream.write(",".join(map(str, row)) + "\n")
    opened = Opened(folder)
    assert opened.findings.stops == ()
    assert opened.source.day is not None
    assert opened.source.trace(opened.source.day.runs[0]).time_second.size == 3


def test_the_commented_keys_are_valid_when_the_comment_is_taken_away(tmp_path: Path) -> None:
    folder = tmp_path / "new"
    write_new_day(folder, workbook=False)
    lines = (folder / "day.toml").read_text(encoding="utf-8").splitlines()
    example = re.compile(r'# (\[|"[^"]+" = |\w+ = )')
    bare = [line[2:] if example.match(line) else line for line in lines]
    (folder / "day.toml").write_text("\n".join(bare), encoding="utf-8")
    assert tomllib.loads("\n".join(bare))["species"]["butanol"]["phase"] == "liquid"
    opened = Opened(folder)
    kinds = [(one.kind, one.where) for one in opened.findings.stops if one.where.startswith("day.toml")]
    # both references of roughness at once is the one contradiction among the examples
    assert [kind for kind, _ in kinds if kind != "unknown-name"] == ["not-allowed"]


def test_a_folder_with_anything_in_it_is_never_touched(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(FileExistsError, match="not empty"):
        write_new_day(tmp_path, workbook=False)
    assert [path.name for path in tmp_path.iterdir()] == ["notes.txt"]
