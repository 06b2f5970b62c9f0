"""The audit workbook against a spreadsheet program, the tables beside it, and a fresh tally of changed readings."""

from __future__ import annotations

import csv
import math
import re
import shutil
import subprocess
import sys
import zipfile
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from io import BytesIO
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from tests.forward.days import GAS_CURVES, small_day
from tests.forward.files import write_day
from tests.system.spreadsheet import (
    FIRST_ROW,
    HEAD_ROW,
    Cells,
    place_of,
    read_cells,
    recalculated,
    records,
    split,
    without_cached_values,
)
from tests.system.test_truth_returns import CASES

import coulombook
from coulombook.book import TABLES
from coulombook.cli import main
from coulombook.report.results import write_results
from coulombook.report.tables import csv_cell
from coulombook.report.workbook import NAME, workbook_bytes

ROOT = Path(__file__).resolve().parents[2]
EXAMPLES = ("2043-05-18-mesh-foil-foam", "2043-06-02-gas-diffusion")
# one of each way of the chain that the examples do not go; they measure a dry outlet, and balance with a headspace
FORWARD = (
    "inlet flow, mL/min at the run's own temperature and pressure",
    "inlet flow, umol/s",
    "measured wet outlet, mL/min",
    "tracer",
    "balance",
    "headspace with tracer",
    "drift by check gas",
    "spoiled injections",
    "blanks, aliquots, anolyte, trap and two signals of the standard",
    "line and quadratic gas curves",
    "roughness from a smooth electrode",
    "temperature coefficient of the reference",
)
SAME = 1e-9  # relative: what rounding leaves of a long chain, far below any digit shown
# a sheet under another name than its table
SHEETS = {"calibrations": "curves"}


@dataclass(frozen=True)
class Case:
    """A day's book, its workbook as written, and the workbook as a spreadsheet program computes it from nothing."""

    book: coulombook.Book
    written: bytes
    cached: Cells
    computed: Cells


def _borrowed(folder: Path) -> Path:
    """A day whose ethane has no standards of its own: its curve is ethylene's, by effective carbon numbers."""
    path = write_day(folder, small_day())
    found = 0
    for toml in path.glob("calibrations/*/calibration.toml"):
        standards = toml.with_name("standards.csv")
        lines = standards.read_text(encoding="utf-8").splitlines(keepends=True)
        if any(",ethane," in line for line in lines):
            found += 1
            standards.write_text("".join(line for line in lines if ",ethane," not in line), encoding="utf-8")
            text = re.sub(
                r'(?ms)^\[curve\."ethane@FID"\]\n.*?(?=^\[|\Z)', "", toml.read_text(encoding="utf-8")
            )
            toml.write_text(text + '\n[curve."ethane@FID"]\nlike = "ethylene@FID"\n', encoding="utf-8")
    assert found == 1
    return path


def _saturated(folder: Path) -> Path:
    """A day whose signals, read by counting protons, carry relaxation times."""
    path = write_day(folder, small_day())
    liquid = path / "liquid.csv"
    heads, *rows = liquid.read_text(encoding="utf-8").splitlines()
    times = (1.9, 3.7, 8.2, 2.4, 5.5)
    told = [f"{row},{times[number % 5]},9,{(90, 30)[number % 2]}" for number, row in enumerate(rows)]
    liquid.write_text(
        "\n".join([f"{heads},T1 / s,repetition time / s,flip angle / deg", *told]) + "\n", encoding="utf-8"
    )
    return path


def _two_channels(folder: Path) -> Path:
    """A day whose ethylene comes on two channels, in one injection with one of them left out."""
    curves = {**GAS_CURVES, ("TCD", "ethylene"): GAS_CURVES["FID", "ethylene"]}
    path = write_day(folder, small_day(gas_curves=curves))
    gas = path / "gas.csv"
    heads, *rows = gas.read_text(encoding="utf-8").splitlines()
    column = heads.split(",").index("channel")
    assert any(row.split(",")[column] == "TCD" and "ethylene" in row for row in rows)
    if "use" not in heads.split(","):
        heads, rows = f"{heads},use", [f"{row},yes" for row in rows]
    left_out = next(number for number, row in enumerate(rows) if "TCD" in row and "ethylene" in row)
    rows[left_out] = rows[left_out].rpartition(",")[0] + ",no"
    gas.write_text("\n".join([heads, *rows]) + "\n", encoding="utf-8")
    return path


