"""A real spreadsheet program, LibreOffice without a window, for tests of the workbook.

`recalculated` takes away every cached value first, so that what comes back was computed by the program and by
nothing else.
"""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import zipfile
from collections.abc import Mapping
from io import BytesIO
from pathlib import Path

import pytest

# set where every test must run: a program that is missing is then a failure, and no reason to skip
ALL_TESTS = "COULOMBOOK_ALL_TESTS"
_CACHED = re.compile(rb"(<f>[^<]*</f>)<v>[^<]*</v>")


def program() -> str:
    """Path of the program; skips the test where there is none, or fails it where all must run."""
    found = shutil.which("soffice") or shutil.which("libreoffice")
    if found is None:
        reason = "LibreOffice (soffice) is not installed: no spreadsheet program can recalculate the workbook"
        if os.environ.get(ALL_TESTS):
            pytest.fail(reason)
        pytest.skip(reason)
    return found


def without_cached_values(workbook: bytes) -> bytes:
    """The same workbook with nothing but the formula in every formula cell."""
    changed = BytesIO()
    taken = 0
    with zipfile.ZipFile(BytesIO(workbook)) as before, zipfile.ZipFile(changed, "w", zipfile.ZIP_DEFLATED) as after:
        for name in before.namelist():
            content = before.read(name)
            if name.startswith("xl/worksheets/"):
                content, count = _CACHED.subn(rb"\1", content)
                taken += count
            after.writestr(name, content)
    assert taken, "the workbook held no cached value"
    return changed.getvalue()


def recalculated(workbooks: Mapping[str, bytes], folder: Path) -> dict[str, Path]:
    """Workbooks by name, recalculated from nothing; one start of the program for all of them."""
    soffice = program()
    given, back = folder / "given", folder / "back"
    given.mkdir(parents=True)
    for name, content in workbooks.items():
        (given / f"{name}.xlsx").write_bytes(without_cached_values(content))
    command = [
        soffice,
        f"-env:UserInstallation={(folder / 'profile').as_uri()}",
        "--headless",
        "--norestore",
        "--convert-to",
        "xlsx:Calc MS Excel 2007 XML",
        "--outdir",
        str(back),
        *(str(given / f"{name}.xlsx") for name in workbooks),
    ]
    done = subprocess.run(command, capture_output=True, text=True, timeout=600, check=False)
    paths = {name: back / f"{name}.xlsx" for name in workbooks}
    assert all(path.is_file() for path in paths.values()), done.stdout + done.stderr
    return paths
