"""Days for the benchmarks: a copy of an example day, and days of any number of runs.

    python -m tests.benchmarks.days FOLDER RUNS ROWS

The numbers are invented; they only have to be sensible, so that no finding stands for every run. Calibrations are
those of the examples.
"""

from __future__ import annotations

import os
import shutil
import sys
from dataclasses import dataclass
from datetime import datetime, timedelta
from pathlib import Path

PROJECT = Path(__file__).parents[2]
CALIBRATIONS = PROJECT / "calibrations"
EXAMPLE = PROJECT / "example_experiments" / "2043-05-18-mesh-foil-foam"

FARADAY = 96485.33212
SCCM = 7.4358e-7  # mol/s of gas at 0 degC and 101.325 kPa
INJECTIONS_SECOND = (345, 745, 1145, 1545)
LENGTH_SECOND = 2000
START_SECOND, STOP_SECOND = 20, 1800
DISTINCT_TRACES = 10  # further logs are links to these: as much to read, less to write

# electrons, share of the charge; gas: channel and response per ppm; liquid: signal, protons and slope of its curve
GAS = {
    "hydrogen": (2, 0.40, "TCD", 0.41),
    "carbon monoxide": (2, 0.15, "FID", 0.94),
    "methane": (8, 0.05, "FID", 0.95),
    "ethylene": (12, 0.20, "FID", 1.87),
    "ethane": (14, 0.005, "FID", 1.9),
}
LIQUID = {
    "formate": (2, 0.12, "CH 8.33", 1, 0.934),
    "ethanol": (12, 0.06, "CH3 1.06", 3, 0.988),
    "acetate": (8, 0.015, "CH3 1.79", 3, 0.973),
}

# the example day's, but for the weights of the signals: without uncertainties there are none
SETTINGS = """\
[day]
calibrations = ["gc-2043-04", "nmr-2043-05"]

[reference]
potential = "0.21 V"
"temperature coefficient" = "-0.73 mV/K"

[gas]
outlet_flow = "measured"
meter_gas = "dry"
current_window = "120 s"
dead_time = "25 s"

[liquid]
combine_signals = "mean"

[[uncertainty]]
quantity = "outlet flow"
standard = "1 %"
shared = "day"

[[uncertainty]]
quantity = "peak area"
standard = "1 %"
shared = "reading"

[[uncertainty]]
quantity = "integral"
standard = "1.5 %"
shared = "reading"

[[uncertainty]]
quantity = "standard amount"
standard = "1 %"
shared = "day"

[[uncertainty]]
quantity = "i"
standard = "0.2 %"
shared = "day"

[[uncertainty]]
quantity = "electrode area"
standard = "2 %"
shared = "run"
"""


@dataclass(frozen=True, slots=True)
class Dialect:
    """How a day's tables and traces are written."""

    separator: str
    decimal: str
    head_lines: int  # free text above the heads of a trace
    encoding: str


# the example day's way, and the way that is easiest to read
BENCH = Dialect(";", ",", 3, "cp1252")
PLAIN = Dialect(",", ".", 0, "utf-8")


def copy_example(folder: Path) -> None:
    """The first example day, signals of one analyte averaged without weights."""
    shutil.copytree(EXAMPLE, folder, ignore=shutil.ignore_patterns("results"))
    settings = folder / "day.toml"
    text = settings.read_text(encoding="utf-8")
    if "[liquid]" in text:
        raise ValueError("the example day has settings of its own for liquids; mind them here")
    settings.write_text(f'{text}\n[liquid]\ncombine_signals = "mean"\n', encoding="utf-8")


def write_day(folder: Path, runs: int, rows: int, noise: float = 0.01) -> None:
    """A day of ``runs`` runs, each with a trace of ``rows`` rows, in the plain dialect."""
    import numpy as np

    generator = np.random.default_rng(20430518)

    def near(value: float) -> float:
        return float(value * (1 + noise * generator.standard_normal()))

    folder.mkdir(parents=True)
    (folder / "day.toml").write_text(SETTINGS, encoding="utf-8")
    traces = folder / "traces"
    traces.mkdir()
    names = [f"r{number + 1}" for number in range(runs)]
    time = np.arange(rows + 1) * (LENGTH_SECOND / rows)
    for number, name in enumerate(names):
        path = traces / f"{name}.csv"
        if number < DISTINCT_TRACES:
            potential = -1.5 + 0.002 * noise * generator.standard_normal(len(time))
            current = -10.0 * (1 + noise * generator.standard_normal(len(time)))
            with path.open("w", encoding="utf-8", newline="\n") as stream:
                stream.write("t / s,E / V,I / mA\n")
                np.savetxt(stream, np.column_stack((time, potential, current)), "%.10g,%.5f,%.5f")
        else:
            os.link(traces / f"{names[number % DISTINCT_TRACES]}.csv", path)

    morning, pause = datetime(2043, 5, 18, 7), timedelta(minutes=40)
    heads = (
        "run,catalyst,electrode,level,started,start / s,stop / s,electrode area / cm^2,pH,temperature / degC"
    )
    lines = [f"{heads},resistance / ohm,compensated,outlet flow / sccm"]
    gas = ["run,injection,time / s,channel,analyte,peak area / pA s,use"]
    heads = "vial,run,compartment,compartment volume / mL,aliquot / mL"
    vials = [f"{heads},standard,standard amount / umol,role"]
    liquid = ["vial,analyte,signal,protons,integral"]
    charge = 0.010 * (STOP_SECOND - START_SECOND)
    for number, name in enumerate(names):
        material, level = number // 10, number % 5
        lines.append(
            f"{name},catalyst {material},e{material}-{number // 5 % 2},{level},"
            f"{(morning + number * pause).isoformat()},{START_SECOND},{STOP_SECOND},1,6.8,25,30,0.85,10"
        )
        for injection, at in enumerate(INJECTIONS_SECOND, start=1):
            for analyte, (electrons, share, channel, response) in GAS.items():
                ppm = 1e6 * share * 0.010 / (electrons * FARADAY * 10 * SCCM)
                gas.append(f"{name},{injection},{at},{channel},{analyte},{near(response * ppm):.8g},yes")
        vials.append(f"v-{name},{name},catholyte,30,0.5,DMSO,0.05,sample")
        liquid.append(f"v-{name},DMSO,CH3 2.60,6,{near(600):.8g}")
        for analyte, (electrons, share, signal, protons, slope) in LIQUID.items():
            ratio = 1e6 * share * charge / (electrons * FARADAY) / 30 * 0.5 / 0.05
            liquid.append(f"v-{name},{analyte},{signal},{protons},{near(100 * protons * slope * ratio):.8g}")
    checks = ["at,channel,analyte,mole fraction / ppm,peak area / pA s"]
    for number in range(0, runs + 1, 10):
        for analyte, (_, _, channel, response) in GAS.items():
            at = (morning + number * pause).isoformat()
            checks.append(f"{at},{channel},{analyte},1000,{near(response * 1000):.8g}")
    vials.append("v-blank,,catholyte,,0.5,DMSO,0.05,blank")
    liquid += ["v-blank,DMSO,CH3 2.60,6,600", "v-blank,formate,CH 8.33,1,1.3"]
    tables = {"runs": lines, "gas": gas, "vials": vials, "liquid": liquid, "checks": checks}
    for table, content in tables.items():
        (folder / f"{table}.csv").write_text("\n".join(content) + "\n", encoding="utf-8")


if __name__ == "__main__":
    write_day(Path(sys.argv[1]), int(sys.argv[2]), int(sys.argv[3]))
