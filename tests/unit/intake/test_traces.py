"""Potentiostat logs and voltammograms."""

from __future__ import annotations

import itertools
import subprocess
import sys
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from coulombook.balance.readings import Trace
from coulombook.findings import Finding, Findings
from coulombook.intake import fast_body
from coulombook.intake.files import Folder
from coulombook.intake.settings import TraceOptions
from coulombook.intake.traces import read_trace, read_voltammogram

ROWS = [["t / s", "E / V", "I / mA"], ["0", "-1.5", "-10.25"], ["0.5", "-1.25", "-1.0e1"], ["2", "-1.5", "0"]]
AREA_M2 = 2e-4
AUTOMATIC = TraceOptions({})
Read = Callable[..., tuple[Trace | None, list[Finding]]]


def _text(separator: str = ",", decimal: str = ".", newline: str = "\n") -> str:
    heads = separator.join(ROWS[0])
    rows = [separator.join(row).replace(".", decimal) for row in ROWS[1:]]
    return newline.join([heads, *rows, ""])


@pytest.fixture(params=["numpy", "pandas"])
def reader(request: pytest.FixtureRequest, monkeypatch: pytest.MonkeyPatch) -> str:
    """Each of the two fast readers in turn, whatever happens to be imported."""
    name: str = request.param
    assert pd is not None
    if name == "numpy":
        monkeypatch.delitem(sys.modules, "pandas")
    return name


@pytest.fixture
def read(tmp_path: Path, reader: str) -> Read:
    """Write a trace and read it."""

    def written(data: bytes | str, options: TraceOptions = AUTOMATIC) -> tuple[Trace | None, list[Finding]]:
        (tmp_path / "a.csv").write_bytes(data if isinstance(data, bytes) else data.encode())
        findings = Findings()
        return read_trace(Folder(tmp_path), tmp_path / "a.csv", AREA_M2, options, findings), list(findings)

    return written


def _assert_rows(trace: Trace | None) -> None:
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [0.0, 0.5, 2.0])
    np.testing.assert_array_equal(trace.potential_volt, [-1.5, -1.25, -1.5])
    # times 1e-3: one rounding
    np.testing.assert_allclose(trace.current_ampere, [-0.01025, -0.01, 0.0], rtol=1e-15)


@pytest.mark.parametrize(
    ("dialect", "encoding", "newline", "above"),
    list(
        itertools.product(
            [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ",")],
            ["utf-8", "utf-8-sig", "utf-16", "cp1252"],
            ["\n", "\r\n", "\r"],
            ["", 'Gerät: µ-Stat "2\n\nt;E,I\n'],
        )
    ),
)
def test_every_dialect_gives_the_same_trace(
    read: Read, dialect: tuple[str, str], encoding: str, newline: str, above: str
) -> None:
    text = above.replace("\n", newline) + _text(*dialect, newline=newline)
    trace, findings = read(text.encode(encoding))
    assert findings == []
    _assert_rows(trace)


@pytest.mark.parametrize("separator", [",", ";", "\t"])
@pytest.mark.parametrize(
    "above",
    [
        "\n\n",
        "  \n",
        "\t\n",
        "\t \t\n",
        " ; \n",
        ",,,,,,\n",
        "free, text; of\tmany, many, cells\n\n \nmore\n",
    ],
)
def test_lines_above_the_heads_are_passed_over_be_they_blank_or_not(
    read: Read, separator: str, above: str
) -> None:
    trace, findings = read(above + _text(separator))
    assert findings == []
    _assert_rows(trace)


def test_arrays_are_read_only(read: Read) -> None:
    trace, _ = read(_text())
    assert trace is not None
    for array in (trace.time_second, trace.potential_volt, trace.current_ampere):
        assert not array.flags.writeable


def test_trailing_blank_rows_and_columns_do_no_harm(read: Read) -> None:
    trace, findings = read(_text().replace("\n", ",,\n") + ",,,,\n\n  \n")
    assert findings == []
    _assert_rows(trace)


