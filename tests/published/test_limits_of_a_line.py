"""Limits from one calibration line and from blanks.

Fluorescein of Miller & Miller, Statistics and Chemometrics for Analytical Chemistry, chapter 5, evaluated by the
formulas of DIN 32645:2008-11, ISO 11843-2:2000, Hubaux & Vos (Anal. Chem. 42 (1970) 849) and ICH Q2; blanks of the
sample data of DIN 32645:2008-11. Apart from the printed values of the last two cases the numbers are this
project's own.
"""

from __future__ import annotations

import numpy as np
from tests.published.reference import case

from coulombook.curves.fit import fit_curve
from coulombook.curves.limits import blank_decision_limit, limits


def test_fluorescein_decision_detection_and_quantification() -> None:
    data = case("limits_from_line")
    curve = fit_curve(data.inputs["x"], data.inputs["y"])
    alpha = data.inputs["alpha"]
    din = limits(curve, "DIN 32645", alpha, alpha)
    data.expected["x_critical"].check(din.decision)
    data.expected["x_critical"].check(limits(curve, "ISO 11843-2", alpha, alpha).decision)
    data.expected["x_detection_twice"].check(din.detection)
    data.expected["x_detection_hubaux_vos"].check(limits(curve, "Hubaux-Vos", alpha, alpha).detection)
    data.expected["x_determination"].check(din.quantification)


def test_fluorescein_limits_from_the_residual_standard_deviation() -> None:
    data = case("mm_fluorescein")
    found = limits(fit_curve(data.inputs["x"], data.inputs["y"]), "ICH residual")
    data.expected["ich_dl_3p3_syx"].check(found.detection)
    data.expected["ich_ql_10_syx"].check(found.quantification)
    # Miller & Miller take the blank's response plus three standard deviations
    data.expected["lod_yB_plus_3sB"].check(found.detection * 3.0 / 3.3)


def test_decision_limit_from_ten_blanks() -> None:
    data = case("din32645_blank")
    blanks = np.array(data.inputs["blanks"], dtype=float)
    data.expected["mean_blank"].check(float(blanks.mean()))
    data.expected["s_blank"].check(float(blanks.std(ddof=1)))
    found = blank_decision_limit(blanks, data.inputs["slope"], data.inputs["alpha"], data.inputs["m"])
    data.expected["x_critical"].check(found)
