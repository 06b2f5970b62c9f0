from __future__ import annotations

import io
from collections.abc import Sequence
from pathlib import Path

import pytest
from rich.cells import cell_len
from rich.console import Console
from tests.unit.report.sample import CATALYSTS, PRODUCTS, sample_book, sample_findings

from coulombook.book import Book
from coulombook.findings import Finding, Severity, finding
from coulombook.report.terminal import HOW_TO_ASK, console_for, show_book, show_check, show_findings

WRITTEN = Path("2043-05-18 mesh, foil and foam/results")
HOSTILE = (
    "=cmd|' /C calc'!A0",
    "[bold red]x[/]",
    "<script>alert(1)</script>",
    "\u202egpj.exe",
    "a\x1b[2Jb",
    "🧪電極",
)


def console_of(width: int, encoding: str = "utf-8") -> tuple[Console, io.BytesIO]:
    raw = io.BytesIO()
    stream = io.TextIOWrapper(raw, encoding=encoding, errors="backslashreplace", write_through=True)
    console = console_for(stream)
    console.width = width
    return console, raw


def shown(book: Book, width: int = 80, encoding: str = "utf-8") -> str:
    console, raw = console_of(width, encoding)
    show_book(book, console, written=WRITTEN)
    return raw.getvalue().decode(encoding)


def shown_findings(findings: Sequence[Finding], width: int = 80, least: Severity = Severity.NOTE) -> str:
    console, raw = console_of(width)
    show_findings(findings, console, least=least)
    return raw.getvalue().decode()


@pytest.mark.parametrize("width", [80, 120])
def test_five_levels_of_twelve_products_stand_in_one_table(width: int) -> None:
    text = shown(sample_book(findings=sample_findings()), width)
    assert all(cell_len(line) <= width for line in text.splitlines())
    # a second block would repeat the head
    assert text.count("E vs RHE / V") == len(CATALYSTS)
    for name, *_ in PRODUCTS:
        assert sum(line[3:].startswith(f"{name} ") for line in text.splitlines()) == len(CATALYSTS)
    assert "H2 hydrogen" in text
    assert "0.03503(84)" in text
    assert "..." not in text
    assert "…" not in text


def test_more_levels_than_fit_stand_in_blocks_of_about_equal_number() -> None:
    levels = [-0.5 - 0.05 * n for n in range(9)]
    lines = shown(sample_book(catalysts=("mesh",), levels=levels, replicates=1)).splitlines()
    heads = [line.split() for line in lines if line.lstrip().startswith("E vs RHE / V ")]
    assert [len(words) - 5 for words in heads] == [4, 5]


@pytest.mark.parametrize("width", [20, 40, 80, 200])
def test_any_width_shows_every_level_and_run(width: int) -> None:
    text = shown(sample_book(catalysts=("mesh",), replicates=1), width)
    for potential in ("-0.616", "-0.738", "-0.850", "-0.942", "-1.047"):
        assert potential in text


def test_runs_show_closure_and_as_many_figures_as_fit() -> None:
    at_80, at_120 = (shown(sample_book(), width) for width in (80, 120))
    for text in (at_80, at_120):
        row = next(line.split() for line in text.splitlines() if line.startswith("a1a "))
        assert row[0] == "a1a"
        assert row[1] == "-0.6174(31)"
        assert "2.005(61)" in row
        assert row[-2:] == ["94.6(16)", "short"]
    assert "roughness" not in at_80
    assert "charge went to" in at_80
    assert "charge went to" in at_120
    assert "CO2 used" in at_120
    assert "roughness" in shown(sample_book(), 140)


def test_a_column_that_no_run_has_is_not_shown() -> None:
    assert "CO2 used" in shown(sample_book(), 200)
    book = sample_book()
    rows = [{**row, "CO2 conversion / %": None} for row in book.tables["summary"].records()]
    tables = {**book.tables, "summary": type(book.tables["summary"]).of("summary", rows)}
    bare = Book(book.day, book.title, tables, (), (), {})
    assert "CO2 used" not in shown(bare, 200)


def test_cautions_and_the_place_of_the_files_come_last() -> None:
    lines = shown(sample_book(findings=sample_findings())).splitlines()
    assert lines[-1] == f"Written to {WRITTEN}"
    cautions = " ".join(line.strip() for line in lines[-4:-1])
    assert "Carbon monoxide poisons" in cautions
    assert "local codes and licensed professionals" in cautions


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_are_shown_and_not_obeyed(name: str) -> None:
    book = sample_book(
        catalysts=(name,),
        levels=(-0.6,),
        products=((name, "C1", "gas", 2, 1.0),),
        findings=(finding("unread-column", name, name, name, found=name, expected=name),),
    )
    text = shown(book, 120)
    assert not set(text) & {"\x1b", "\u202e"}
    assert name.replace("\x1b", "\\x1b").replace("\u202e", "\\u202e") in text


