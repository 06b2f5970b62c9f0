"""Heads, units, numbers and faults of the tables."""

from __future__ import annotations

from datetime import datetime

import pytest

from coulombook.findings import Finding, Findings
from coulombook.intake import schema
from coulombook.intake.grid import grid_of_text
from coulombook.intake.schema import Schema
from coulombook.intake.tables import Default, TypedTable, instant_of, typed_table


def _table(text: str, columns: Schema, **defaults: Default) -> tuple[TypedTable, list[Finding]]:
    findings = Findings()
    grid = grid_of_text(text.encode(), f"{columns.name}.csv", columns.score)
    return typed_table(
        grid, columns, findings, {key.replace("_", " "): one for key, one in defaults.items()}
    ), list(findings)


GAS = "run,injection,time / min,channel,analyte,peak area / uV s\n"


def test_values_are_si_and_peak_areas_stay_raw() -> None:
    table, findings = _table(GAS + "a1,1,2,FID,CO,50\n", schema.GAS)
    assert findings == []
    assert table.numbers("time") == [120.0]
    assert table.numbers("peak area") == [50.0]
    assert table.row_origin(0).of("peak area").column == "peak area / uV s"
    assert str(table.where(0, "time")) == "gas.csv, row 2, column 'time / min'"


def test_heads_match_without_regard_to_case_and_blanks_and_by_long_name() -> None:
    text = "RUN,Injection,time   /  s,channel,ANALYTE,area\na1,1,2,FID,CO,50\n"
    table, findings = _table(text, schema.GAS)
    assert findings == []
    assert table.heads["peak area"] == "area"


def test_a_decimal_comma_is_understood_when_most_numbers_have_one() -> None:
    text = (GAS + "a1,1,2,FID,CO,50\n").replace(",", ";") + "a1;2;2,5;FID;CO;1,5e3\n"
    table, findings = _table(text, schema.GAS)
    assert findings == []
    assert table.numbers("time") == [120.0, 150.0]
    assert table.numbers("peak area") == [50.0, 1500.0]


def test_the_odd_decimal_sign_is_a_fault_and_never_a_thousand() -> None:
    text = GAS.replace(",", ";") + "a1;1;2,5;FID;CO;1,5\na1;2;2,5;FID;CO;1.500\n"
    table, findings = _table(text, schema.GAS)
    (fault,) = findings
    assert (fault.kind, fault.found) == ("not-a-number", "'1.500'")
    assert "row 3, column 'peak area / uV s'" in fault.where
    assert "decimal comma" in fault.expected
    assert table.broken == {1}


@pytest.mark.parametrize(
    "cell", ["nan", "inf", "-inf", "1_000", "x", "1,5,2", "0x10", "1e999", "12 mV", "１２"]
)
def test_text_in_a_number_is_a_fault_that_names_the_cell(cell: str) -> None:
    _, findings = _table(GAS + f'a1,1,2,FID,CO,"{cell}"\n', schema.GAS)
    (fault,) = findings
    assert (fault.kind, fault.found) == ("not-a-number", f"'{cell}'")
    assert fault.where == "gas.csv, row 2, column 'peak area / uV s'"


def test_every_fault_is_gathered() -> None:
    text = GAS + "a1,1,x,FID,CO,-1\n,1,2,FID,,y\n"
    _, findings = _table(text, schema.GAS)
    assert sorted((one.kind, one.where.partition("column ")[2]) for one in findings) == [
        ("missing-value", "'analyte'"),
        ("missing-value", "'run'"),
        ("not-a-number", "'peak area / uV s'"),
        ("not-a-number", "'time / min'"),
        ("not-allowed", "'peak area / uV s'"),
    ]


def test_a_row_marked_unused_may_be_incomplete() -> None:
    text = GAS.replace("area / uV s", "area / uV s,use") + "a1,1,x,FID,CO,-1,No\na1,2,2,FID,CO,5,\n"
    table, findings = _table(text, schema.GAS)
    assert [one.kind for one in findings] == ["left-out"]
    assert table.broken == {0}
    assert table.yes_no("use", otherwise=True) == [False, True]


def test_an_answer_that_is_neither_yes_nor_no_is_a_fault() -> None:
    _, findings = _table(GAS.replace("uV s", "uV s,use") + "a1,1,2,FID,CO,1,maybe\n", schema.GAS)
    assert [(one.kind, one.found) for one in findings] == [("not-allowed", "'maybe'")]


def test_an_unknown_column_is_carried_with_the_nearest_head() -> None:
    table, findings = _table(GAS.replace("uV s", "uV s,pek aera") + "a1,1,2,FID,CO,5,hello\n", schema.GAS)
    (note,) = findings
    assert note.kind == "unread-column"
    assert table.carried == {"pek aera": ("hello",)}
    _, findings = _table("run,electrode aera / cm^2\na,1\n", schema.RUNS)
    assert any(one.kind == "unread-column" and "'electrode area / cm^2'" in one.mend for one in findings)