MADE: Mapping[str, Callable[[Path], Path]] = {
    **{
        name: lambda folder, case=CASES[name]: write_day(folder, case.day(), case.style)  # type: ignore[misc]
        for name in FORWARD
    },
    "a borrowed curve": _borrowed,
    "relaxation times": _saturated,
    "one product on two channels": _two_channels,
}


@pytest.fixture(scope="module")
def cases(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Case]:
    folder = tmp_path_factory.mktemp("workbooks")
    books = {
        name: coulombook.tally(
            ROOT / "example_experiments" / name, calibrations=[ROOT / "calibrations"], reconcile=True
        )
        for name in EXAMPLES
    }
    for number, (name, make) in enumerate(MADE.items()):
        books[name] = coulombook.tally(make(folder / f"day{number}"))
    written = {name: workbook_bytes(book) for name, book in books.items()}
    computed = recalculated(
        {name: without_cached_values(content) for name, content in written.items()}, folder / "computed"
    )
    return {
        name: Case(book, written[name], read_cells(written[name]), computed[name])
        for name, book in books.items()
    }


@pytest.fixture(params=[*EXAMPLES, *MADE], scope="module")
def case(request: pytest.FixtureRequest, cases: dict[str, Case]) -> Case:
    return cases[request.param]


def same(found: float | str | None, expected: float | str | None, scale: float = 0.0) -> bool:
    """Equal as text, or as numbers to within `SAME` of themselves (or of ``scale``, what they are a difference of)."""
    if isinstance(found, float) and isinstance(expected, float):
        return math.isclose(found, expected, rel_tol=SAME, abs_tol=SAME * scale)
    return (found or None) == (expected or None)


def heads_of(cells: Mapping[str, Any]) -> dict[str, str]:
    return {split(place)[0]: str(cell.value) for place, cell in cells.items() if split(place)[1] == HEAD_ROW}


def formulas(cells: Cells) -> Iterator[tuple[str, str, str]]:
    for sheet, held in cells.items():
        for place, cell in held.items():
            if cell.formula is not None:
                yield sheet, place, cell.formula


def test_every_formula_recalculates_to_the_value_cached_beside_it(case: Case) -> None:
    # compared: each formula cell as LibreOffice computes it from an emptied workbook, and as the tally computed it
    different, count = [], 0
    for sheet, place, formula in formulas(case.cached):
        count += 1
        cached, found = case.cached[sheet][place], case.computed[sheet][place]
        scale = 0.0
        if sheet == "standards" and heads_of(case.cached[sheet])[split(place)[0]] == "residual":
            # a residual is a difference of responses and keeps the rounding of these
            scale = max(abs(float(one["response"] or 0)) for one in records(case.cached[sheet]))  # type: ignore[arg-type]
        if not same(found.value, cached.value, scale):
            different.append(f"{sheet}!{place} ={formula}: {found.value!r}, cached {cached.value!r}")
    assert not different, f"{len(different)} of {count}: {different[:5]}"
    assert count > 300


def test_no_cell_shows_an_error(case: Case) -> None:
    for cells in (case.cached, case.computed):
        assert [
            f"{name}!{place}" for name, sheet in cells.items() for place, one in sheet.items() if one.error
        ] == []


def test_every_formula_carries_the_value_it_had(case: Case) -> None:
    # a previewer, which computes nothing, shows these
    assert [
        place for sheet, place, _ in formulas(case.cached) if case.cached[sheet][place].value is None
    ] == []


def test_every_table_stands_in_the_workbook_as_in_its_csv(case: Case) -> None:
    # compared: every cell of every table as it is written to CSV, and the recalculated sheet's, by head and record
    for name, table in case.book.tables.items():
        if not len(table):
            continue
        found = records(case.computed[SHEETS.get(name, name)])
        assert len(found) == len(table), name
        for number, (record, row) in enumerate(zip(found, table.records(), strict=True)):
            for head, cell in row.items():
                expected = float(cell) if isinstance(cell, int | float) else cell
                # a curve that is not borrowed and a coefficient that is not there are empty in both
                assert same(record[head], expected), (
                    f"{name}, record {number}, {head}: {record[head]} for {cell}"
                )