def test_long_names_cell_voltage_and_other_columns(read: Read) -> None:
    trace, _ = read(
        "Time / min,note,Potential / mV,Current / A,Cell voltage / V\n0,on,-1500,-0.01,3\n1,,-1500,-0.01,3\n"
    )
    assert trace is not None
    np.testing.assert_array_equal(trace.time_second, [0.0, 60.0])
    np.testing.assert_allclose(trace.potential_volt, -1.5, rtol=1e-15)
    assert trace.cell_voltage_volt is not None
    np.testing.assert_array_equal(trace.cell_voltage_volt, 3.0)


def test_a_current_density_is_taken_with_the_electrode_area(read: Read) -> None:
    trace, _ = read("t / s,E / V,j / mA cm^-2\n0,-1.5,-10\n1,-1.5,-10\n")
    assert trace is not None
    # -10 mA/cm^2 x 2 cm^2 = -20 mA
    np.testing.assert_allclose(trace.current_ampere, -0.02, rtol=1e-15)


def test_a_current_wins_over_a_current_density(read: Read) -> None:
    trace, _ = read("t / s,E / V,j / mA cm^-2,I / mA\n0,-1.5,-10,-7\n1,-1.5,-10,-7\n")
    assert trace is not None
    np.testing.assert_allclose(trace.current_ampere, -0.007, rtol=1e-15)


def test_quoted_decimal_commas_between_commas(read: Read) -> None:
    trace, findings = read('t / s,E / V,I / mA\n"0","-1,5","-10,25"\n"0,5","-1,25","-10"\n"2","-1,5","0"\n')
    assert findings == []
    _assert_rows(trace)


def test_a_decimal_comma_first_seen_late_is_understood(read: Read) -> None:
    rows = "".join(f"{second};-1;-10\n" for second in range(300))
    trace, findings = read(f"t / s;E / V;I / mA\n{rows}300;-1,5;-10\n")
    assert findings == []
    assert trace is not None
    assert trace.potential_volt[-1] == -1.5


def test_heads_of_the_instrument_are_mapped_by_day_toml(read: Read) -> None:
    text = "Zeit [s];Spannung [V];Strom [mA];T [C]\n0;-1,5;-10,25;x\n0,5;-1,25;-10;.\n2;-1,5;0;\n"
    columns = {"t": ("Zeit [s]", None), "e": ("Spannung [V]", None), "i": ("Strom [mA]", None)}
    trace, findings = read(text, TraceOptions(columns))
    assert findings == []
    _assert_rows(trace)
    named = {"t": ("zeit", "s"), "e": ("spannung", "V"), "i": ("strom", "mA")}
    trace, findings = read(
        text.replace(" [s]", "").replace(" [V]", "").replace(" [mA]", ""), TraceOptions(named)
    )
    assert findings == []
    _assert_rows(trace)


def test_skip_separator_and_decimal_may_be_given(read: Read) -> None:
    text = "t / s;E / V;I / mA\n" + _text(";", ",")
    trace, findings = read(text, TraceOptions({}, ";", ",", 1))
    assert findings == []
    _assert_rows(trace)


@pytest.mark.parametrize(
    ("text", "kind", "where", "found"),
    [
        ("", "broken-trace", "a.csv", "no rows"),
        ("t / s,E / V,I / mA\n", "broken-trace", "a.csv", "no rows"),
        (_text().replace("-1.25", "overload"), "not-a-number", "a.csv, row 3, column 'E / V'", "'overload'"),
        (_text().replace("-1.25", "nan"), "not-a-number", "a.csv, row 3, column 'E / V'", "'nan'"),
        (_text().replace("-1.25", "-inf"), "not-a-number", "a.csv, row 3, column 'E / V'", "'-inf'"),
        (_text().replace("-1.25", ""), "not-a-number", "a.csv, row 3, column 'E / V'", "nothing"),
        (_text().replace("-1.25", "1_0"), "not-a-number", "a.csv, row 3, column 'E / V'", "'1_0'"),
        (_text() + "3,-1.5\n", "not-a-number", "a.csv, row 5, column 'I / mA'", "nothing"),
        (_text() + "\n1.5,-1,-1\n", "broken-trace", "a.csv, row 6, column 't / s'", "1.5 s after 2 s"),
        (
            _text(";", ",").replace("-10,25", "-1.000"),
            "not-a-number",
            "a.csv, row 2, column 'I / mA'",
            "'-1.000'",
        ),
        ("t / s,E / V,I / mA\n0,-1,5,-10\n", "unreadable-file", "a.csv, row 2", "4 cells"),
        (_text() + "3,-1,5,-10,2\n", "unreadable-file", "a.csv, row 5", "5 cells"),
        ("t / s,E / V,Im\n0,-1,-1\n", "missing-column", "a.csv, row 1", "'Im'"),
        ("hello\nworld\n", "missing-column", "a.csv", "'hello'"),
        ("t / s,E / V,I / kg\n0,-1,-1\n", "wrong-dimension", "a.csv, row 1, column 'I / kg'", "'kg'"),
        ("t / s,E / V,I / mAA\n0,-1,-1\n", "unknown-unit", "a.csv, row 1, column 'I / mAA'", "'mAA'"),
        ("t,E / V,I / mA\n0,-1,-1\n", "unknown-unit", "a.csv, row 1, column 't'", "no unit"),
        (
            "t / s,E / V,I / mA,Time / s\n0,-1,-1,0\n",
            "repeated-column",
            "a.csv, row 1, column 'Time / s'",
            "'t / s'",
        ),
    ],
)
def test_a_fault_names_file_row_and_column(read: Read, text: str, kind: str, where: str, found: str) -> None:
    trace, findings = read(text)
    assert trace is None
    (fault,) = findings
    assert (fault.kind, fault.where) == (kind, where)
    assert found in fault.found


