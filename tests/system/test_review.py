"""Whole days, each the smallest that shows one rule of the account, held against figures worked by hand."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from pathlib import Path

import numpy as np
import pytest
from tests.system.test_miniature_day import FILES

import coulombook
from coulombook.curves.fit import fit_curve
from coulombook.curves.limits import limits

OUTLET = 20e-6 * 101325 / (8.314462618 * 273.15) / 60  # 20 sccm, mol/s
FARADAY = 96485.33212

Tally = Callable[..., coulombook.Book]


@pytest.fixture
def tally(tmp_path: Path) -> Tally:
    """Tally the day in miniature with some of its files replaced (None: taken away)."""

    def run(files: Mapping[str, str | None], **options: int) -> coulombook.Book:
        for name, text in {**FILES, **files}.items():
            if text is None:
                continue
            path = tmp_path / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text, encoding="utf-8")
        return coulombook.tally(tmp_path, **options)

    return run


def settings(gas: str = 'outlet_flow = "inlet"', more: str = "") -> str:
    return f'[day]\ncalibrations = ["mini"]\n[reference]\npotential = "0.210 V"\n[gas]\n{gas}\n{more}\n'


def declare(quantity: str, standard: str, shared: str = "day") -> str:
    return f'[[uncertainty]]\nquantity = "{quantity}"\nstandard = "{standard}"\nshared = "{shared}"\n'


NO_LIQUID: dict[str, str | None] = {"vials.csv": None, "liquid.csv": None}
NO_GAS: dict[str, str | None] = {"gas.csv": None}

# --- detection -------------------------------------------------------------------------------------------------------

PPM = np.array([0.0, 200.0, 400.0, 600.0, 800.0, 1000.0])
WOBBLE = np.array([1.0, -1.0, 1.0, -1.0, 1.0, -1.0])


def two_channels(tcd_area: float, fid_area: float) -> dict[str, str | None]:
    """CO on a channel that scatters and one that hardly does; both respond with 0.1 per ppm."""
    rows = [f"TCD,CO,{x:g},{0.1 * x + 2.0 * w:.17g}" for x, w in zip(PPM, WOBBLE, strict=True)]
    rows += [f"FID,CO,{x:g},{0.1 * x + 0.01 * w:.17g}" for x, w in zip(PPM, WOBBLE, strict=True)]
    return {
        **NO_LIQUID,
        "calibrations/mini/calibration.toml": 'kind = "gas"\n[curve]\nform = "line through zero"\n',
        "calibrations/mini/standards.csv": "channel,analyte,mole fraction / ppm,peak area\n"
        + "\n".join(rows)
        + "\n",
        "gas.csv": "run,injection,time / s,channel,analyte,peak area\n"
        f"a1,1,1800,TCD,CO,{tcd_area:.17g}\na1,1,1800,FID,CO,{fid_area:.17g}\n",
    }


@pytest.mark.parametrize(("share", "status"), [(0.7, "below detection"), (1.2, "quantified")])
def test_noise_of_the_worse_channel_is_not_taken_for_a_product(
    tally: Tally, share: float, status: str
) -> None:
    noisy = fit_curve(PPM, 0.1 * PPM + 2.0 * WOBBLE, "line through zero")
    fine = fit_curve(PPM, 0.1 * PPM + 0.01 * WOBBLE, "line through zero")
    tcd, fid = limits(noisy), limits(fine)
    book = tally(two_channels(share * tcd.decision * float(noisy.coefficients[1]), 0.0))
    row = book.ledger.iloc[0]
    # the mean of a reading of 0.7 (1.2) decision limits and one of zero is 0.35 (0.6) of them; two independent
    # channels of limits d and almost nothing have d/2 for their mean
    assert row["status"] == status
    if status == "below detection":
        limit = math.hypot(tcd.detection, fid.detection) / 2 * 1e-6
        assert row["FE limit / %"] == pytest.approx(100 * 2 * FARADAY * limit * OUTLET / 0.010, rel=1e-6)
        assert book.summary["total FE / %"].iloc[0] == 0.0


RATIOS = np.array([0.0, 0.2, 0.4, 0.6, 0.8, 1.0])


def formate_vials(
    ratios: list[float], blanks: list[float], weights: str = "equal", wobble: float = 0.02
) -> dict[str, str | None]:
    """Vials of one sampling, their formate given as integral ratio per proton, with a line for its curve."""
    standards = "\n".join(
        f"formate,CH,{x:g},{x + wobble * w:.17g}" for x, w in zip(RATIOS, WOBBLE, strict=True)
    )
    vials = [f"v{n},a1,catholyte,30,0.5,DMSO,0.2,sample" for n in range(len(ratios))]
    vials += [f"b{n},,catholyte,,0.5,DMSO,0.2,blank" for n in range(len(blanks))]
    integrals = {f"v{n}": one for n, one in enumerate(ratios)} | {
        f"b{n}": one for n, one in enumerate(blanks)
    }
    return {
        **NO_GAS,
        "day.toml": settings().replace('"mini"', '"nmr"'),
        "calibrations/nmr/calibration.toml": f'kind = "liquid"\n[curve]\nform = "line"\nweights = "{weights}"\n',
        "calibrations/nmr/standards.csv": f"analyte,signal,amount ratio,integral ratio\n{standards}\n",
        "vials.csv": "vial,run,compartment,compartment volume / mL,aliquot / mL,standard,standard amount / umol,role\n"
        + "\n".join(vials)
        + "\n",
        "liquid.csv": "vial,analyte,signal,protons,integral\n"
        + "".join(f"{v},DMSO,CH3,6,600\n{v},formate,CH,1,{100 * r:.17g}\n" for v, r in integrals.items()),
    }


LINE = fit_curve(RATIOS, RATIOS + 0.02 * WOBBLE, "line")


def responses(decisions: list[float], repeats: int = 1) -> list[float]:
    """Integral ratios that read as so many decision limits."""
    a0, a1, _ = LINE.coefficients
    return [float(a0 + a1 * one * limits(LINE, repeats=repeats).decision) for one in decisions]


def test_one_vial_of_four_above_the_limit_is_no_product(tally: Tally) -> None:
    # the mean is 0.3 of the limit of one vial; that of a mean of four is more than half of it
    assert limits(LINE, repeats=4).decision > 0.5 * limits(LINE).decision
    book = tally(formate_vials(responses([1.2, 0.0, 0.0, 0.0]), []))
    assert book.ledger["status"].tolist() == ["below detection"]


def test_mean_of_four_vials_is_held_against_the_limit_of_a_mean(tally: Tally) -> None:
    book = tally(formate_vials(responses([1.05] * 4, repeats=4), []))
    assert book.ledger["status"].tolist() == ["quantified"]


@pytest.mark.parametrize(("share", "status"), [(1.3, "below detection"), (1.5, "quantified")])
def test_scatter_of_a_single_blank_widens_the_limit(tally: Tally, share: float, status: str) -> None:
    # a difference of two readings scatters sqrt(2) times as much as one
    sample, blank = responses([1.0 + share, 1.0])
    book = tally(formate_vials([sample], [blank]))
    assert book.ledger["status"].tolist() == [status]


# --- outlet flow -----------------------------------------------------------------------------------------------------

TRACER: dict[str, str | None] = {
    **NO_LIQUID,
    "day.toml": settings('outlet_flow = "tracer"\ntracer = "nitrogen"'),
    "runs.csv": "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,tracer flow / sccm\n"
    "a1,mesh,m1,1.0,6.8,10,0.2\n",
    "calibrations/mini/standards.csv": FILES["calibrations/mini/standards.csv"]
    + "TCD,nitrogen,1000,10\nTCD,nitrogen,10000,100\n",
}
HEAD = "run,injection,time / s,channel,analyte,peak area,use\n"


def test_unused_injection_needs_no_tracer(tally: Tally) -> None:
    rows = "a1,1,1800,FID,CO,50,yes\na1,1,1800,TCD,N2,100,yes\na1,2,2400,FID,CO,50,no\n"
    found = tally({**TRACER, "gas.csv": HEAD + rows}).injections.set_index("injection")
    # 0.2 sccm over 0.01 are 20 sccm
    assert found.loc["1", "outlet flow / umol/s"] == pytest.approx(OUTLET * 1e6, rel=1e-9)
    # and nothing is made up for the injection without
    assert math.isnan(found.loc["2", "outlet flow / umol/s"])


def test_unused_peak_of_the_tracer_gives_no_flow(tally: Tally) -> None:
    rows = "a1,1,1800,FID,CO,50,yes\na1,1,1800,TCD,N2,100,no\n"
    with pytest.raises(coulombook.DayFaults) as raised:
        tally({**TRACER, "gas.csv": HEAD + rows})
    assert [one.kind for one in raised.value.findings if one.severity == "stop"] == ["missing-value"]


def test_headspace_is_flushed_by_the_wet_volume(tally: Tally) -> None:
    book = tally(
        {
            **NO_LIQUID,
            "day.toml": settings('outlet_flow = "measured"\nmeter_gas = "wet"'),
            "runs.csv": "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,outlet flow / mL min^-1,"
            "headspace / mL\na1,mesh,m1,1.0,6.8,10,20,100\n",
            "gas.csv": "run,injection,time / s,channel,analyte,peak area\na1,1,300,FID,CO,50\n",
        }
    )
    # 100 mL over 20 mL/min are 300 s, one time constant: 1 - 1/e of 10 mA
    assert book.injections["current / mA"].iloc[0] == pytest.approx(10 * (1 - math.exp(-1)), rel=1e-7)


# --- draws -----------------------------------------------------------------------------------------------------------


def test_uncertain_headspace_is_drawn_to_the_end(tally: Tally) -> None:
    more = declare("headspace", "15 %") + declare("inlet flow", "5 %")
    runs = FILES["runs.csv"].replace("sccm\n", "sccm,headspace / mL\n").replace("10,20\n", "10,20,1000\n")
    # 1 L over 20 sccm (21.8 mL/min at 25 degC) is 46 min: at 30 min the headspace is half full, and all depends on it
    book = tally({**NO_LIQUID, "day.toml": settings(more=more), "runs.csv": runs}, draws=20_000)
    table = book.tables["intervals"].frame().set_index("output")
    assert table["low / %"].notna().all()
    # x n F n_out / I (1 - exp(-t/tau)) drawn here by itself, x and I being exact but for 0.2 % of I
    rng = np.random.default_rng(5)
    flow, volume = 1 + 0.05 * rng.standard_normal(200_000), 1 + 0.15 * rng.standard_normal(200_000)
    tau = 1e-3 * volume * 101325 / (8.314462618 * 298.15 * OUTLET * flow)
    fe = 100 * 2 * FARADAY * 500e-6 * OUTLET * flow / (0.010 * (1 - np.exp(-1800 / tau)))
    # 20 000 draws know a standard deviation to 0.5 %, 200 000 to 0.2 %; somewhat worse with long tails
    assert table.loc["carbon monoxide", "u(draws) / %"] == pytest.approx(fe.std(), rel=0.02)


# --- causes ----------------------------------------------------------------------------------------------------------


def test_current_logged_too_large_has_a_positive_error(tally: Tally) -> None:
    """CO takes the whole of 10, 20, 40 and 80 mA, and the log shows half a milliampere more."""
    small = "".join(declare(quantity, "0.1 %") for quantity in ("inlet flow", "peak area", "I"))
    files: dict[str, str | None] = {**NO_LIQUID, "day.toml": settings(more=small)}
    runs = "run,catalyst,electrode,electrode area / cm^2,pH,resistance / ohm,inlet flow / sccm\n"
    peaks = "run,injection,time / s,channel,analyte,peak area\n"
    for number, current in enumerate((10.0, 20.0, 40.0, 80.0)):
        runs += f"r{number},mesh,m1,1.0,6.8,10,20\n"
        files[f"traces/r{number}.csv"] = (
            f"t / s,E / V,I / mA\n0,-1.5,{-current - 0.5}\n3600,-1.5,{-current - 0.5}\n"
        )
        ppm = current * 1e-3 / (2 * FARADAY * OUTLET) * 1e6
        peaks += f"r{number},1,1800,FID,CO,{0.1 * ppm:.17g}\n"
    book = tally({**files, "runs.csv": runs, "gas.csv": peaks})
    best = book.tables["explanations"].frame().iloc[0]
    assert best["cause"] == "current-offset"
    # of a mean of 37.5 mA, to first order of an offset that is a twentieth of the least current
    assert best["estimate / %"] == pytest.approx(50 / 37.5, rel=0.1)


# --- scatter ---------------------------------------------------------------------------------------------------------


def two_vials(*second: str) -> dict[str, str | None]:
    exact = "".join(declare(quantity, "0 %") for quantity in ("integral", "I"))
    head = FILES["vials.csv"]
    assert head is not None
    rows = (
        "v1,DMSO,CH3,6,600\nv1,formate,CH,1,250\nv1,ethanol,CH3,3,90\nv2,DMSO,CH3,6,600\n"
        + "\n".join(second)
        + "\n"
    )
    return {
        **NO_GAS,
        "day.toml": settings(more=exact),
        "vials.csv": head + "v2,a1,catholyte,30,0.5,DMSO,0.2\n",
        "liquid.csv": "vial,analyte,signal,protons,integral\n" + rows,
    }


def test_replicate_vials_that_differ_tell_of_their_scatter(tally: Tally) -> None:
    book = tally(two_vials("v2,formate,CH,1,350", "v2,ethanol,CH3,3,90"))
    row = book.ledger.set_index("product").loc["formate"]
    # 250 and 350 per 100 of the standard: 36 umol on average, and s/sqrt(2) is half the difference, 6 umol
    percent = 2 * FARADAY * 1e-6 / 36.0 * 100
    assert row["FE / %"] == pytest.approx(36 * percent, rel=1e-9)
    assert row["u(FE) / %"] == pytest.approx(6 * percent, rel=1e-9)
    assert book.ledger.set_index("product").loc["ethanol", "u(FE) / %"] == pytest.approx(0.0, abs=1e-12)
    sources = book.tables["budget"].frame().query("output == 'formate'")["source"].tolist()
    assert sources == ["vial scatter"]


def test_products_that_vials_share_scatter_together(tally: Tally) -> None:
    # both a sixth above and below their mean: as of one aliquot that was not what it was meant to be
    book = tally(two_vials("v2,formate,CH,1,350", "v2,ethanol,CH3,3,126"))
    u = book.ledger["u(FE) / %"]
    assert book.summary["u(total FE) / %"].iloc[0] == pytest.approx(u.sum(), rel=1e-9)


def test_scatter_of_vials_is_drawn_as_it_is_propagated(tally: Tally) -> None:
    book = tally(two_vials("v2,formate,CH,1,350", "v2,ethanol,CH3,3,90"), draws=20_000)
    row = book.tables["intervals"].frame().set_index("output").loc["formate"]
    # 20 000 draws know a standard deviation to 0.5 %
    assert row["u(draws) / %"] == pytest.approx(row["u / %"], rel=0.02)


def test_reading_near_the_limit_is_no_better_than_its_curve(tally: Tally) -> None:
    files = two_channels(6.0, 0.0)
    gas = files["gas.csv"]
    assert gas is not None
    # one injection on the channel that scatters; nothing is declared
    book = tally({**files, "gas.csv": gas[: gas.index("a1,1,1800,FID")]})
    noisy = fit_curve(PPM, 0.1 * PPM + 2.0 * WOBBLE, "line through zero")
    slope = float(noisy.coefficients[1])
    u_slope = math.sqrt(noisy.covariance[1, 1])
    # the scatter of a reading, the slope, the flow's 1 % and the current's 0.2 %; not 1 % of the peak
    relative = math.hypot(noisy.residual_sd / 6.0, u_slope / slope, 0.01, 0.002)
    row = book.ledger.iloc[0]
    assert row["u(FE) / %"] == pytest.approx(relative * row["FE / %"], rel=1e-9)


def test_integral_near_the_limit_is_no_better_than_its_curve(tally: Tally) -> None:
    book = tally(formate_vials([0.05], []))
    a0, a1, _ = LINE.coefficients
    x = (0.05 - a0) / a1
    # in ratios: a reading and the curve at x; relative: the standard's integral 2 %, its amount and the volume 1 %
    # each, the aliquot 0.5 %, the current 0.2 %
    basis = np.array([1.0, x, 0.0])
    absolute = math.sqrt(LINE.residual_sd**2 + float(basis @ LINE.covariance @ basis)) / (a1 * x)
    # the response itself moves with the standard, its intercept does not
    standard = 0.02 * 0.05 / (a1 * x)
    row = book.ledger.iloc[0]
    assert row["u(FE) / %"] / row["FE / %"] == pytest.approx(
        math.hypot(absolute, standard, 0.01, 0.01, 0.005, 0.002), rel=1e-9
    )


def test_declared_peak_area_is_taken_at_its_word(tally: Tally) -> None:
    files = two_channels(6.0, 0.0)
    gas = files["gas.csv"]
    assert gas is not None
    exact = settings(more=declare("peak area", "0 %") + declare("I", "0 %"))
    book = tally({**files, "gas.csv": gas[: gas.index("a1,1,1800,FID")], "day.toml": exact})
    assert book.tables["budget"].frame()["source"].unique().tolist() == ["curve carbon monoxide@TCD"]
