"""The command in a folder of its own, with room enough for every message on one line."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest
from tests.faults.answer import Command
from tests.faults.day import Changes, write_day


@pytest.fixture(autouse=True)
def workplace(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    # ./calibrations of the place the tests are started from must not be looked at
    place = tmp_path / "work"
    place.mkdir()
    monkeypatch.chdir(place)
    monkeypatch.setenv("COLUMNS", "2000")
    return place


@pytest.fixture
def command(capsys: pytest.CaptureFixture[str]) -> Command:
    return Command(capsys)


@pytest.fixture
def broken_day(workplace: Path) -> Callable[..., Path]:
    """Write the good day with changes; give its folder."""

    def write(changes: Changes | None = None, *, workbook: bool = False) -> Path:
        return write_day(workplace / "day", changes or {}, workbook=workbook)

    return write
