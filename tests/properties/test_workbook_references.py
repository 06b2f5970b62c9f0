"""Whatever the order of a day's rows, a formula of the workbook names cells of the same run, injection and analyte."""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from tests.forward.files import Style, write_day
from tests.system.spreadsheet import FIRST_ROW, HEAD_ROW, Cells, read_cells, records, split
from tests.system.test_truth_returns import CASES

import coulombook
from coulombook.report.workbook import workbook_bytes

NAMES = ("drift by check gas", "blanks, aliquots, anolyte, trap and two signals of the standard", "balance")
_REFERENCE = re.compile(r"(?:'([^']+)'|([a-z]+))!\$?([A-Z]+)\$?(\d+)(?::\$?[A-Z]+\$?(\d+))?")

# sheet of the formula, sheet it names -> what both records must agree in: own head, head there
AGREE: Mapping[tuple[str, str], tuple[tuple[str, str], ...]] = {
    ("charge", "runs"): (("run", "run"),),
    ("flow", "runs"): (("run", "run"),),
    ("flow", "charge"): (("run", "run"),),
    ("flow", "compartments"): (("run", "run"),),
    ("gas", "curves"): (("curve", "curve"),),
    ("gas", "checks"): (("channel", "channel"), ("analyte", "analyte")),
    ("injections", "gas"): (("run", "run"), ("injection", "injection"), ("product", "analyte")),
    ("injections", "outlet"): (("run", "run"), ("injection", "injection")),
    ("outlet", "flow"): (("run", "run"),),
    ("outlet", "injections"): (("run", "run"), ("injection", "injection")),
    ("liquid", "vials"): (("vial", "vial"),),
    ("vials", "standard signals"): (("vial", "vial"),),
    ("samples", "liquid"): (("vial", "vial"), ("analyte", "analyte")),
    ("samples", "vials"): (("vial", "vial"),),
    ("compartments", "samples"): (("run", "run"), ("product", "analyte")),
    ("compartments", "vials"): (("run", "run"), ("compartment", "compartment")),
    ("ledger", "charge"): (("run", "run"),),
    ("ledger", "injections"): (("run", "run"),),
    ("ledger", "compartments"): (("run", "run"), ("product", "product")),
    ("summary", "ledger"): (("run", "run"),),
    ("summary", "charge"): (("run", "run"),),
    ("series", "ledger"): (("catalyst", "catalyst"), ("level", "level"), ("product", "product")),
    ("chart data", "series"): (("catalyst", "catalyst"), ("level", "level")),
}


def references(cells: Cells) -> Iterator[tuple[str, Mapping[str, Any], str, Mapping[str, Any]]]:
    """Each formula's sheet and record, with each sheet and record that it names."""
    tables = {
        name: records(held)
        for name, held in cells.items()
        if f"A{HEAD_ROW}" in held and f"A{FIRST_ROW}" in held
    }
    for sheet, held in cells.items():
        for place, cell in held.items():
            for found in _REFERENCE.finditer(cell.formula or ""):
                named = found[1] or found[2]
                for row in range(int(found[4]), int(found[5] or found[4]) + 1):
                    yield (
                        sheet,
                        tables[sheet][split(place)[1] - FIRST_ROW],
                        named,
                        tables[named][row - FIRST_ROW],
                    )


@pytest.mark.parametrize("name", NAMES)
@settings(max_examples=4, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(seed=st.integers(0, 10_000))
def test_formulas_name_records_of_the_same_run_and_analyte(name: str, seed: int) -> None:
    with tempfile.TemporaryDirectory() as folder:
        day = write_day(Path(folder), CASES[name].day(), Style(shuffle=seed))
        cells = read_cells(workbook_bytes(coulombook.tally(day)))
    seen = set()
    for sheet, record, named, other in references(cells):
        seen.add((sheet, named))
        for own, there in AGREE.get((sheet, named), ()):
            assert str(record[own]).casefold() == str(other[there]).casefold(), (sheet, record, named, other)
    assert seen >= {("gas", "curves"), ("injections", "gas"), ("ledger", "injections"), ("summary", "ledger")}


@pytest.mark.parametrize("name", NAMES)
@settings(max_examples=3, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(seed=st.integers(0, 10_000))
def test_the_order_of_rows_moves_no_value(name: str, seed: int) -> None:
    found = []
    for style in (Style(), Style(shuffle=seed)):
        with tempfile.TemporaryDirectory() as folder:
            day = write_day(Path(folder), CASES[name].day(), style)
            cells = read_cells(workbook_bytes(coulombook.tally(day)))
        found.append(
            {
                (row["run"], row["injection"], row["analyte"]): row["mole fraction / ppm"]
                for row in records(cells["gas"])
            }
        )
    assert found[0].keys() == found[1].keys()
    for key, value in found[0].items():
        assert value == pytest.approx(found[1][key], rel=1e-9)
