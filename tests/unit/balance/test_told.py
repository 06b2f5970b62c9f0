"""What the account says of a day, and from which number on: each rule held against the day in miniature, a little off.

The total of that day is 47.6487 % (worked by hand in the file contract), 16.0809 % of it formate of an integral of 250.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from statistics import NormalDist

import pytest
from tests.system.test_miniature_day import FILES

import coulombook
from coulombook.findings import Finding, Severity

TOTAL = 0.476487
FORMATE = 0.160809

Files = Mapping[str, str | None]
Tally = Callable[..., coulombook.Book]
Check = Callable[[Files], list[Finding]]


def written(folder: Path, files: Files) -> Path:
    for name, text in {**FILES, **files}.items():
        if text is not None:
            path = folder / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text, encoding="utf-8")
    return folder


@pytest.fixture
def tally(tmp_path: Path) -> Tally:
    count = iter(range(99))
    return lambda files, **more: coulombook.tally(written(tmp_path / f"tallied {next(count)}", files), **more)


@pytest.fixture
def stops(tmp_path: Path) -> Check:
    """The faults of a day."""
    count = iter(range(99))

    def run(files: Files) -> list[Finding]:
        found = coulombook.check(written(tmp_path / f"checked {next(count)}", files)).findings
        return [one for one in found if one.severity is Severity.STOP]

    return run


def kinds(book: coulombook.Book) -> list[str]:
    return [one.kind for one in book.findings]


def told(book: coulombook.Book, kind: str) -> list[Finding]:
    return [one for one in book.findings if one.kind == kind]


def day(gas: str = 'outlet_flow = "inlet"', more: str = "", calibrations: str = '"mini"') -> str:
    return (
        f'[day]\ncalibrations = [{calibrations}]\n[reference]\npotential = "0.210 V"\n[gas]\n{gas}\n{more}\n'
    )


def declare(quantity: str, standard: str, shared: str = "reading") -> str:
    return f'[[uncertainty]]\nquantity = "{quantity}"\nstandard = "{standard}"\nshared = "{shared}"\n'


EXACT = declare("peak area", "0 %") + declare("integral", "0 %") + declare("I", "0 %", "day")
GAS = "run,injection,time / s,channel,analyte,peak area"
LIQUID = "vial,analyte,signal,protons,integral\nv1,DMSO,CH3,6,600\n"
VIALS = "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol"
STANDARDS = "channel,analyte,mole fraction / ppm,peak area\n"
TOML = "calibrations/mini/calibration.toml"
CSV = "calibrations/mini/standards.csv"
NO_LIQUID: dict[str, str | None] = {"vials.csv": None, "liquid.csv": None}
NO_GAS: dict[str, str | None] = {"gas.csv": None}


def gas(*rows: str, head: str = GAS) -> str:
    return "\n".join([head, *rows]) + "\n"


# --- closure ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("level", [0.95, 0.9, 0.5])
@pytest.mark.parametrize(("integral", "side"), [(250.0, "short"), (1100.0, "over")])
def test_a_run_is_open_from_the_allowed_deviation_on(
    tally: Tally, level: float, integral: float, side: str
) -> None:
    factor = NormalDist().inv_cdf(0.5 + level / 2.0)
    off = abs(TOTAL + FORMATE * (integral / 250.0 - 1.0) - 1.0)
    for share, closure in ((0.999, side), (1.001, "closed")):
        allowed = f"{100.0 * share * off / factor:.8f} %"
        book = tally(
            {
                "day.toml": day(more=f'[balance]\nlevel = {level}\nunaccounted = "{allowed}"\n{EXACT}'),
                "liquid.csv": LIQUID + f"v1,formate,CH,1,{integral}\n",
            }
        )
        assert book.summary["closure"].tolist() == [closure]
        assert ("balance-open" in kinds(book)) == (closure != "closed")


def test_the_total_is_told_with_its_uncertainty_and_its_side(tally: Tally) -> None:
    book = tally(
        {
            "day.toml": day(
                more=declare("I", "2 %", "day") + declare("peak area", "0 %") + declare("integral", "0 %")
            )
        }
    )
    (found,) = told(book, "balance-open")
    # a gain of the current moves every efficiency against it: 2 % of 47.6487 %
    assert "47.65(95) %: short" in found.text
    assert found.where == "run a1"


def test_a_day_without_any_uncertainty_cannot_be_adjusted(tally: Tally) -> None:
    files: Files = {**NO_GAS, "day.toml": day(more=EXACT)}
    assert "not-reconciled" in kinds(tally(files, reconcile=True))
    assert "not-reconciled" not in kinds(tally(files))
    slack: Files = {
        **NO_GAS,
        "day.toml": day(more='[balance]\nunaccounted = "2 %"\n' + declare("integral", "1 %")),
    }
    assert "not-reconciled" not in kinds(tally(slack, reconcile=True))


# --- range of the curves ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("areas", "status"),
    [
        ([100.0], "quantified"),
        ([100.001], "above calibration"),
        ([10.0], "quantified"),
        ([9.999], "below calibration"),
        ([150.0, 40.0], "quantified"),  # the mean is held against the range
        ([165.0, 40.0], "above calibration"),
        ([2.0, 17.0], "below calibration"),
        ([2.0, 19.0], "quantified"),
    ],
)
def test_the_mean_of_the_injections_is_held_against_the_range(
    tally: Tally, areas: list[float], status: str
) -> None:
    rows = [f"a1,{n},{1200 + 600 * n},FID,CO,{area}" for n, area in enumerate(areas)]
    book = tally({**NO_LIQUID, "gas.csv": gas(*rows)})
    assert book.ledger["status"].tolist() == [status]
    side = status.split()[0]
    assert [one.where for one in told(book, f"{side}-calibration")] == (
        [] if status == "quantified" else ["run a1, carbon monoxide"]
    )


def test_a_channel_that_covers_the_reading_is_enough(tally: Tally) -> None:
    standards = STANDARDS + "FID,CO,100,10\nFID,CO,1000,100\nTCD,CO,900,9\nTCD,CO,20000,200\n"
    rows = ["a1,1,1800,FID,CO,{0}", "a1,1,1800,TCD,CO,{1}"]
    for x, status in (
        (150.0, "quantified"),
        (5000.0, "quantified"),
        (50.0, "below calibration"),
        (25000.0, "above calibration"),
    ):
        book = tally(
            {**NO_LIQUID, CSV: standards, "gas.csv": gas(*(row.format(0.1 * x, 0.01 * x) for row in rows))}
        )
        assert book.ledger["status"].tolist() == [status], x
        assert [one.where for one in told(book, "several-channels")] == ["gas"]
    # one channel left out is no second one
    single = gas(rows[0].format(15, 0) + ",yes", rows[1].format(0, 1.5) + ",no", head=GAS + ",use")
    assert "several-channels" not in kinds(tally({**NO_LIQUID, CSV: standards, "gas.csv": single}))


NMR: dict[str, str | None] = {
    **NO_GAS,
    "day.toml": day(calibrations='"nmr"'),
    "calibrations/nmr/calibration.toml": 'kind = "liquid"\n[curve]\nform = "line through zero"\n',
    "calibrations/nmr/standards.csv": "analyte,signal,amount ratio,integral ratio\n"
    "formate,CH,0.5,0.5\nformate,CH,4,4\n",
}


@pytest.mark.parametrize(
    ("integral", "status"),
    [
        (50.0, "quantified"),
        (49.99, "below calibration"),
        (400.0, "quantified"),
        (400.01, "above calibration"),
    ],
)
def test_a_liquid_reading_is_held_against_the_range_of_its_signal(
    tally: Tally, integral: float, status: str
) -> None:
    book = tally({**NMR, "liquid.csv": LIQUID + f"v1,formate,CH,1,{integral}\n"})
    assert book.ledger["status"].tolist() == [status]


def test_a_signal_without_a_curve_is_counted_and_told_once(tally: Tally) -> None:
    vials = VIALS + "\nv1,a1,catholyte,30,0.5,DMSO,0.2\nv2,a1,anolyte,30,0.5,DMSO,0.2\n"
    liquid = LIQUID + "v2,DMSO,CH3,6,600\nv1,formate,CH,1,250\nv1,ethanol,CH3,3,3\nv2,ethanol,CH3,3,3\n"
    book = tally({**NMR, "vials.csv": vials, "liquid.csv": liquid})
    (found,) = told(book, "no-curve")
    assert found.text.startswith("ethanol CH3 has no curve")
    # 3/3 over 600/6 of 0.2 umol in 0.5 mL: 0.004 umol/mL in twice 30 mL
    row = book.ledger.set_index("product").loc["ethanol"]
    assert row["amount / umol"] == pytest.approx(0.24, rel=1e-9)
    assert row["status"] == "quantified"
    # without any liquid calibration there is none that it could be missing from
    assert "no-curve" not in kinds(tally({"vials.csv": vials, "liquid.csv": liquid}))


# --- doubts ----------------------------------------------------------------------------------------------------------


def test_a_sample_below_its_blank_is_counted_as_it_is_and_told(tally: Tally) -> None:
    vials = (
        VIALS + ",role\nv1,a1,catholyte,30,0.5,DMSO,0.2,sample\nb1,,Catholyte,,0.5,DMSO,0.2,blank\n"
        "b2,,anolyte,,0.5,DMSO,0.2,blank\n"
    )
    liquid = (
        LIQUID
        + "v1,formate,CH,1,250\nb1,DMSO,CH3,6,600\nb1,formate,CH,1,{}\nb2,DMSO,CH3,6,600\nb2,formate,CH,1,9\n"
    )
    low = tally({"vials.csv": vials, "liquid.csv": liquid.format(300)})
    (found,) = told(low, "negative-amount")
    # a fifth of what 250 gives, below zero
    assert found.text.startswith("FE comes out as -3.22 %")
    assert found.where == "run a1, formate"
    assert low.ledger.set_index("product").loc["formate", "FE / %"] == pytest.approx(
        -20.0 * FORMATE, rel=1e-5
    )
    assert "negative-amount" not in kinds(tally({"vials.csv": vials, "liquid.csv": liquid.format(200)}))


def test_an_uncertainty_that_moves_nothing_is_told_unless_it_is_zero(tally: Tally) -> None:
    idle = (
        declare("outlet flow", "1 %", "day")
        + declare("tracer flow", "0 %", "day")
        + declare("inlet flow", "1 %", "day")
    )
    found = told(tally({"day.toml": day(more=idle)}), "uncertainty-not-used")
    assert [one.text.partition(" (")[0] for one in found] == ["the uncertainty of outlet flow"]


def test_a_run_without_readings_is_told_and_is_not_open(tally: Tally) -> None:
    runs = FILES["runs.csv"] + "a2,mesh,m1,1.0,6.8,10,20\n"
    book = tally({"runs.csv": runs, "traces/a2.csv": FILES["traces/a1.csv"]})
    assert [one.where for one in told(book, "no-products")] == ["run a2"]
    assert [one.where for one in told(book, "balance-open")] == ["run a1"]


@pytest.mark.parametrize(("parted", "odd"), [(0.044, False), (0.0495, True)])
def test_signals_disagree_where_chance_parts_them_less_than_once_in_a_thousand(
    tally: Tally, parted: float, odd: bool
) -> None:
    # chi-square of one degree of freedom passes 10.83 once in a thousand: 3.29 standard deviations of the difference,
    # which are sqrt(1 + (1 + d)^2) % here
    assert (parted / (0.01 * (1.0 + (1.0 + parted) ** 2) ** 0.5) > 3.29) == odd
    rows = f"v1,ethanol,CH3,3,300\nv1,ethanol,CH2,2,{200 * (1 + parted)}\n"
    book = tally({"day.toml": day(more=declare("integral", "1 %")), "liquid.csv": LIQUID + rows})
    assert len(told(book, "signals-disagree")) == int(odd)


# --- readings a curve does not reach ---------------------------------------------------------------------------------

# y = 0.1 x - 2e-5 x^2: its top is 125 at 2500 ppm
TOPPED: dict[str, str | None] = {
    **NO_LIQUID,
    TOML: 'kind = "gas"\n[curve]\nform = "quadratic"\n',
    CSV: STANDARDS + "".join(f"FID,CO,{x},{0.1 * x - 2e-5 * x * x}\n" for x in (100, 500, 1000, 2000)),
}


def test_a_peak_beyond_the_top_of_its_curve_is_a_fault_while_it_is_used(stops: Check, tally: Tally) -> None:
    (found,) = stops({**TOPPED, "gas.csv": gas("a1,1,1800,FID,CO,130")})
    assert (found.kind, found.where) == ("broken-curve", "gas.csv, row 2, column 'peak area'")
    assert found.found == "130"
    assert found.expected == "an area below that of the curve's turning point, 125"
    rows = ["a1,1,1800,FID,CO,130,no", "a1,2,2400,FID,CO,100,yes"]
    assert len(tally({**TOPPED, "gas.csv": gas(*rows, head=GAS + ",use")}).ledger) == 1
    assert len(tally({**TOPPED, "gas.csv": gas("a1,1,1800,FID,CO,124.9")}).ledger) == 1


def test_the_top_of_a_curve_moves_with_the_drift(stops: Check) -> None:
    runs = (
        FILES["runs.csv"]
        .replace("flow / sccm\n", "flow / sccm,started\n")
        .replace(",20\n", ",20,2043-05-18T09:00:00\n")
    )
    # the check of 1000 ppm reads 72 of 80
    checks = "at,channel,analyte,mole fraction / ppm,peak area\n2043-05-18T08:00:00,FID,CO,1000,72\n"
    files: Files = {**TOPPED, "runs.csv": runs, "checks.csv": checks}
    (found,) = stops({**files, "gas.csv": gas("a1,1,1800,FID,CO,113")})
    assert found.expected == "an area below that of the curve's turning point, 112.5"
    assert stops({**files, "gas.csv": gas("a1,1,1800,FID,CO,112")}) == []


def test_an_integral_beyond_the_bottom_of_its_curve_is_a_fault(stops: Check) -> None:
    # y = 0.2 + 0.5 x + 0.25 x^2 rises from x = -1 on, where it is -0.05
    standards = "".join(f"formate,CH,{x},{0.2 + 0.5 * x + 0.25 * x * x}\n" for x in (0.0, 1.0, 2.0, 3.0))
    files: Files = {
        **NMR,
        "calibrations/nmr/calibration.toml": 'kind = "liquid"\n[curve]\nform = "quadratic"\n',
        "calibrations/nmr/standards.csv": "analyte,signal,amount ratio,integral ratio\n" + standards,
    }
    (found,) = stops({**files, "liquid.csv": LIQUID + "v1,formate,CH,1,-6\n"})
    assert (found.kind, found.where) == ("broken-curve", "liquid.csv, row 3, column 'integral'")
    assert found.expected == "an integral ratio per proton above that of the curve's turning point, -0.05"
    assert stops({**files, "liquid.csv": LIQUID + "v1,formate,CH,1,-4\n"}) == []


# --- currents and flows ----------------------------------------------------------------------------------------------

WAVERING = "t / s,E / V,I / mA\n0,-1.5,-10\n1600,-1.5,-10\n1610,-1.5,{0}\n1900,-1.5,{0}\n1910,-1.5,-10\n3600,-1.5,-10\n"


def test_a_current_that_is_not_cathodic_where_it_counts_is_a_fault(stops: Check) -> None:
    (found,) = stops({"traces/a1.csv": WAVERING.format(2)})
    assert (found.kind, found.found) == ("anodic-run", "2 mA")
    assert found.where.startswith("run a1, injection 1 (gas.csv, row 2")
    assert stops({"traces/a1.csv": WAVERING.format(-2)}) == []
    rows = ["a1,1,1800,FID,CO,50,no", "a1,2,3000,FID,CO,50,yes"]
    assert stops({"traces/a1.csv": WAVERING.format(2), "gas.csv": gas(*rows, head=GAS + ",use")}) == []


def test_a_flow_that_is_used_up_is_a_fault(stops: Check) -> None:
    runs = (
        FILES["runs.csv"]
        .replace("flow / sccm\n", "flow / sccm,carbonate uptake / umol/s\n")
        .replace(",20\n", ",20,{}\n")
    )
    files: Files = {**NO_LIQUID, "day.toml": day('outlet_flow = "balance"')}
    # the inlet is 14.871678 umol/s
    (found,) = stops({**files, "runs.csv": runs.format(15.0)})
    assert (found.kind, found.expected) == ("not-allowed", "a flow above zero")
    assert found.found.startswith("-0.128")
    assert stops({**files, "runs.csv": runs.format(14.0)}) == []


# --- peaks and curves ------------------------------------------------------------------------------------------------


def test_an_injection_has_one_time(stops: Check) -> None:
    (found,) = stops({"gas.csv": gas("a1,1,1800,FID,CO,50", "a1,1,1801,FID,C2H4,20")})
    assert (found.kind, found.where, found.found) == (
        "not-allowed",
        "gas.csv, row 3, column 'time / s'",
        "1801 s",
    )
    assert found.expected.startswith("1800 s, as in gas.csv, row 2")


def test_injections_stand_by_run_and_time(tally: Tally) -> None:
    runs = FILES["runs.csv"] + "a2,mesh,m1,1.0,6.8,10,20\n"
    rows = ["a2,x,900,FID,CO,40", "a1,late,3000,FID,CO,30", "a1,early,600,FID,CO,20", "a2,y,600,FID,CO,10"]
    book = tally(
        {**NO_LIQUID, "runs.csv": runs, "traces/a2.csv": FILES["traces/a1.csv"], "gas.csv": gas(*rows)}
    )
    assert book.injections["injection"].tolist() == ["early", "late", "y", "x"]
    assert book.injections["mole fraction / ppm"].tolist() == pytest.approx([200.0, 300.0, 100.0, 400.0])


def test_a_peak_without_a_curve_is_a_fault_while_it_is_used(stops: Check, tally: Tally) -> None:
    (found,) = stops({"gas.csv": gas("a1,1,1800,TCD,CO,50", "a1,2,2400,TCD,CO,50", "a1,2,2400,FID,CO,50")})
    assert found.kind == "missing-curve"
    assert found.text == "no curve for carbon monoxide on channel TCD (2 peaks)"
    assert found.mend == "did you mean channel FID?"
    (other,) = stops({"gas.csv": gas("a1,1,1800,FID,CH4,50")})
    assert "mark the peaks with use = no" in other.mend
    idle = gas(
        "a1,1,1800,TCD,CO,50,no", "a1,1,1800,FID,CO,50,yes", "a1,1,1800,TCD,N2,9,yes", head=GAS + ",use"
    )
    assert tally({**NO_LIQUID, "gas.csv": idle}).ledger["FE / %"].tolist() == pytest.approx(
        [14.3490], abs=5e-5
    )


def test_a_check_gas_without_a_curve_corrects_nothing_and_is_told(tally: Tally) -> None:
    runs = (
        FILES["runs.csv"]
        .replace("flow / sccm\n", "flow / sccm,started\n")
        .replace(",20\n", ",20,2043-05-18T09:00:00\n")
    )
    checks = "at,channel,analyte,mole fraction / ppm,peak area\n"
    checks += "2043-05-18T08:00:00,TCD,CO,500,40\n2043-05-18T08:00:00,TCD,N2,500,40\n"
    book = tally({"runs.csv": runs, "checks.csv": checks})
    assert [one.where for one in told(book, "injection-left-out")] == ["checks.csv, row 2, column 'analyte'"]
    assert book.ledger.set_index("product").loc["carbon monoxide", "FE / %"] == pytest.approx(
        14.3490, abs=5e-5
    )
    found = tally({"runs.csv": runs, "checks.csv": checks.replace("TCD,CO", "FID,CO")})
    # a check of 500 ppm that reads 40 of 50: the gas holds five fourths of what it seemed
    assert found.ledger.set_index("product").loc["carbon monoxide", "FE / %"] == pytest.approx(
        17.93623, abs=1e-5
    )


def test_two_calibrations_with_one_curve_are_a_fault(stops: Check) -> None:
    (found,) = stops(
        {
            "day.toml": day(calibrations='"mini", "other"'),
            "calibrations/other/calibration.toml": FILES[TOML],
            "calibrations/other/standards.csv": STANDARDS + "fid,CO,100,10\nFID,CH4,100,10\n",
        }
    )
    assert found.kind == "duplicate"
    assert "carbon monoxide" in found.text


LIKE = 'kind = "gas"\n[curve]\nform = "line through zero"\n[curve."{}@FID"]\nlike = "{}@FID"\n'


def test_a_curve_that_cannot_be_borrowed_is_a_fault(stops: Check) -> None:
    # carbon monoxide gives no signal on a flame without a methaniser
    standards = STANDARDS + "FID,ethylene,100,20\nFID,ethylene,1000,200\n"
    toml = LIKE.format("carbon monoxide", "ethylene")
    (found,) = stops({**NO_LIQUID, TOML: toml, CSV: standards, "gas.csv": gas("a1,1,1800,FID,CO,50")})
    assert found.kind == "broken-curve"
    assert "carbon monoxide gives no signal" in found.text


def test_one_standard_makes_a_curve_without_scatter_and_without_limits(tally: Tally) -> None:
    book = tally(
        {**NO_LIQUID, CSV: STANDARDS + "FID,CO,1000,100\n", "gas.csv": gas("a1,1,1800,FID,CO,0.001")}
    )
    assert len(told(book, "curve-without-scatter")) == 1
    row = book.ledger.iloc[0]
    assert row["status"] == "below calibration"
    assert row["FE limit / %"] != row["FE limit / %"]  # there is none
    two = tally(
        {
            **NO_LIQUID,
            CSV: STANDARDS + "FID,CO,1000,100\nFID,CO,500,50\n",
            "gas.csv": gas("a1,1,1800,FID,CO,50"),
        }
    )
    assert "curve-without-scatter" not in kinds(two)


def test_a_curve_that_cannot_be_fitted_is_a_fault(stops: Check) -> None:
    found = stops(
        {
            **NO_LIQUID,
            TOML: 'kind = "gas"\n',
            CSV: STANDARDS + "FID,CO,1000,100\n",
            "gas.csv": gas("a1,1,1800,FID,CO,50"),
        }
    )
    assert [one.kind for one in found] == ["broken-curve"]
    assert "(1 standards, form 'line', weights 'equal')" in found[0].text


def test_limits_that_cannot_be_had_are_told_and_nothing_is_lost(tally: Tally) -> None:
    toml = 'kind = "gas"\n[curve]\nform = "line"\nlimits = "ICH blank"\n'
    standards = STANDARDS + "FID,CO,100,11\nFID,CO,500,49\nFID,CO,1000,100\nFID,CO,0,0.1\n"
    book = tally({**NO_LIQUID, TOML: toml, CSV: standards, "gas.csv": gas("a1,1,1800,FID,CO,50")})
    assert len(told(book, "no-limits")) == 1
    assert book.ledger["status"].tolist() == ["quantified"]
    blanks = standards + "FID,CO,0,0.2\nFID,CO,0,0\n"
    assert "no-limits" not in kinds(
        tally({**NO_LIQUID, TOML: toml, CSV: blanks, "gas.csv": gas("a1,1,1800,FID,CO,50")})
    )


def test_what_the_standards_say_against_their_curve_is_told(tally: Tally) -> None:
    def of(rows: str, form: str = "line", more: str = "") -> coulombook.Book:
        return tally(
            {
                **NO_LIQUID,
                TOML: f'kind = "gas"\n[curve]\nform = "{form}"\n{more}',
                CSV: STANDARDS + rows,
                "gas.csv": gas("a1,1,1800,FID,CO,50"),
            }
        )

    xs = (100, 300, 500, 700, 900, 1100)
    bent = "".join(f"FID,CO,{x},{0.1 * x - 2e-5 * x * x + 0.01 * (-1) ** n}\n" for n, x in enumerate(xs))
    assert "curve-bends" in kinds(of(bent))
    assert not {"curve-bends", "curve-misfit"} & set(kinds(of(bent, "quadratic")))
    repeated = "".join(f"FID,CO,{x},{0.1 * x - 2e-5 * x * x + w}\n" for x in xs for w in (-0.01, 0.01))
    assert "curve-misfit" in kinds(of(repeated))
    assert "curve-misfit" not in kinds(of(repeated, "quadratic"))
    straight = "".join(f"FID,CO,{x},{0.1 * x + 0.01 * (-1) ** n}\n" for n, x in enumerate(xs))
    assert not {"curve-bends", "curve-misfit", "standard-outlying", "weights-suggested"} & set(
        kinds(of(straight))
    )
    (outlying,) = told(of(straight.replace("FID,CO,700,", "FID,CO,700,1")), "standard-outlying")
    assert outlying.where == "calibrations/mini/standards.csv, row 5"
    growing = "".join(
        f"FID,CO,{x},{0.1 * x * (1 + 0.03 * w)}\n" for x in (10, 100, 1000, 10000) for w in (-1, 0, 1)
    )
    (suggested,) = told(of(growing), "weights-suggested")
    assert "'1/x^2' fits better" in suggested.text
    assert "weights-suggested" not in kinds(of(growing, more='weights = "1/x^2"\n'))


# --- samples ---------------------------------------------------------------------------------------------------------


def test_vials_of_one_time_are_averaged_and_each_aliquot_counts_as_withdrawn(tally: Tally) -> None:
    vials = (
        VIALS + ",time / s,use\n"
        "a,a1,catholyte,30,0.5,DMSO,0.2,1800,\n"
        "b,a1,Catholyte,31,1.0,DMSO,0.2,1800,\n"
        "c,a1,catholyte,28,0.5,DMSO,0.2,,\n"
        "d,a1,catholyte,28,0.5,DMSO,0.2,,no\n"
    )
    rows = "".join(f"{vial},DMSO,CH3,6,600\n" for vial in "abcd")
    rows += "a,formate,CH,1,100\nb,formate,CH,1,220\nc,formate,CH,1,250\nd,formate,CH,1,900\n"
    # a holds 0.2 umol in 0.5 mL, b 0.44 in 1 mL; both are gone; c has 0.5 umol in 0.5 mL of 28 mL
    book = tally({**NO_GAS, "vials.csv": vials, "liquid.csv": LIQUID.split("\n")[0] + "\n" + rows})
    row = book.ledger.iloc[0]
    assert row["amount / umol"] == pytest.approx(28.0 + 0.2 + 0.44, rel=1e-9)
    # without the last vial it is the mean of the first two, in the mean of their volumes, made in half the time
    early = vials.replace("c,a1,catholyte,28,0.5,DMSO,0.2,,\n", "c,a1,catholyte,28,0.5,DMSO,0.2,,no\n")
    book = tally({**NO_GAS, "vials.csv": early, "liquid.csv": LIQUID.split("\n")[0] + "\n" + rows})
    made = 0.5 * (0.4 + 0.44) * 30.5
    assert book.ledger.iloc[0]["FE / %"] == pytest.approx(
        100 * 2 * 96485.33212 * made * 1e-6 / 18.0, rel=1e-9
    )


def test_blanks_of_a_compartment_are_averaged_and_of_another_do_not_count(tally: Tally) -> None:
    vials = (
        VIALS
        + ",role\nv1,a1,catholyte,30,0.5,DMSO,0.2,sample\n"
        + "".join(
            f"{name},,{place},,0.5,DMSO,0.2,blank\n"
            for name, place in (("p", "catholyte"), ("q", "Catholyte"), ("r", "trap"), ("s", "catholyte"))
        )
    )
    liquid = (
        LIQUID
        + "v1,formate,CH,1,250\n"
        + "".join(f"{name},DMSO,CH3,6,600\n" for name in "pqrs")
        + "p,formate,CH,1,10\nq,formate,CH,1,20\nr,formate,CH,1,200\ns,acetate,CH3,3,9\n"
    )
    book = tally({**NO_GAS, "vials.csv": vials, "liquid.csv": liquid})
    # the mean of 10 and 20; the last blank does not report formate
    assert book.ledger["product"].tolist() == ["formate"]
    assert book.ledger["FE / %"].tolist() == pytest.approx([100 * FORMATE * 235 / 250], rel=1e-5)
