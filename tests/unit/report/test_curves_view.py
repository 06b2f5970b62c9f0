"""The library of curves on the terminal."""

from __future__ import annotations

import io
from datetime import date, datetime
from pathlib import Path

import numpy as np
import pytest
from rich.cells import cell_len
from tests.unit.library.shelves import falling_rows, gas_rows, write_calibration

from coulombook.balance.readings import Check
from coulombook.curves.control import control_chart
from coulombook.findings import RowOrigin
from coulombook.library.answer import answer
from coulombook.library.checks import ChartedChecks
from coulombook.library.shelf import Entry, open_library
from coulombook.report.checks_view import show_checks
from coulombook.report.curves_view import probability, show_answer
from coulombook.report.terminal import console_for
from coulombook.species import load_species

ON = date(2043, 5, 1)


def shown(shelf: Path, *names: str, width: int = 80, encoding: str = "utf-8", on: date = ON) -> str:
    library = open_library([shelf])
    raw = io.BytesIO()
    console = console_for(
        io.TextIOWrapper(raw, encoding=encoding, errors="backslashreplace", write_through=True)
    )
    console.width = width
    show_answer(answer(library, names, load_species(), on), library, console, on)
    return raw.getvalue().decode(encoding)


@pytest.fixture
def shelf(tmp_path: Path) -> Path:
    for month, slope in ((1, 2.0), (2, 1.97), (3, 1.96), (4, 1.94)):
        rows = gas_rows(slope=slope) + gas_rows("methane", slope=1.0)
        write_calibration(tmp_path, f"gc-{month}", rows, f"2043-0{month}-01", f"2043-0{month + 1}-15")
    return tmp_path


NAMES: list[tuple[str, ...]] = [
    (),
    ("gc-1",),
    ("C2H4@FID",),
    ("gc-1/methane@FID",),
    ("gc-1", "gc-2"),
    ("methane@FID", "gc-1", "gc-2", "gc-3"),
    ("methane@FID", "ethylene@FID"),
]


@pytest.mark.parametrize("width", [80, 120])
@pytest.mark.parametrize("names", NAMES)
def test_everything_keeps_to_the_width(shelf: Path, names: tuple[str, ...], width: int) -> None:
    assert all(cell_len(line) <= width for line in shown(shelf, *names, width=width).splitlines())


@pytest.mark.parametrize("names", NAMES)
def test_a_terminal_of_ascii_gets_ascii(shelf: Path, names: tuple[str, ...]) -> None:
    assert "\\u" not in shown(shelf, *names, encoding="ascii")


def test_the_list_tells_range_limits_validity_and_verdict_of_every_curve(shelf: Path) -> None:
    text = shown(shelf)
    assert "gc-1: gas, 2043-01-01 to 2043-02-15, expired 75 days before 2043-05-01" in text
    assert "gc-4: gas, 2043-04-01 to 2043-05-15, valid on 2043-05-01" in text
    rows = [line.split() for line in text.splitlines() if line.startswith("ethylene@FID")]
    assert len(rows) == 4
    assert rows[0][:5] == ["ethylene@FID", "line", "1/x^2", "6", "10-1000"]
    assert rows[0][-1] == "sound"
    assert float(rows[0][5]) < float(rows[0][6])  # detects less than it quantifies


def test_dates_that_are_missing_or_later_are_said(tmp_path: Path) -> None:
    write_calibration(tmp_path, "a", gas_rows(), "", "")
    write_calibration(tmp_path, "b", gas_rows(), "2043-06-01", "")
    write_calibration(tmp_path, "c", gas_rows(), "2043-04-30", "")
    write_calibration(tmp_path, "d", gas_rows(), "2042-04-30", "2043-04-30")
    text = shown(tmp_path)
    assert "a: gas, no dates" in text
    assert "b: gas, measured 2043-06-01, not yet measured on 2043-05-01" in text
    assert "c: gas, measured 2043-04-30, no end of validity, 1 day old on 2043-05-01" in text
    assert "expired 1 day before 2043-05-01" in text


