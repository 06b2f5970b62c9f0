"""Tests between groups of replicates against certified and published results.

NIST/ITL Statistical Reference Datasets, analysis of variance: SiRstv and AtmWtAg (certified). Snedecor & Cochran,
Statistical Methods (1967), n = 4 and 8, with the results a numerical-library manual prints for it. NIST/SEMATECH
e-Handbook 1.3.5.3 (AUTO83B). Numbers and their grades in reference_values.toml.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from coulombook.compare.statistics import Sample, one_way, pooled, pooled_deviation, welch

CASES = tomllib.loads((Path(__file__).parent / "reference_values.toml").read_text(encoding="utf-8"))["case"]


def _case(name: str) -> dict[str, Any]:
    return next(case for case in CASES if case["id"] == name)


def _hold(case: dict[str, Any], found: dict[str, float], rel: float) -> None:
    names = set()
    for expected in case["expect"]:
        name = expected["name"]
        names.add(name)
        if "published" in expected:
            assert found[name] == pytest.approx(expected["published"], abs=expected["abs_tol"]), name
        if "recomputed" in expected:
            assert found[name] == pytest.approx(expected["recomputed"], rel=rel), name
    assert names == found.keys()


@pytest.mark.parametrize(("name", "rel"), [("strd_sirstv", 1e-12), ("strd_atmwtag", 1e-8)])
def test_one_way_analysis_of_variance(name: str, rel: float) -> None:
    # The data are decimal; as double-precision numbers they are off by up to half a unit in the last place, 1.4e-14 for
    # SiRstv (deviations of 0.1) and 7e-15 for AtmWtAg (deviations of 1e-5): the results cannot be better than rel.
    case = _case(name)
    found = one_way([np.array(group) for group in case["in"]["groups"]])
    for expected in case["expect"]:
        if "abs_tol" in expected:
            expected["abs_tol"] = max(expected["abs_tol"], rel * abs(expected["published"]))
    _hold(
        case,
        {
            "ss_between": found.between,
            "ss_within": found.within,
            "F": found.f,
            "r_squared": found.r_squared,
            "residual_sd": found.residual_deviation,
            "df_between": found.between_freedom,
            "df_within": found.within_freedom,
            "p": found.p,
        },
        rel,
    )


@pytest.mark.parametrize("name", ["welch_snedecor", "welch_auto83b"])
def test_two_samples_of_unequal_variance(name: str) -> None:
    case = _case(name)
    given = case["in"]
    one = Sample(given["n1"], given["mean1"], given["sd1"])
    other = Sample(given["n2"], given["mean2"], given["sd2"])
    unequal, equal = welch(one, other), pooled(one, other)
    _hold(
        case,
        {
            "t_welch": unequal.t,
            "nu_welch": unequal.degrees_of_freedom,
            "p_welch": unequal.p,
            "lo95": unequal.low,
            "hi95": unequal.high,
            "s_pooled": pooled_deviation([one, other]),
            "t_pooled": equal.t,
            "nu_pooled": equal.degrees_of_freedom,
            "p_pooled": equal.p,
        },
        1e-9,
    )
