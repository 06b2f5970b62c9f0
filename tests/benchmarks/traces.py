"""Reading one long trace with all checks, against `pandas.read_csv` on the same file; prints JSON.

    python -m tests.benchmarks.traces FOLDER REPEATS

pandas gets the arguments that the file needs and no more; where there are two ways, the faster one.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from tests.benchmarks.measure import in_turns, timed

from coulombook.balance.trace_figures import TraceRequest, figures_of
from coulombook.findings import Findings
from coulombook.intake.files import Folder
from coulombook.intake.settings import TraceOptions
from coulombook.intake.traces import read_trace

ROWS = 1_000_000
HEAD = "Potentiostat log (invented)\nElectrolyte: 0.1 mol/L KHCO3\n\n"
UMLAUT = "Potentiostat-Protokoll (erfunden)\nElektrolyt: gesättigt mit CO2, 25 °C\n\n"

# name -> separator, decimal sign, text above the heads, encoding, what pandas is told
DIALECTS: Mapping[str, tuple[str, str, str, str, dict[str, Any]]] = {
    "comma": (",", ".", "", "utf-8", {}),
    "tab": ("\t", ".", "", "utf-8", {"sep": "\t"}),
    "semicolon, decimal comma": (";", ",", "", "utf-8", {"sep": ";", "decimal": ","}),
    "head lines": (",", ".", HEAD, "utf-8", {"skiprows": 3}),
    # told that it is UTF-8 with errors, pandas takes a third of the time it takes with the true encoding
    "Windows-1252": (",", ".", UMLAUT, "cp1252", {"skiprows": 3, "encoding_errors": "replace"}),
}


def write(path: Path, separator: str, decimal: str, head: str, encoding: str) -> None:
    """A trace of three columns, the same numbers in every dialect."""
    generator = np.random.default_rng(7)
    time = np.arange(ROWS) * 0.02
    potential = -1.5 + 0.002 * generator.standard_normal(ROWS)
    current = -10 + 0.1 * generator.standard_normal(ROWS)
    rows = zip(time.tolist(), potential.tolist(), current.tolist(), strict=True)
    body = "".join(f"{t:.2f},{e:.5f},{i:.5f}\n" for t, e, i in rows)
    # the separator for now is a comma, which is no part of a number yet
    body = body.replace(",", separator).replace(".", decimal)
    path.write_bytes((head + separator.join(("t / s", "E / V", "I / mA")) + "\n" + body).encode(encoding))


def measure(folder: Path, repeats: int) -> dict[str, dict[str, float]]:
    """Seconds of each dialect: ours with all checks, ours with the integration as well, and pandas."""
    folder.mkdir()
    found = {}
    day = Folder(folder)
    request = TraceRequest(
        100.0, 18000.0, np.array([400.0, 800.0, 1200.0, 1600.0]), np.array([np.inf]), 120.0, 25.0, None
    )
    for name, (separator, decimal, head, encoding, told) in DIALECTS.items():
        path = folder / "trace.csv"
        write(path, separator, decimal, head, encoding)

        def read(path: Path = path) -> Any:
            findings = Findings()
            trace = read_trace(day, path, 1e-4, TraceOptions({}), findings, path.stat().st_size)
            if trace is None:
                raise RuntimeError(str(tuple(findings)))
            return trace

        def by_pandas(path: Path = path, told: dict[str, Any] = told) -> pd.DataFrame:
            return pd.read_csv(path, **told)

        ours, theirs = read(), by_pandas()
        np.testing.assert_array_equal(ours.time_second, theirs["t / s"])
        np.testing.assert_allclose(ours.current_ampere, theirs["I / mA"] * 1e-3, rtol=1e-15)
        costs = in_turns(
            {
                "ours": timed(read),
                "pandas": timed(by_pandas),
                "integrated": timed(lambda: figures_of(read(), request)),
            },
            repeats,
        )
        found[name] = {side: cost.second for side, cost in costs.items()}
        path.unlink()
    return found


if __name__ == "__main__":
    print(json.dumps(measure(Path(sys.argv[1]), int(sys.argv[2]))))
