"""The other side of the comparison: Faradaic efficiencies of a day as one writes them by hand with pandas.

    python by_hand.py DAY CALIBRATIONS OUT SEPARATOR DECIMAL HEAD_LINES ENCODING

No uncertainty, no checks, no units, and made for these very files: settings of the day stand here as numbers. It knows
nothing of coulombook, and a test of the benchmark asserts that both give the same Faradaic efficiencies.
"""

import sys

import numpy as np
import pandas as pd

F, R = 96485.33212, 8.314462618
REFERENCE, REFERENCE_SLOPE = 0.21, -0.73e-3
DEAD_TIME, CURRENT_WINDOW = 25.0, 120.0
MOL_PER_S_PER_SCCM = 1e-6 / 60 * 101325 / (R * 273.15)
NAMES = {"H2": "hydrogen", "CO": "carbon monoxide", "C2H4": "ethylene"}
ELECTRONS = {
    "hydrogen": 2, "carbon monoxide": 2, "methane": 8, "ethylene": 12, "ethane": 14, "formate": 2, "ethanol": 12,
    "n-propanol": 18, "acetate": 8, "acetaldehyde": 10, "allyl alcohol": 16, "methanol": 6,
}  # fmt: skip

day, calibrations, out, separator, decimal, head_lines, encoding = sys.argv[1:]


def table(name):
    return pd.read_csv(f"{day}/{name}.csv", sep=separator, decimal=decimal)


def charge(time, current, start, stop):
    inside = (time > start) & (time < stop)
    t = np.r_[start, time[inside], stop]
    return -np.trapezoid(np.interp(t, time, current), t)


# curves: peak area = f(ppm), weights 1/x^2, hydrogen bends; integral ratio = slope x amount ratio
standards = pd.read_csv(f"{calibrations}/gc-2043-04/standards.csv")
curves = {}
for analyte, rows in standards.groupby("analyte"):
    x = rows["mole fraction / ppm"]
    curves[analyte] = np.polyfit(x, rows["peak area / pA s"], 2 if analyte == "hydrogen" else 1, w=1 / x)
standards = pd.read_csv(f"{calibrations}/nmr-2043-05/standards.csv")
standards["slope"] = standards["integral ratio"] / standards["amount ratio"]
slopes = standards.groupby(["analyte", "signal"])["slope"].mean()


def ppm(analyte, area):
    *bend, slope, offset = curves[analyte]
    if not bend:
        return (area - offset) / slope
    return (-slope + np.sqrt(slope**2 + 4 * bend[0] * (area - offset))) / (2 * bend[0])


# drift of the detector, from the check gas
checks = table("checks").replace({"analyte": NAMES})
checks["at"] = pd.to_datetime(checks["at"])
zero = checks["at"].min()
drift = {}
for analyte, rows in checks.groupby("analyte"):
    factor = rows["peak area / pA s"] / np.polyval(curves[analyte], rows["mole fraction / ppm"])
    drift[analyte] = ((rows["at"] - zero).dt.total_seconds(), factor)

runs = table("runs")
runs["started"] = (pd.to_datetime(runs["started"]) - zero).dt.total_seconds()
gas = table("gas").replace({"analyte": NAMES})
gas = gas[gas["use"] == "yes"]

# traces: charge, potential, and the current that belongs to each injection
times = gas.groupby("run")["time / s"].unique()
currents = []
for number, run in runs.iterrows():
    trace = pd.read_csv(
        f"{day}/traces/{run['run']}.csv",
        sep=separator,
        decimal=decimal,
        skiprows=int(head_lines),
        encoding=encoding,
    )
    t = trace["t / s"].to_numpy()
    i, e = trace["I / mA"].to_numpy() / 1000, trace["E / V"].to_numpy()
    start, stop = run["start / s"], run["stop / s"]
    runs.loc[number, "charge"] = charge(t, i, start, stop)
    runs.loc[number, "potential"] = -charge(t, e, start, stop) / (stop - start)
    for time in times[run["run"]]:
        a, b = max(time - DEAD_TIME - CURRENT_WINDOW, start), min(time - DEAD_TIME, stop)
        currents.append((run["run"], time, charge(t, i, a, b) / (b - a)))

seconds, kelvin = runs["stop / s"] - runs["start / s"], runs["temperature / degC"] + 273.15
runs["E vs RHE / V"] = (
    runs["potential"]
    + REFERENCE + REFERENCE_SLOPE * (kelvin - 298.15)
    + R * kelvin * np.log(10) / F * runs["pH"]
    + (1 - runs["compensated"]) * runs["charge"] / seconds * runs["resistance / ohm"]
)  # fmt: skip

# gas products
gas = gas.merge(pd.DataFrame(currents, columns=["run", "time / s", "current"]), on=["run", "time / s"])
gas = gas.merge(runs[["run", "started", "outlet flow / sccm"]], on="run")
for analyte, rows in gas.groupby("analyte"):
    area = rows["peak area / pA s"] / np.interp(rows["started"] + rows["time / s"], *drift[analyte])
    gas.loc[rows.index, "fraction"] = ppm(analyte, area) * 1e-6
rate = gas["fraction"] * gas["outlet flow / sccm"] * MOL_PER_S_PER_SCCM
gas["FE / %"] = 100 * gas["analyte"].map(ELECTRONS) * F * rate / gas["current"]
from_gas = gas.groupby(["run", "analyte"])["FE / %"].mean()

# liquid products
vials = table("vials")
liquid = table("liquid").merge(vials, on="vial")
liquid["per proton"] = liquid["integral"] / liquid["protons"]
is_standard = liquid["analyte"] == liquid["standard"]
reference = liquid[is_standard].set_index("vial")["per proton"]
liquid = liquid[~is_standard].merge(slopes.rename("slope").reset_index(), on=["analyte", "signal"])
liquid["ratio"] = liquid["per proton"] / liquid["vial"].map(reference) / liquid["slope"]
liquid = liquid.groupby(["vial", "analyte"])["ratio"].mean().reset_index().merge(vials, on="vial")
liquid["umol/mL"] = liquid["ratio"] * liquid["standard amount / umol"] / liquid["aliquot / mL"]
is_blank = liquid["role"] == "blank"
blank = liquid[is_blank].groupby(["compartment", "analyte"])["umol/mL"].mean().rename("blank")
liquid = liquid[~is_blank].merge(blank.reset_index(), on=["compartment", "analyte"], how="left")
liquid["umol/mL"] -= liquid["blank"].fillna(0)
# the last sample of a compartment says what is in it; earlier ones took something away
liquid["left"] = liquid["umol/mL"] * liquid["compartment volume / mL"]
liquid["taken"] = liquid["umol/mL"] * liquid["aliquot / mL"]
if "time / s" in liquid:
    liquid = liquid.sort_values("time / s", na_position="last", kind="stable")
samples = liquid.groupby(["run", "compartment", "analyte"])
last = samples.tail(1).set_index(["run", "compartment", "analyte"])
amount = (last["left"] + samples["taken"].sum() - last["taken"]).rename("umol").reset_index()
run_charge = amount["run"].map(runs.set_index("run")["charge"])
amount["FE / %"] = 100 * amount["analyte"].map(ELECTRONS) * F * amount["umol"] * 1e-6 / run_charge
from_liquid = amount.groupby(["run", "analyte"])["FE / %"].sum()

ledger = pd.concat([from_gas, from_liquid]).reset_index().rename(columns={"analyte": "product"})
ledger.merge(runs[["run", "E vs RHE / V"]], on="run").to_csv(out, index=False)
