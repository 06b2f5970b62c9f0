"""The other side of a tally with its page: the figures of a day as one draws them by hand with matplotlib.

    python draw_by_hand.py FIGURES OUT LOGS DAY CALIBRATIONS TABLE SEPARATOR DECIMAL HEAD_LINES ENCODING

First the Faradaic efficiencies by by_hand.py, then every figure of the page, from the tables in FIGURES that
`coulombook figures` wrote; LOGS is `yes` to draw those of the runs as well. One sheet is used again and again, letters
stay letters, no legend is laid out with care, and no mark can be told from another afterwards.
"""

import runpy
import sys
from pathlib import Path

import matplotlib as mpl
import pandas as pd
from matplotlib.figure import Figure
from matplotlib.ticker import LogLocator, NullFormatter

figures, out, logs, *by_hand = sys.argv[1:]
sys.argv = ["by_hand.py", *by_hand]
runpy.run_path(str(Path(__file__).with_name("by_hand.py")))

mpl.rcParams["svg.fonttype"] = "none"
HATCHES = ("", "////", "....", "xxxx", "----", "||||")
E, U_E = "E vs RHE / V", "u(E vs RHE) / V"
figure = Figure(figsize=(3.35, 2.6))


def logarithmic(axis):
    axis.set_minor_locator(LogLocator(10.0, subs=(2.0, 5.0), numticks=100))
    axis.set_minor_formatter(NullFormatter())


def efficiencies(rows):
    axes = figure.subplots()
    products, whole = rows[rows["what"] == "product"], rows[rows["what"] == "total"]
    place = {level: number for number, level in enumerate(rows["level"].unique())}
    height = dict.fromkeys(place, 0.0)
    for number, (name, members) in enumerate(products.groupby("product", sort=False)):
        at = [place[level] for level in members["level"]]
        below = [height[level] for level in members["level"]]
        axes.bar(
            at, members["FE / %"], bottom=below, label=name, hatch=HATCHES[number % 6], edgecolor="black"
        )
        for level, value in zip(members["level"], members["FE / %"], strict=True):
            height[level] += value
    axes.errorbar([place[level] for level in whole["level"]], whole["FE / %"], whole["u(FE) / %"], fmt="D")
    axes.set_xticks(
        list(place.values()), [f"{one:.2f}" for one in rows.groupby("level", sort=False)[E].first()]
    )
    axes.set_xlabel(E)
    axes.set_ylabel("FE / %")
    axes.legend(fontsize=6, ncols=3)


def currents(rows):
    axes = figure.subplots()
    for name, members in rows.groupby("product", sort=False):
        j = "j / mA cm^-2"
        axes.errorbar(
            members[E], members[j], members[f"u({j[0]}){j[1:]}"], members[U_E], marker="o", label=name
        )
    axes.set_yscale("log")
    logarithmic(axes.yaxis)
    axes.set_xlabel(E)
    axes.legend(fontsize=6, ncols=3)


def selectivity(rows):
    axes = figure.subplots()
    for name, members in rows.groupby("catalyst", sort=False):
        axes.errorbar(
            members[E], members["C2+/C1"], members["u(C2+/C1)"], members[U_E], marker="o", label=name
        )
    axes.set_xlabel(E)
    axes.legend(fontsize=6)


def closure(rows):
    axes = figure.subplots()
    axes.errorbar(range(len(rows)), rows["total FE / %"], rows["high / %"] - rows["total FE / %"], fmt="o")
    axes.axhline(100.0, ls="--")
    axes.set_xticks(range(len(rows)), rows["run"], rotation=90)
    axes.set_ylabel("total FE / %")


def budget(rows):
    axes = figure.subplots()
    axes.barh(range(len(rows)), rows["share / %"])
    axes.set_yticks(range(len(rows)), rows["source"])
    axes.set_xlabel("share of the variance / %")


def curve(rows):
    upper, lower = figure.subplots(2, 1, sharex=True, height_ratios=(2, 1))
    x, y, residual, curve_band, reading_band = rows.columns[1:6]
    standards, line = rows[rows["what"].str.contains("standard")], rows[rows["what"] == "curve"]
    upper.plot(line[x], line[y])
    upper.plot(standards[x], standards[y], "o")
    upper.set_xscale("log")
    upper.set_yscale("log")
    lower.fill_between(line[x], -line[reading_band], line[reading_band], alpha=0.3)
    lower.fill_between(line[x], -line[curve_band], line[curve_band], alpha=0.5)
    lower.plot(standards[x], standards[residual], "o")
    for axis in (upper.xaxis, upper.yaxis, lower.xaxis):
        logarithmic(axis)
    lower.set_xlabel(x)
    lower.set_ylabel(residual)
    upper.set_ylabel(y)


def capacitance(rows):
    axes = figure.subplots()
    for what, style in (("scan", "o"), ("line", "-")):
        members = rows[rows["what"] == what]
        axes.plot(members["scan rate / mV s^-1"], members["charging current / mA"], style)
    axes.set_xlabel("scan rate / mV s^-1")
    axes.set_ylabel("charging current / mA")


def trace(rows):
    upper, lower = figure.subplots(2, 1, sharex=True)
    log = rows[rows["what"] == "log"]
    for axes, quantity in ((upper, "I / mA"), (lower, "E / V")):
        axes.fill_between(log["time / s"], log[f"lowest {quantity}"], log[f"highest {quantity}"])
        axes.set_ylabel(quantity)
    for time in rows[rows["what"] == "injection"]["time / s"]:
        upper.axvline(time)
    lower.set_xlabel("t / s")


KINDS = {
    "fe": efficiencies, "partial-currents": currents, "selectivity": selectivity, "closure": closure, "budget": budget,
    "curve": curve, "capacitance": capacitance, "trace": trace,
}  # fmt: skip
Path(out).mkdir(exist_ok=True)
for table in sorted(Path(figures).glob("*.csv")):
    draw = next(one for kind, one in KINDS.items() if table.stem == kind or table.stem.startswith(f"{kind}-"))
    if draw is trace and logs != "yes":
        continue
    figure.clear()
    draw(pd.read_csv(table))
    figure.tight_layout()
    figure.savefig(Path(out) / f"{table.stem}.svg")