def test_what_the_ledger_needs_is_a_formula_and_not_a_value(case: Case) -> None:
    live = {
        "gas": ["mole fraction / ppm"],
        "injections": ["mole fraction / ppm", "outlet flow / umol/s", "FE / %", "used"],
        "liquid": ["integral per proton", "response ratio", "amount ratio"],
        "samples": ["amount ratio", "in the tube / umol", "measured / mmol/L", "concentration / mmol/L"],
        "compartments": ["concentration / mmol/L", "volume / mL", "amount / umol", "FE / %"],
        "charge": ["current / mA", "j / mA cm^-2", "E vs RHE / V"],
        "outlet": ["outlet flow / umol/s"],
        "ledger": ["FE / %", "amount / umol", "j / mA cm^-2", "j real / mA cm^-2"],
        "summary": [
            "total FE / %",
            "H2 FE / %",
            "C1 FE / %",
            "C2+ FE / %",
            "C2+/C1",
            "C2+/C1 molar",
            "closure",
        ],
        "series": ["FE / %", "j / mA cm^-2"],
        "surface": ["capacitance / mF", "roughness factor"],
    }
    for sheet, heads in live.items():
        cells = case.cached.get(sheet, {})
        letters = {head: letter for letter, head in heads_of(cells).items()}
        for head in heads if cells else ():
            column = [
                one
                for place, one in cells.items()
                if split(place)[0] == letters[head] and split(place)[1] >= FIRST_ROW
            ]
            assert all(one.formula is not None for one in column if one.value not in (None, "")), (
                sheet,
                head,
            )


def _example(folder: Path, name: str) -> Path:
    shutil.copytree(ROOT / "example_experiments" / name, folder, ignore=shutil.ignore_patterns("results"))
    return folder


def _rewrite(day: Path, record: Mapping[str, Any], head: str, change: Callable[[str], str]) -> None:
    """Change one cell of the day's files, found by the file and row that the workbook names."""
    path = day / str(record["file"])
    lines = path.read_text(encoding="utf-8-sig").splitlines(keepends=True)
    separator = ";" if ";" in lines[0] else ","
    column = next(
        number
        for number, one in enumerate(lines[0].rstrip("\n").split(separator))
        if one.partition(" / ")[0] == head
    )
    row = int(float(str(record["row"]))) - 1
    cells = lines[row].rstrip("\n").split(separator)
    cells[column] = change(cells[column])
    lines[row] = separator.join(cells) + "\n"
    path.write_text("".join(lines), encoding="utf-8")


def _times(factor: float) -> Callable[[str], str]:
    def change(cell: str) -> str:
        comma = "," in cell
        text = repr(float(cell.replace(",", ".")) * factor)
        return text.replace(".", ",") if comma else text

    return change


def _changed(workbook: bytes, sheet: str, place: str, change: Callable[[Any], Any]) -> bytes:
    """The workbook with one entered cell changed by hand, as by openpyxl, which keeps no cached value."""
    opened = openpyxl.load_workbook(BytesIO(workbook))
    opened[sheet][place] = change(opened[sheet][place].value)
    stream = BytesIO()
    opened.save(stream)
    return stream.getvalue()


@dataclass(frozen=True)
class Change:
    """One entered cell changed: where, how, and how in the day's files."""

    day: Callable[[Path], Path]
    sheet: str
    head: str
    where: Mapping[str, str]
    in_sheet: Callable[[Any], Any]
    column: str
    in_file: Callable[[str], str]


def _forward(name: str) -> Callable[[Path], Path]:
    return MADE[name]


def _mesh(folder: Path) -> Path:
    return _example(folder, EXAMPLES[0])


_AREA = {"run": "m1-3", "injection": "2", "analyte": "ethylene"}
_OWN = {"run": "r1", "injection": "2", "analyte": "ethylene"}
CHANGES = {
    "a peak area of the first example": Change(
        _mesh, "gas", "peak area", _AREA, lambda v: v * 1.25, "peak area", _times(1.25)
    ),
    "a peak area on a quadratic curve": Change(
        _mesh, "gas", "peak area", {**_AREA, "analyte": "hydrogen"}, lambda v: v * 0.5, "peak area", _times(0.5)
    ),
    "a peak area of the tracer, which moves the outlet flow": Change(
        _forward("tracer"), "gas", "peak area", {**_OWN, "analyte": "nitrogen"}, lambda v: v * 0.9, "peak area",
        _times(0.9),
    ),
    "a peak area where the flow follows from the carbon balance": Change(
        _forward("balance"), "gas", "peak area", _OWN, lambda v: v * 1.5, "peak area", _times(1.5)
    ),
    "a peak left out": Change(
        _mesh, "gas", "used", _AREA, lambda v: "no", "use", lambda cell: "no"
    ),
    "an integral of the first example": Change(
        _mesh, "liquid", "integral", {"vial": "m1-2-catholyte-1", "analyte": "ethanol"}, lambda v: v * 1.3,
        "integral", _times(1.3),
    ),
    "an integral of a sample from which earlier samplings were taken": Change(
        _forward("blanks, aliquots, anolyte, trap and two signals of the standard"), "liquid", "integral",
        {"vial": "r1-catholyte-1", "analyte": "formate"}, lambda v: v * 1.3, "integral", _times(1.3),
    ),
}  # fmt: skip