def test_one_curve_shows_coefficients_limits_and_verdicts_in_words(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", gas_rows(), curve='form = "line through zero"\nweights = "1/x^2"')
    text = shown(tmp_path, "ethylene@FID")
    # the mean of y/x is 2 exactly; sum of squares 94e-6 on 5 degrees of freedom, over 6 points: u = 2 * 0.00177
    assert "a1          2.0000(35)\n" in text
    assert "range       10-1000 ppm" in text
    assert "scatter     a reading, 0.43 % of the response" in text
    assert "(ISO 11843-2)" in text.replace("\n            ", " ")
    assert "form        the line through zero fits (lack of fit F(2, 3) = " in text
    assert "bend        no square term is called for (Mandel F(1, 4) = " in text
    assert "standards   none is outlying" in text
    assert "slope       rises over the whole range" in text
    assert "weights     " not in text  # nothing better to suggest


def test_faults_of_a_curve_are_said_with_the_row_of_the_standard(tmp_path: Path) -> None:
    values = (1.01, 1.98, 3.01, 3.99, 8.0, 6.01, 6.98, 8.01, 9.0)
    write_calibration(
        tmp_path, "gc", [f"FID,ethylene,{x},{y},," for x, y in enumerate(values, 1)], curve='form = "line"'
    )
    text = " ".join(shown(tmp_path, "ethylene@FID").split())
    assert "one is outlying: gc/standards.csv, row 6, x = 5 ppm" in text
    assert "X the outlying one" in text


def test_suggested_weights_are_a_suggestion(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", gas_rows() * 2, curve='form = "line"\nweights = "equal"')
    text = " ".join(shown(tmp_path, "ethylene@FID").split())
    assert "does not follow the weights" in text
    assert "the points speak for weights 1/x^2 instead of equal (Akaike's criterion" in text


def test_a_curve_that_cannot_be_fitted_is_said_to_be_none(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", falling_rows())
    assert "No curve could be fitted" in shown(tmp_path, "ethylene@FID")
    assert "no curve: the standards give no curve." in shown(tmp_path)


def test_a_borrowed_curve_names_its_source(tmp_path: Path) -> None:
    curve = 'form = "line"\nweights = "1/x^2"\n[curve."ethane@FID"]\nlike = "ethylene@FID"'
    write_calibration(tmp_path, "gc", gas_rows(), curve=curve)
    text = shown(tmp_path, "ethane@FID")
    assert "made like ethylene@FID, by effective carbon numbers" in text
    assert "standard (a digit" not in text  # it has none to draw


def test_a_comparison_tells_ratio_interval_and_significance(shelf: Path) -> None:
    text = " ".join(shown(shelf, "ethylene@FID", "gc-1", "gc-4").split())
    # u(slope) 0.43 %/sqrt(6) and more for the intercept: 3 % is far beyond both
    assert "gc-4: the slope changed by -3.0" in text
    assert "% in 3.0 months (95 % interval -3." in text
    assert "significant (p < 0.001)" in text
    text = " ".join(shown(shelf, "methane@FID", "gc-1", "gc-4").split())
    assert "the slope changed by 0.00(" in text
    assert "no more than chance explains (p = 1.0)" in text


def test_the_drift_over_the_months_is_told(shelf: Path) -> None:
    text = " ".join(shown(shelf, "ethylene@FID").split())
    assert "% a month over 4 calibrations (95 % interval -1." in text
    assert "2 degrees of freedom" in text
    assert "lie on one line within their uncertainties" in text


def test_calibrations_are_compared_a_curve_a_line(shelf: Path) -> None:
    text = shown(shelf, "gc-1", "gc-4")
    verdicts = {line.split("@")[0]: line for line in text.splitlines() if "@FID" in line}
    assert verdicts["ethylene"].endswith("differs")
    assert verdicts["methane"].endswith("no difference")
    assert "one curve in twenty" in text


# an escape sequence does not get through the reading of the table
HOSTILE = ("[bold red]x[/]", "\u202egpj", "$\\frac{1}{0}$", "電極")


@pytest.mark.parametrize("channel", HOSTILE)
def test_a_hostile_channel_is_shown_and_not_obeyed(tmp_path: Path, channel: str) -> None:
    write_calibration(tmp_path, "gc", gas_rows(channel=channel) + gas_rows("methane", channel))
    for names in ((), ("ethylene",), ("ethylene", "methane")):
        text = shown(tmp_path, *names)
        assert "\x1b" not in text
        assert "\u202e" not in text
        assert "ethylene@" in text
    if channel.isascii() and channel.isprintable():
        assert f"ethylene@{channel}" in shown(tmp_path, "ethylene")


def test_a_hostile_calibration_is_shown_and_not_obeyed(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc\x1b[2J\u202e[red]", gas_rows())
    for names in ((), ("ethylene",)):
        text = shown(tmp_path, *names)
        assert "\x1b" not in text
        assert "\u202e" not in text
        assert "gc\\x1b[2J\\u202e[red]" in text


@pytest.mark.parametrize(
    ("p", "text"),
    [(0.0341, "p = 0.034"), (0.0001, "p < 0.001"), (1.0, "p = 1.0"), (float("nan"), "p unknown")],
)
def test_a_probability_is_rounded_and_never_zero(p: float, text: str) -> None:
    assert probability(p) == text


def charted(entry: Entry, factors: tuple[float, ...]) -> str:
    assert entry.curve is not None
    x = [1e-4] * len(factors)
    areas = [200.0 * one for one in factors]
    origin = RowOrigin("checks.csv", None, 2, {})
    checks = tuple(
        Check(datetime(2043, 5, 1, 8 + place), "FID", "ethylene", 1e-4, area, origin)
        for place, area in enumerate(areas)
    )
    raw = io.BytesIO()
    console = console_for(
        io.TextIOWrapper(raw, encoding="cp437", errors="backslashreplace", write_through=True)
    )
    console.width = 80
    show_checks(ChartedChecks(entry, "a day", checks, control_chart(entry.curve, x, areas)), console)
    return raw.getvalue().decode("cp437")


def test_checks_stand_on_the_chart_and_in_a_table(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", gas_rows(), curve='form = "line through zero"\nweights = "1/x^2"')
    (entry,) = open_library([tmp_path]).entries
    # a reading scatters by 0.434 %, the curve by 0.177 %: 0.468 % together; +1.2 % is 2.6, +2 % is 4.3 of them
    text = charted(entry, (1.0, 1.012, 1.02))
    rows = [line.split() for line in text.splitlines() if line.startswith("2043-05-01")]
    assert [row[5] for row in rows] == ["0.00", "1.20", "2.00"]
    assert [row[6] for row in rows] == ["0.0", "2.6", "4.3"]
    assert [" ".join(row[7:]) for row in rows] == ["in control", "warning", "action"]
    assert "two of three checks beyond the same warning limit, at 2043-05-01 10:00" in text
    drawn = text.partition("known")[0]
    assert [drawn.count(sign) for sign in ("!", "X")] == [1, 1]


def test_checks_of_a_curve_of_unknown_scatter_are_listed_without_a_chart(tmp_path: Path) -> None:
    write_calibration(tmp_path, "gc", gas_rows()[1:3], curve='form = "line"')
    (entry,) = open_library([tmp_path]).entries
    assert entry.curve is not None
    assert np.isnan(control_chart(entry.curve, [1e-4], [200.0]).score).all()
    text = charted(entry, (1.0,))
    assert "deviation / standard" not in text
    assert [line.split()[-1] for line in text.splitlines() if line.startswith("2043")] == ["-"]
