"""How a case of a broken table is held: as a file and as a sheet of the workbook."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path

import pytest
from tests.faults.answer import Command, Fault, in_workbook
from tests.faults.day import Change

Cases = Mapping[str, tuple[Change, tuple[Fault, ...]]]

as_file_and_sheet = pytest.mark.parametrize("workbook", [False, True], ids=["file", "sheet"])


def refuse_table(
    table: str,
    case: tuple[Change, tuple[Fault, ...]],
    workbook: bool,
    command: Command,
    broken_day: Callable[..., Path],
) -> None:
    """Break one table of the good day and hold that the command says so."""
    change, faults = case
    day = broken_day({f"{table}.csv": change}, workbook=workbook)
    # `check` reads a sheet as `tally` does: to hold it once for the file is enough, and halves the time
    command.refuses(day, [in_workbook(one) for one in faults] if workbook else faults, check=not workbook)