def test_after_a_change_the_workbook_says_what_a_fresh_tally_says(tmp_path: Path) -> None:
    # compared: FE, amount and partial current density of every row of the ledger, and totals and ratios of every run,
    # in the workbook changed by hand and recalculated, and in a tally of the day with the same change in its files
    expected, given = {}, {}
    for number, (name, change) in enumerate(CHANGES.items()):
        day = change.day(tmp_path / f"day{number}")
        calibrations = [ROOT / "calibrations"]
        before = coulombook.tally(day, calibrations=calibrations)
        workbook = workbook_bytes(before)
        cells = read_cells(workbook)[change.sheet]
        place = place_of(cells, change.head, **change.where)
        record = records(cells)[split(place)[1] - FIRST_ROW]
        _rewrite(day, record, change.column, change.in_file)
        after = coulombook.tally(day, calibrations=calibrations)
        assert after.tables["ledger"].rows != before.tables["ledger"].rows, name
        expected[name], given[name] = after, _changed(workbook, change.sheet, place, change.in_sheet)
    for name, cells in recalculated(given, tmp_path / "computed").items():
        for table, heads in {
            "injections": ["mole fraction / ppm", "outlet flow / umol/s", "FE / %", "used"],
            "ledger": ["FE / %", "amount / umol", "j / mA cm^-2", "j real / mA cm^-2"],
            "summary": [
                "total FE / %",
                "H2 FE / %",
                "C1 FE / %",
                "C2+ FE / %",
                "C2+/C1",
                "CO2 conversion / %",
            ],
            "series": ["FE / %", "s(FE) / %", "j / mA cm^-2"],
        }.items():
            found = records(cells[table])
            for record, row in zip(found, expected[name].tables[table].records(), strict=True):
                for head in heads:
                    cell = row[head]
                    value = float(cell) if isinstance(cell, int | float) else cell
                    # a standard deviation of near equals keeps the rounding of what it is computed from
                    scale = float(row["FE / %"] or 0) if head == "s(FE) / %" else 0.0  # type: ignore[arg-type]
                    assert same(record[head], value, scale), (name, table, dict(row), head, record[head])


HOSTILE = (
    "=cmd|' /C calc'!A0",
    '+HYPERLINK("http://x.invalid","pay")',
    "-2+3",
    "@SUM(1+1)*cmd|' /C calc'!A0",
    "<script>alert(1)</script>",
    "http://x.invalid/a?b",
    "mailto:somebody@x.invalid",
    "../../x",
    "\u202etxt.exe",
    "_x0041_",
    "'=1+1",
    "{=1+1}",
    "😀" * 20_000,
    "x" * 40_000,
    "a\tb\ufffec",
)


def _named_day(folder: Path, text: str) -> Path:
    """A day whose first run, catalyst, electrode, level, injections and vials are called by one text.

    A text of tens of thousands of characters names the catalyst alone: no line of a file may be longer.
    """
    own = text if len(text) < 10_000 else "n"
    first, second = small_day().holds
    day = replace(
        small_day(), holds=(replace(first, name="NAME", catalyst="NAME", electrode="NAME e"), second)
    )
    path = write_day(folder, day)
    for name in ("runs", "gas", "vials", "liquid"):
        file = path / f"{name}.csv"
        with file.open(encoding="utf-8", newline="") as stream:
            heads, *rows = csv.reader(stream)
        if name == "runs":
            assert "trace" not in heads
            heads.append("trace")
            for row, trace in zip(rows, ("NAME", "r2"), strict=True):
                row[heads.index("level")] += " NAME"
                row.append(f"traces/{trace}.csv")
        kept = {heads.index("trace")} if name == "runs" else set()
        catalyst = heads.index("catalyst") if name == "runs" else -1
        named = [
            [
                cell if place in kept else cell.replace("NAME", text if place == catalyst else own)
                for place, cell in enumerate(row)
            ]
            for row in rows
        ]
        with file.open("w", encoding="utf-8", newline="") as stream:
            csv.writer(stream, lineterminator="\n").writerows([heads, *named])
    return path


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[str, bytes]]:
    """Each hostile text, and the workbook of a day full of it."""
    folder = tmp_path_factory.mktemp("hostile")
    return [
        (text, workbook_bytes(coulombook.tally(_named_day(folder / f"day{number}", text))))
        for number, text in enumerate(HOSTILE)
    ]


