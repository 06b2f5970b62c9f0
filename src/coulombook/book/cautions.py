"""What the outlet gas of a day could do to people: its highest concentrations beside the published limits.

The limits of flammability and exposure hold for air; the outlet gas is mostly CO2 and reaches air somewhere. So
nothing here says that a place is safe: it says by how much the outlet would have to be thinned, at least.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np

from coulombook.balance.readings import FloatArray
from coulombook.balance.settle import Settled
from coulombook.book.entries import PERCENT, PPM, Row
from coulombook.species import Species
from coulombook.uncertainty.linearised import IntArray, nominal

MIXTURE = "all together"
CARBON_DIOXIDE = "carbon dioxide"


@dataclass(frozen=True, slots=True)
class Limits:
    """Published limits of one substance; None where a list names none.

    Where two lists differ, the more cautious figure stands.
    """

    lower_flammable: float | None  # mole fraction in air
    exposure_ppm: float | None  # time-weighted average over a working day
    ceiling_ppm: float | None  # never, or for fifteen minutes at most
    danger_ppm: float | None  # immediately dangerous to life or health


_NONE = Limits(None, None, None, None)


@cache
def safety_limits() -> Mapping[str, Limits]:
    """Limits by substance, from the shipped table."""
    table = _table()
    flammable = {row["species"]: row for row in table["flammability"]}
    exposure = {row["species"]: row for row in table["exposure"]}
    return {
        name: Limits(
            _least(
                flammable.get(name, {}), ("nfpa_percent", "iec_percent", "further_percent"), 1.0 / PERCENT
            ),
            _least(exposure.get(name, {}), ("osha_twa_ppm", "niosh_twa_ppm")),
            _least(exposure.get(name, {}), ("niosh_ceiling_ppm", "niosh_stel_ppm")),
            _least(exposure.get(name, {}), ("idlh_ppm",)),
        )
        for name in dict.fromkeys([*flammable, *exposure])
    }


@cache
def safety_sources() -> tuple[str, ...]:
    """Where the limits come from, each with its year and how it was read."""
    return tuple(f"{one['text']}, {one['year']} ({one['mark']})" for one in _table()["source"].values())


def _table() -> dict[str, dict]:  # type: ignore[type-arg] # TOML: what lies below is looked at key by key
    text = files("coulombook").joinpath("data", "safety.toml").read_text(encoding="utf-8")
    return tomllib.loads(text)


def _least(row: Mapping[str, object], keys: Sequence[str], unit: float = 1.0) -> float | None:
    found = []
    for key in keys:
        value = row.get(key)
        # a range of flammability begins with its lower limit
        value = value[0] if isinstance(value, list) else value
        if isinstance(value, int | float):
            found.append(value * unit)
    return min(found, default=None)


def flammable_share(mole_fraction: FloatArray, lower_flammable: FloatArray, mixture: IntArray) -> FloatArray:
    """Share of the lower flammable limit that gases reach together. [1]

    Le Chatelier's rule, sum x_i / L_i [1]_: below 1 their mixture with any amount of air lies under its lower limit.
    The CO2 beside them would raise the limit and is left aside.

    Parameters
    ----------
    mole_fraction, lower_flammable : (n_readings,) float arrays
        Mole fraction in the gas, and lower limit in air; NaN for a gas that does not burn.
    mixture : (n_readings,) int array
        Which mixture each reading belongs to, counted from 0.

    Returns
    -------
    (n_mixtures,) float array

    Examples
    --------
    >>> flammable_share(np.array([0.02, 0.01]), np.array([0.04, 0.05]), np.array([0, 0]))
    array([0.7])

    References
    ----------
    .. [1] H. F. Coward and G. W. Jones, Limits of Flammability of Gases and Vapors, US Bureau of Mines Bulletin 503,
       1952, "Le Chatelier's law" (from memory).
    """
    share = np.nan_to_num(np.maximum(mole_fraction, 0.0) / lower_flammable)
    return np.asarray(np.bincount(mixture, weights=share), dtype=np.float64)


def caution_rows(settled: Settled) -> list[Row]:
    """One row per product in the gas, at its highest concentration of the day, and one for what burns together.

    Every injection counts, unused ones as well. CO2 has a row without a concentration: nothing measures it.
    """
    gas, known = settled.plan.gas, safety_limits()
    if not len(gas.reading_injection):
        return []
    fraction = _at_least(settled)
    names = [one.name for one in gas.reading_species]
    rows = [_mixture_row(settled, fraction)]
    for species in dict.fromkeys(gas.reading_species):
        if species.name not in known and not _burns(species):
            continue
        readings = np.flatnonzero([one == species.name for one in names])
        highest = int(readings[np.argmax(fraction[readings])])
        rows.append(
            _row(species.name, known.get(species.name, _NONE), float(fraction[highest]))
            | _place(settled, int(gas.reading_injection[highest]))
        )
    rows.append(_row(CARBON_DIOXIDE, known[CARBON_DIOXIDE], None))
    return rows


def _at_least(settled: Settled) -> FloatArray:
    """Mole fraction of each reading; where a curve that bends down does not reach a peak, that of its highest point."""
    gas, x = settled.plan.gas, settled.inputs.nominal
    fraction = nominal(settled.readings.mole_fraction).copy()
    a1, a2 = x["a1"][gas.peak_curve], x["a2"][gas.peak_curve]
    top = np.divide(-a1, 2.0 * a2, out=np.zeros(len(a1)), where=a2 < 0)
    peaks = gas.channel_mean
    for reading in np.flatnonzero(np.isnan(fraction)).tolist():
        held = peaks.indices[peaks.indptr[reading] : peaks.indptr[reading + 1]]
        fraction[reading] = top[held].max(initial=0.0)
    return fraction


def _burns(species: Species) -> bool:
    """Whether it is no carrier: what CO2 and water are reduced to can be burnt."""
    return not species.carrier


def _lower_limit(species: Species) -> float:
    """Lower flammable limit, NaN for what does not burn; of what burns and has none here, the lowest of the table."""
    known = safety_limits()
    limits = known.get(species.name, _NONE)
    if limits.lower_flammable is not None:
        return limits.lower_flammable
    if not _burns(species):
        return float("nan")
    return min(one.lower_flammable for one in known.values() if one.lower_flammable is not None)


def _mixture_row(settled: Settled, fraction: FloatArray) -> Row:
    gas = settled.plan.gas
    limit = np.array([_lower_limit(one) for one in gas.reading_species], dtype=float)
    share = flammable_share(fraction, limit, gas.reading_injection)
    worst = int(np.argmax(share))
    row: Row = {"substance": MIXTURE, "of flammable limit / %": float(share[worst]) * PERCENT}
    return row | _place(settled, worst)


def _place(settled: Settled, injection: int) -> Row:
    injections = settled.plan.gas.injections
    return {
        "run": settled.plan.runs[injections.run[injection]].name,
        "injection": injections.label[injection],
    }


def _row(name: str, limits: Limits, fraction: float | None) -> Row:
    return {
        "substance": name,
        "highest / ppm": None if fraction is None else fraction * PPM,
        "lower flammable limit / %": _scaled(limits.lower_flammable, PERCENT),
        "of flammable limit / %": _over(fraction, limits.lower_flammable, PERCENT),
        "exposure limit / ppm": limits.exposure_ppm,
        "times exposure limit": _over(fraction, limits.exposure_ppm, PPM),
        "ceiling / ppm": limits.ceiling_ppm,
        "dangerous / ppm": limits.danger_ppm,
    }


def _scaled(value: float | None, unit: float) -> float | None:
    return None if value is None else value * unit


def _over(fraction: float | None, limit: float | None, unit: float) -> float | None:
    return None if fraction is None or limit is None else fraction * unit / limit