def test_a_missing_column_is_told_with_the_head_that_may_be_meant() -> None:
    _, findings = _table("run,catalyst,electrode,electrode area (cm^2),pH\na,b,c,1,7\n", schema.RUNS)
    (fault,) = [one for one in findings if one.kind == "missing-column"]
    assert fault.where == "runs.csv, row 1"
    assert fault.expected == "'electrode area / cm^2'"
    assert "electrode area (cm^2)" in fault.mend


@pytest.mark.parametrize(
    ("head", "mend"),
    [
        ("area / cm2", "if 'electrode area / cm^2' is meant, write the head so"),
        ("potential / V", "if 'set potential / V' is meant, write the head so"),
        ("flow / sccm", ""),  # of the inlet, the outlet or a tracer: nobody can know
    ],
)
def test_a_head_cut_short_is_told_with_the_one_head_it_may_stand_for(head: str, mend: str) -> None:
    _, findings = _table(f"run,{head}\na,1\n", schema.RUNS)
    assert [one.mend for one in findings if one.kind == "unread-column"] == [mend]


def test_two_columns_of_one_quantity_are_a_fault() -> None:
    _, findings = _table(GAS.replace("uV s", "uV s,area") + "a1,1,2,FID,CO,5,6\n", schema.GAS)
    assert [one.kind for one in findings] == ["repeated-column"]


@pytest.mark.parametrize(
    ("head", "kind", "found"),
    [
        ("time", "unknown-unit", "no unit in the head"),
        ("time / mn", "unknown-unit", "unit 'mn'"),
        ("time / mV", "wrong-dimension", "unit 'mV'"),
    ],
)
def test_a_unit_that_will_not_do_is_a_fault_of_the_head(head: str, kind: str, found: str) -> None:
    _, findings = _table(GAS.replace("time / min", head) + "a1,1,2,FID,CO,5\n", schema.GAS)
    (fault,) = findings
    assert (fault.kind, fault.found) == (kind, found)
    assert fault.where == f"gas.csv, row 1, column '{head}'"
    assert "s, min or h" in fault.expected or "time / s" in fault.expected


def test_a_pure_number_takes_no_unit_or_one_without_dimension() -> None:
    text = "run,catalyst,electrode,electrode area / cm^2,pH / {},compensated / %\na,b,c,1,7,85\n"
    table, findings = _table(text.format("1"), schema.RUNS)
    assert findings == []
    assert table.numbers("compensated") == [pytest.approx(0.85)]
    _, findings = _table(text.format("V"), schema.RUNS)
    assert [one.kind for one in findings] == ["wrong-dimension"]


def test_flows_keep_the_kind_of_their_unit_and_of_their_default() -> None:
    text = "run,catalyst,electrode,electrode area / cm^2,pH,inlet flow / mL/min\na,b,c,1,7,6\nb,b,c,1,7,\n"
    table, findings = _table(text, schema.RUNS, inlet_flow=Default(1e-7, "standard"))
    assert findings == []
    assert table.numbers("inlet flow") == [pytest.approx(1e-7), 1e-7]
    assert table.flow_kind("inlet flow") == ["actual", "standard"]


def test_a_default_stands_for_blank_cells_and_for_an_absent_column() -> None:
    text = "run,catalyst,electrode,electrode area / cm^2\na,b,c,\nb,b,c,2\n"
    table, findings = _table(text, schema.RUNS, ph=Default(6.8), electrode_area=Default(3e-4))
    assert findings == []
    assert table.numbers("ph") == [6.8, 6.8]
    assert table.numbers("electrode area") == [3e-4, pytest.approx(2e-4)]


def test_more_cells_than_heads_are_a_fault_not_a_shift() -> None:
    _, findings = _table(GAS + "a1,1,2,FID,CO,50,5\n", schema.GAS)
    assert [(one.kind, one.found) for one in findings] == [("unreadable-file", "7 cells")]


def test_a_date_time_needs_a_time_of_day() -> None:
    assert instant_of("2043-05-18T09:30:00") == datetime(2043, 5, 18, 9, 30)
    assert instant_of("2043-05-18 09:30") == datetime(2043, 5, 18, 9, 30)
    zoned = instant_of("2043-05-18T09:30Z")
    assert zoned is not None
    assert zoned.tzinfo is not None
    assert instant_of("2043-05-18") is None
    assert instant_of("18.05.2043 09:30") is None
    assert instant_of(45000.5) is None


@pytest.mark.parametrize("name", sorted(schema.DAY_TABLES))
def test_no_two_columns_of_a_table_answer_to_one_name(name: str) -> None:
    columns = schema.DAY_TABLES[name].columns
    names = [text.casefold() for column in columns for text in (column.quantity, *column.synonyms)]
    assert len(names) == len(set(names))