def test_no_text_of_the_files_becomes_a_formula_or_a_link(
    hostile: list[tuple[str, bytes]], tmp_path: Path
) -> None:
    # compared: the formulas of a day of harmless names with those of the same day under hostile ones
    plain = read_cells(workbook_bytes(coulombook.tally(_named_day(tmp_path / "plain", "plain-name"))))
    harmless = sorted(formulas(plain))
    for text, workbook in hostile:
        cells = read_cells(workbook)
        assert sorted(formulas(cells)) == harmless, text[:40]
        with zipfile.ZipFile(BytesIO(workbook)) as archive:
            assert not [name for name in archive.namelist() if "vba" in name or "externalLink" in name]
            for name in archive.namelist():
                # links lead to sheets of the workbook; a link to anywhere else needs a relation
                if name.startswith("xl/worksheets/_rels/"):
                    assert b"External" not in archive.read(name), text[:40]


def test_hostile_texts_are_shown_and_fit_their_cells(hostile: list[tuple[str, bytes]]) -> None:
    for text, workbook in hostile:
        cells = read_cells(workbook)
        words = [
            str(one.value) for sheet in cells.values() for one in sheet.values() if isinstance(one.value, str)
        ]
        longest = max(len(word.encode("utf-16-le")) // 2 for word in words)
        assert longest <= 32_767  # what the format allows in a cell
        shown = str(records(cells["runs"])[0]["catalyst"])
        head = text[:3]
        assert shown.startswith(head) if head.isprintable() else "\\" in shown


def test_a_spreadsheet_program_opens_hostile_workbooks_without_an_error(
    hostile: list[tuple[str, bytes]], tmp_path: Path
) -> None:
    # compared: every formula cell as recalculated and as cached
    books = {
        str(number): without_cached_values(workbook)
        for number, (text, workbook) in enumerate(hostile)
        if text[0] in "=@<_{x" or len(text) > 10_000
    }
    for number, computed in recalculated(books, tmp_path / "computed").items():
        cached = read_cells(hostile[int(number)][1])
        for sheet, place, formula in formulas(cached):
            found = computed[sheet][place]
            assert not found.error
            assert same(found.value, cached[sheet][place].value, 1.0), (HOSTILE[int(number)][:40], formula)


def test_the_same_day_gives_the_same_bytes_dated_by_the_day(tmp_path: Path) -> None:
    day = write_day(tmp_path / "day", small_day())
    first, second = (workbook_bytes(coulombook.tally(day)) for _ in range(2))
    assert first == second
    with zipfile.ZipFile(BytesIO(first)) as archive:
        assert b">2043-05-18T" in archive.read("docProps/core.xml")


def test_the_workbook_lies_beside_the_tables_and_the_manifest_knows_it(tmp_path: Path) -> None:
    book = coulombook.tally(write_day(tmp_path / "day", small_day()))
    out = write_results(book, tmp_path / "results")
    assert (out / NAME).read_bytes() == workbook_bytes(book)
    assert f'"{NAME}"' in (out / "manifest.json").read_text(encoding="utf-8")


def test_tables_only_leaves_the_workbook_out_and_its_library_unloaded(tmp_path: Path) -> None:
    day = write_day(tmp_path / "day", small_day())
    program = (
        "import sys; from coulombook.cli import main; status = main(sys.argv[1:]); "
        "print('xlsxwriter' in sys.modules); sys.exit(status)"
    )
    for more, loaded in (["--tables-only"], "False"), ([], "True"):
        done = subprocess.run(
            [sys.executable, "-c", program, "tally", str(day), "--quiet", *more],
            capture_output=True, text=True, timeout=120, check=True,
        )  # fmt: skip
        assert done.stdout.split()[-1] == loaded
        assert (day / "results" / NAME).exists() == (loaded == "True")
        assert {one.stem for one in (day / "results").glob("*.csv")} >= set(TABLES)


def test_every_sheet_can_be_read_without_a_manual(cases: dict[str, Case]) -> None:
    opened = openpyxl.load_workbook(BytesIO(cases[EXAMPLES[0]].written))
    for page in opened:
        if page.title in ("about", "charts"):
            continue
        assert page.freeze_panes is not None, page.title
        assert split(page.freeze_panes)[1] == FIRST_ROW
        assert page["A1"].value
        assert page["A2"].value
        assert [page.cell(3, column).value for column in (1, 2, 3)] == ["entered", "formula", "computed"]
        # heads stand in the row that the tests read, and every column has a width of its own
        heads = [cell for cell in page[HEAD_ROW] if cell.value]
        assert len(heads) >= 3 or page.title == "flow"
        for cell in heads:
            assert page.column_dimensions[cell.column_letter].width >= 10
    assert {"summary", "charts", "ledger", "gas", "liquid", "charge", "curves", "surface", "series", "findings",
            "about", "budget"} <= set(opened.sheetnames)  # fmt: skip
    assert (
        opened["charts"]._charts == [] or len(opened["charts"]._charts) == 6
    )  # openpyxl may drop them at reading
    with zipfile.ZipFile(BytesIO(cases[EXAMPLES[0]].written)) as archive:
        charts = [name for name in archive.namelist() if name.startswith("xl/charts/chart")]
        assert len(charts) == 6  # FE and partial currents of three catalysts
        assert b'<c:grouping val="stacked"/>' in archive.read(charts[0])
    names = set(opened.defined_names)
    assert {"Faraday_constant", "gas_peak_area", "liquid_integral", "ledger_FE", "summary_total_FE"} <= names


def test_numbers_show_two_digits_of_their_uncertainty(cases: dict[str, Case]) -> None:
    page = openpyxl.load_workbook(BytesIO(cases[EXAMPLES[0]].written), data_only=True)["ledger"]
    columns = {str(cell.value): cell.column for cell in page[HEAD_ROW]}
    for row in range(FIRST_ROW, page.max_row + 1):
        u = page.cell(row, columns["u(FE) / %"])
        if not 1e-4 <= u.value < 99:
            continue
        decimals = len(u.number_format.partition(".")[2])
        assert page.cell(row, columns["FE / %"]).number_format == u.number_format
        assert 9.5 <= u.value * 10**decimals < 99.5 or (decimals == 0 and u.value >= 9.5)


def test_entered_cells_differ_from_formulas_by_more_than_colour(cases: dict[str, Case]) -> None:
    page = openpyxl.load_workbook(BytesIO(cases[EXAMPLES[0]].written))["gas"]
    columns = {str(cell.value): cell.column for cell in page[HEAD_ROW]}
    entered, formula = (page.cell(FIRST_ROW, columns[head]) for head in ("peak area", "mole fraction / ppm"))
    assert entered.border.left.style == "thin"
    assert formula.border.left.style is None
    ledger = {str(cell.value): cell.column for cell in page.parent["ledger"][HEAD_ROW]}
    computed = page.parent["ledger"].cell(FIRST_ROW, ledger["u(FE) / %"])
    assert computed.font.italic
    assert not formula.font.italic
    assert not entered.font.italic


def test_each_reading_says_where_it_was_read(cases: dict[str, Case]) -> None:
    # compared: the peak area in the workbook with the cell of the file and row beside it
    day = ROOT / "example_experiments" / EXAMPLES[0]
    lines = (day / "gas.csv").read_text(encoding="utf-8").splitlines()
    area = lines[0].split(";").index("peak area / pA s")
    for record in records(cases[EXAMPLES[0]].cached["gas"]):
        assert record["file"] == "gas.csv"
        cells = lines[int(str(record["row"]).removesuffix(".0")) - 1].split(";")
        assert cells[0] == record["run"]
        assert float(cells[area].replace(",", ".")) == record["peak area"]


def test_the_command_writes_the_workbook(tmp_path: Path) -> None:
    day = write_day(tmp_path / "day", small_day())
    assert main(["tally", str(day), "--quiet"]) == 0
    with zipfile.ZipFile(day / "results" / NAME) as archive:
        assert archive.testzip() is None


def test_csv_and_workbook_hold_the_same_digits(cases: dict[str, Case]) -> None:
    # compared: the text of a CSV cell and the number that the workbook stores, read back
    case = cases[EXAMPLES[1]]
    for record, row in zip(records(case.cached["ledger"]), case.book.tables["ledger"].records(), strict=True):
        assert math.isclose(float(csv_cell(row["u(FE) / %"])), float(str(record["u(FE) / %"])), rel_tol=1e-15)