@pytest.mark.parametrize(
    "data",
    [
        b"\x00\x01\x02" * 50,
        _text().encode() + b"3,\x00,1\n",
        b"x" * 5_000_000,
        bytes([0x81, 0xFF, 0x8D]) * 100,
    ],
)
def test_binary_and_endless_lines_are_unreadable(read: Read, data: bytes) -> None:
    trace, findings = read(data)
    assert trace is None
    assert [one.kind for one in findings] == ["unreadable-file"]


def test_an_endless_head_line_is_refused_without_reading_the_file(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    with path.open("wb") as stream:
        stream.truncate(2_000_000_000)  # a hole in the file: 2 GB that take no room
    findings = Findings()
    assert read_trace(Folder(tmp_path), path, AREA_M2, AUTOMATIC, findings) is None
    assert [one.kind for one in findings] == ["unreadable-file"]


@pytest.mark.parametrize("above", ["", "one line\n"])
def test_a_line_of_heads_that_never_ends_is_refused(read: Read, above: str) -> None:
    trace, findings = read(above + "t / s,E / V,I / mA" + "x" * 200_000)
    assert trace is None
    (fault,) = findings
    assert fault.kind == "unreadable-file"
    assert "a line of more than" in fault.found


def test_a_long_head_is_cut_in_messages(read: Read) -> None:
    _, findings = read("t / s,E / V,I / mA" + "x" * 5000 + "\n0,-1,-1\n")
    (fault,) = findings
    assert len(fault.where + fault.found + fault.mend) < 500


def test_the_head_that_may_be_meant_is_never_that_of_another_quantity(read: Read) -> None:
    (fault,) = read("t / s,E / V,Q / mC\n0,-1,-1\n")[1]
    assert "Q / mC" not in fault.mend
    (fault,) = read("t / s,E / V,I [mA]\n0,-1,-1\n")[1]
    assert "'I [mA]' as 'I / mA'" in fault.mend


def test_a_head_line_far_down_is_found(read: Read) -> None:
    trace, findings = read("setting of the instrument, line after line\n" * 5000 + _text())
    assert findings == []
    _assert_rows(trace)


def test_a_missing_file_and_a_link_to_the_outside_are_faults(tmp_path: Path) -> None:
    (tmp_path / "outside.csv").write_text(_text(), encoding="utf-8")
    inside = tmp_path / "day"
    inside.mkdir()
    (inside / "link.csv").symlink_to(tmp_path / "outside.csv")
    findings = Findings()
    assert read_trace(Folder(inside), inside / "none.csv", AREA_M2, AUTOMATIC, findings) is None
    assert read_trace(Folder(inside), inside / "link.csv", AREA_M2, AUTOMATIC, findings) is None
    assert [one.kind for one in findings] == ["missing-file", "outside-folder"]


def test_long_traces_read_alike_by_both_readers(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    generator = np.random.default_rng(7)
    time = np.cumsum(generator.uniform(0.1, 1.0, 5000))
    potential, current = generator.normal(-1.5, 0.01, 5000), generator.normal(-10, 1, 5000)
    rows = "".join(f"{a:.3f},{b:.6f},{c:.5f}\n" for a, b, c in zip(time, potential, current, strict=True))
    path = tmp_path / "a.csv"
    path.write_text("t / s,E / V,I / mA\n" + rows, encoding="utf-8")
    first = read_trace(Folder(tmp_path), path, AREA_M2, AUTOMATIC, Findings())
    monkeypatch.delitem(sys.modules, "pandas", raising=False)
    second = read_trace(Folder(tmp_path), path, AREA_M2, AUTOMATIC, Findings())
    assert first is not None
    assert second is not None
    # pandas reads a decimal to within one unit in the last place
    np.testing.assert_allclose(first.time_second, second.time_second, rtol=4.5e-16)
    np.testing.assert_allclose(first.current_ampere, np.round(current, 5) * 1e-3, rtol=1e-15)


def test_two_threads_read_what_one_reads(tmp_path: Path) -> None:
    for number in range(20):
        (tmp_path / f"{number}.csv").write_text(_text().replace("-1.25", f"-1.{number:02}"), encoding="utf-8")

    def potential(number: int) -> float:
        trace = read_trace(Folder(tmp_path), tmp_path / f"{number}.csv", AREA_M2, AUTOMATIC, Findings())
        assert trace is not None
        return float(trace.potential_volt[1])

    with ThreadPoolExecutor(2) as pool:
        assert list(pool.map(potential, range(20))) == [-float(f"1.{number:02}") for number in range(20)]


def test_small_traces_are_read_without_pandas(tmp_path: Path) -> None:
    (tmp_path / "a.csv").write_text(_text(), encoding="utf-8")
    code = (
        "import sys; from pathlib import Path; from coulombook.findings import Findings; "
        "from coulombook.intake.files import Folder; from coulombook.intake.settings import TraceOptions; "
        "from coulombook.intake.traces import read_trace; folder = Path(sys.argv[1]); "
        "assert read_trace(Folder(folder), folder / 'a.csv', 1e-4, TraceOptions({}), Findings()); "
        "sys.exit('pandas' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code, str(tmp_path)], check=False).returncode == 0


def test_large_days_are_read_with_pandas(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.csv").write_text(_text(), encoding="utf-8")
    monkeypatch.delitem(sys.modules, "pandas", raising=False)
    used: list[str] = []
    whole = fast_body.with_pandas
    monkeypatch.setattr(fast_body, "with_pandas", lambda *given: used.append("pandas") or whole(*given))
    read_trace(
        Folder(tmp_path), tmp_path / "a.csv", AREA_M2, AUTOMATIC, Findings(), fast_body.PANDAS_PAYS_BYTE - 1
    )
    assert used == []
    read_trace(
        Folder(tmp_path), tmp_path / "a.csv", AREA_M2, AUTOMATIC, Findings(), fast_body.PANDAS_PAYS_BYTE
    )
    assert used == ["pandas"]


def test_a_voltammogram_has_potential_current_and_what_else_there_is(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("E / mV\tI / uA\tcycle\n-100\t5\t1\n-200\t-5\t1\n-100\t5\t2\n", encoding="utf-8")
    read = read_voltammogram(Folder(tmp_path), path, AREA_M2, AUTOMATIC, Findings())
    assert read is not None
    np.testing.assert_allclose(read.potential_volt, [-0.1, -0.2, -0.1], rtol=1e-15)
    np.testing.assert_allclose(read.current_ampere, [5e-6, -5e-6, 5e-6], rtol=1e-15)
    assert read.cycle is not None
    np.testing.assert_array_equal(read.cycle, [1, 1, 2])
    assert read.time_second is None


def test_an_empty_voltammogram_is_a_broken_scan(tmp_path: Path) -> None:
    (tmp_path / "a.csv").write_text("E / V,I / mA\n", encoding="utf-8")
    findings = Findings()
    assert read_voltammogram(Folder(tmp_path), tmp_path / "a.csv", AREA_M2, AUTOMATIC, findings) is None
    assert [one.kind for one in findings] == ["broken-scan"]
