"""Uncertainty propagated through worked examples of the guides.

JCGM 100:2008, H.1 (end gauge) and H.2 (resistance, reactance and impedance from correlated readings); EURACHEM/CITAC
QUAM:2012.P1, appendices A1 (cadmium standard) and A2 (sodium hydroxide). Inputs and results quoted from stored text.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray
from tests.published.reference import case

from coulombook.uncertainty.linearised import (
    Linearised,
    chain,
    covariance,
    gather,
    sparse_map,
    squared_norms,
    standard_uncertainty,
)

FloatArray = NDArray[np.float64]


def inputs(pairs: dict[str, tuple[float, float]]) -> dict[str, Linearised]:
    """Independent inputs, each a value with its standard uncertainty."""
    size = len(pairs)
    return {
        name: Linearised(np.array([value]), sparse_map([0], [column], [u], (1, size)))
        for column, (name, (value, u)) in enumerate(pairs.items())
    }


def rectangular(half_width: float) -> float:
    return half_width / math.sqrt(3.0)


def triangular(half_width: float) -> float:
    return half_width / math.sqrt(6.0)


def contribution(number: Linearised, column: int) -> float:
    return abs(float(number.jacobian.toarray()[0, column]))


def test_cadmium_standard() -> None:
    data = case("quam_a1")
    given = data.inputs
    u_volume = math.hypot(
        triangular(given["a_flask_tri"]), math.hypot(given["s_rep"], rectangular(given["a_temp_rect"]))
    )
    one = inputs(
        {
            "m": (given["m_mg"], given["u_m"]),
            "P": (given["P"], rectangular(given["a_P_rect"])),
            "V": (given["V_mL"], u_volume),
        }
    )
    c = 1000.0 * one["m"] * one["P"] / one["V"]
    data.expected["c"].check(float(c.value[0]))
    data.expected["u"].check(float(standard_uncertainty(c)[0]))
    data.expected["u_V"].check(u_volume)
    for column, name in enumerate(("m", "P", "V")):
        data.expected[f"contrib_{name}"].check(contribution(c, column))


def test_sodium_hydroxide_against_phthalate() -> None:
    data = case("quam_a2")
    given = data.inputs
    # KHP is C8 H5 O4 K; two weighings make the mass, the molar mass has rectangular bounds of the atomic masses
    one = inputs(
        {
            "C": (given["M_C"], rectangular(given["a_C"])),
            "H": (given["M_H"], rectangular(given["a_H"])),
            "O": (given["M_O"], rectangular(given["a_O"])),
            "K": (given["M_K"], rectangular(given["a_K"])),
            "m": (given["m_g"], math.sqrt(2.0) * rectangular(given["a_lin_rect"])),
            "P": (given["P"], rectangular(given["a_P_rect"])),
            "V": (given["V_mL"], math.hypot(triangular(given["a_burette_tri"]), given["u_temp"])),
            "rep": (1.0, given["rel_rep"]),
        }
    )
    molar_mass = 8.0 * one["C"] + 5.0 * one["H"] + 4.0 * one["O"] + one["K"]
    c = one["rep"] * 1000.0 * one["m"] * one["P"] / (molar_mass * one["V"])
    data.expected["M"].check(float(molar_mass.value[0]))
    data.expected["u_M"].check(float(standard_uncertainty(molar_mass)[0]))
    data.expected["u_m"].check(float(standard_uncertainty(one["m"])[0]))
    data.expected["u_V"].check(float(standard_uncertainty(one["V"])[0]))
    data.expected["c"].check(float(c.value[0]))
    data.expected["u"].check(float(standard_uncertainty(c)[0]))


def test_end_gauge() -> None:
    data = case("gum_h1")
    given = data.inputs
    one = inputs(
        {
            "ls": (given["ls"], given["u_ls"]),
            "d": (given["d"], given["u_d"]),
            "dalpha": (0.0, given["u_dalpha"]),
            "theta": (given["theta"], given["u_theta"]),
            "alpha": (given["alpha_s"], given["u_alpha_s"]),
            "dtheta": (0.0, given["u_dtheta"]),
        }
    )
    length = one["ls"] + one["d"] - one["ls"] * (one["dalpha"] * one["theta"] + one["alpha"] * one["dtheta"])
    data.expected["l_mm"].check(float(length.value[0]) * 1e-6)
    data.expected["u_c"].check(float(standard_uncertainty(length)[0]))
    assert math.isclose(float(squared_norms(length.jacobian)[0]), float(standard_uncertainty(length)[0]) ** 2)
    data.expected["c_dalpha"].check(contribution(length, 2))
    data.expected["c_dtheta"].check(contribution(length, 5))


def test_impedance_from_correlated_readings() -> None:
    data = case("gum_h2")
    readings = np.array([data.inputs[name] for name in ("V", "I_mA", "phi")])
    mean = readings.mean(axis=1)
    # the readings were taken together: their means are correlated as the readings are
    root = np.linalg.cholesky(np.cov(readings) / readings.shape[1])
    rows, columns = np.indices((3, 3)).reshape(2, -1)
    means = Linearised(mean, sparse_map(rows, columns, root.ravel(), (3, 3)))
    volt, milliampere, phi = (gather(means, np.array([place])) for place in range(3))
    impedance = 1000.0 * volt / milliampere
    resistance = impedance * chain(phi, lambda a: (np.cos(a), -np.sin(a)))
    reactance = impedance * chain(phi, lambda a: (np.sin(a), np.cos(a)))
    u_mean = standard_uncertainty(means)
    correlation = covariance(means) / np.outer(u_mean, u_mean)
    for place, name in enumerate(("V", "I_mA", "phi")):
        data.expected[name].check(float(mean[place]))
        data.expected[f"u_{name}"].check(float(u_mean[place]))
    data.expected["r_V_I"].check(float(correlation[0, 1]))
    data.expected["r_V_phi"].check(float(correlation[0, 2]))
    data.expected["r_I_phi"].check(float(correlation[1, 2]))
    found = {"R": resistance, "X": reactance, "Z": impedance}
    rows_of = {name: one.jacobian.toarray()[0] for name, one in found.items() if isinstance(one, Linearised)}
    for name, one in found.items():
        assert isinstance(one, Linearised)
        data.expected[name].check(float(one.value[0]))
        data.expected[f"u_{name}"].check(float(standard_uncertainty(one)[0]))
    for first, second in (("R", "X"), ("R", "Z"), ("X", "Z")):
        a, b = rows_of[first], rows_of[second]
        data.expected[f"r_{first}_{second}"].check(float(a @ b / np.linalg.norm(a) / np.linalg.norm(b)))