def test_a_name_of_five_thousand_characters_leaves_the_table_readable() -> None:
    name = "x" * 5000
    text = shown(sample_book(catalysts=(name,), products=((name, "C1", "gas", 2, 1.0), *PRODUCTS[:2])))
    assert len(text) < 10_000
    assert all(cell_len(line) <= 80 for line in text.splitlines())
    assert any("x" * 21 + "..." in line and "1.000(24)" in line for line in text.splitlines())


@pytest.mark.parametrize("encoding", ["ascii", "cp1252", "cp437", "latin-1", "utf-16", "utf-8"])
def test_no_encoding_of_the_terminal_stops_the_report(encoding: str) -> None:
    text = shown(sample_book(catalysts=("µ-mesh 電極",), findings=sample_findings()), 80, encoding)
    assert "hydrogen" in text
    assert f"Written to {WRITTEN}" in text


def test_a_terminal_without_lines_shows_the_same_table_with_a_rule_of_hyphens() -> None:
    book = sample_book()
    assert shown(book, 80, "ascii") == shown(book, 80).translate(str.maketrans("─░▒█", "-hc#"))


def test_a_book_without_products_or_runs_is_shown() -> None:
    assert "Written to" in shown(sample_book(catalysts=()))


def test_a_fault_names_place_found_expected_and_mend() -> None:
    fault = finding(
        "unknown-unit",
        "day.xlsx, sheet 'gas flow', row 1, column 'flow (sccn)'",
        "",
        "correct the unit in the column header; did you mean 'sccm'?",
        found="unit 'sccn'",
        expected="a flow unit, such as sccm, mL/min or mol/s",
    )
    assert [line.rstrip() for line in shown_findings([fault], 100).splitlines() if line] == [
        "error[unknown-unit]: day.xlsx, sheet 'gas flow', row 1, column 'flow (sccn)'",
        "  found:    unit 'sccn'",
        "  expected: a flow unit, such as sccm, mL/min or mol/s",
        "  mend:     correct the unit in the column header; did you mean 'sccm'?",
        HOW_TO_ASK,
    ]


def test_a_long_line_of_a_finding_hangs_under_its_own_beginning() -> None:
    lines = shown_findings([finding("missing-file", "a", "", "word " * 40)]).splitlines()
    assert lines[1].startswith("  mend:     word word")
    assert lines[2].startswith(" " * 12 + "word")


def test_at_most_ten_of_one_kind_are_listed_and_the_rest_counted() -> None:
    faults = [finding("missing-value", f"runs.csv, row {n}", f"cell {n} is empty") for n in range(41)]
    text = shown_findings(faults)
    assert text.count("error[missing-value]: runs.csv") == 10
    assert "and 31 more of error[missing-value]" in text


def test_faults_come_first_and_causes_before_consequences() -> None:
    kinds = ["unread-column", "missing-curve", "balance-open", "missing-file"]
    text = shown_findings([finding(kind, "here", kind) for kind in kinds])
    order = [text.index(kind) for kind in ("missing-file", "missing-curve", "balance-open", "unread-column")]
    assert order == sorted(order)


def test_the_same_finding_at_several_places_stands_once() -> None:
    notes = [finding("assumed-default", f"run r{n}", "25 degC was taken") for n in range(12)]
    lines = shown_findings(notes, 200).split("\n")
    assert [line.rstrip() for line in lines if line] == [
        "note[assumed-default]: " + "; ".join(f"run r{n}" for n in range(10)) + "; and 2 more",
        "  25 degC was taken",
        HOW_TO_ASK,
    ]


def test_milder_findings_can_be_left_out() -> None:
    findings = [
        finding("missing-file", "a", "x"),
        finding("balance-open", "b", "x"),
        finding("left-out", "c", "x"),
    ]
    assert "warning" not in shown_findings(findings, least=Severity.STOP)
    at_warn = shown_findings(findings, least=Severity.WARN)
    assert "warning[balance-open]" in at_warn
    assert "left-out" not in at_warn


def test_findings_end_with_how_to_ask_for_more_and_none_have_no_such_line() -> None:
    note = finding("left-out", "c", "x")
    assert shown_findings([note]).endswith("\n\ncoulombook why KIND explains one\n")
    assert shown_findings([]) == shown_findings([note], least=Severity.WARN) == ""


def test_check_ends_with_its_verdict() -> None:
    for findings, verdict in (
        ([finding("left-out", "c", "x")], "This day can be tallied."),
        ([finding("missing-file", "a", "x")], "1 fault to mend before this day can be tallied."),
    ):
        console, raw = console_of(80)
        show_check(["6 runs of 2 catalysts", "no vials"], findings, console)
        lines = raw.getvalue().decode().splitlines()
        assert lines[0] == "6 runs of 2 catalysts"
        assert lines[-1] == verdict
