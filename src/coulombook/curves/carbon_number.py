"""A curve for an analyte without standards: another's, scaled by effective carbon numbers.

The response of a flame ionisation detector per molecule is, to about a tenth, the sum of what the groups of the
molecule add (effective carbon number). Behind a methaniser every carbon atom counts 1, carbon monoxide and dioxide
included.
Groups, species and sources stand in ``data/effective_carbon.toml``.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache
from importlib.resources import files

import numpy as np
from numpy.typing import NDArray

from coulombook.curves.fit import Curve

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class _Table:
    contribution: Mapping[str, float]
    carbon: Mapping[str, int]
    species: Mapping[str, Mapping[str, int]]
    relative_uncertainty: float


@cache
def _table() -> _Table:
    text = files("coulombook.data").joinpath("effective_carbon.toml").read_text(encoding="utf-8")
    raw = tomllib.loads(text)
    groups = raw["group"]
    return _Table(
        {name: float(one["contribution"]) for name, one in groups.items()},
        {name: int(one["carbon"]) for name, one in groups.items()},
        raw["species"],
        float(raw["relative_uncertainty"]),
    )


def known_analytes() -> tuple[str, ...]:
    """Trade names of the species whose groups are listed."""
    return tuple(_table().species)


def relative_uncertainty() -> float:
    """Relative standard uncertainty of the ratio of two responses found from carbon numbers. [1]"""
    return _table().relative_uncertainty


def effective_carbon_number(analyte: str, methaniser: bool = False) -> float:
    """Effective carbon number, the molar response in units of methane's. [1]

    Parameters
    ----------
    analyte : str
        Trade name of the species.
    methaniser : bool
        Whether a methaniser stands before the detector: then the number of carbon atoms.

    Raises
    ------
    ValueError
        The groups of the analyte are not listed.

    Examples
    --------
    >>> effective_carbon_number("ethylene"), effective_carbon_number("ethanol")
    (1.9, 1.5)
    """
    table = _table()
    groups = table.species.get(analyte)
    if groups is None:
        raise ValueError(f"no effective carbon number is known for {analyte}")
    of_group: Mapping[str, float] = table.carbon if methaniser else table.contribution
    return float(sum(count * of_group[group] for group, count in groups.items()))


def relative_response(analyte: str, reference: str, methaniser: bool = False) -> tuple[float, float]:
    """Molar response of one analyte over that of another, with its standard uncertainty. [1]

    Raises
    ------
    ValueError
        An analyte is not listed, or one of the two gives no signal.

    Examples
    --------
    >>> ratio, u = relative_response("ethane", "ethylene")
    >>> round(ratio, 4), round(u, 4)
    (1.0526, 0.1053)
    """
    numbers = []
    for name in (analyte, reference):
        number = effective_carbon_number(name, methaniser)
        if not number > 0.0:
            raise ValueError(f"{name} gives no signal on a flame ionisation detector without a methaniser")
        numbers.append(number)
    ratio = numbers[0] / numbers[1]
    return ratio, ratio * relative_uncertainty()


def scale_curve(curve: Curve, factor: float, u_factor: float) -> Curve:
    """The curve of an analyte that responds ``factor`` times as much per mole as the curve's own.

    The detector sees factor times x: response = f(factor x), so a1 and a2 are multiplied by factor and its square, the
    intercept stays, and the range is divided by factor. The error of the factor is added to those of the curve, as a
    column of `Curve.factor` of its own and as part of `Curve.certificate`: it is no scatter.

    Parameters
    ----------
    factor : float
        Ratio of the molar responses. [1]
    u_factor : float
        Its standard uncertainty. [1]

    Raises
    ------
    ValueError
        A factor not above zero, or a negative uncertainty.
    """
    if not factor > 0.0:
        raise ValueError(f"the factor must be above zero; it is {factor:g}")
    if not u_factor >= 0.0:
        raise ValueError(f"the uncertainty of the factor must be at or above zero; it is {u_factor:g}")
    _, a1, a2 = curve.coefficients
    powers = np.array([1.0, factor, factor**2])
    of_factor = u_factor * np.array([0.0, a1, 2.0 * factor * a2])
    columns = np.column_stack((powers[:, None] * curve.factor, of_factor))
    scaled = replace(
        curve,
        lowest=curve.lowest / factor,
        highest=curve.highest / factor,
        coefficients=powers * curve.coefficients,
        factor=columns,
        covariance=columns @ columns.T,
        certificate=np.outer(powers, powers) * curve.certificate + np.outer(of_factor, of_factor),
        scatter=np.append(powers, 1.0) * curve.scatter,
        distance=None,
    )
    for array in (scaled.coefficients, scaled.factor, scaled.covariance, scaled.certificate, scaled.scatter):
        array.setflags(write=False)
    return scaled
