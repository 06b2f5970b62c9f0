"""The liquid side of the plan: which signal belongs to which vial, sampling, compartment and product.

Index letters: R runs, V vials, T signals of internal standards, S signals of analytes, A analytes of a vial,
L products of a compartment of a run (at its last sampling), LP liquid products of a run.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from coulombook.balance.curves_used import LIQUID, CurvesUsed
from coulombook.balance.readings import Day, FloatArray, Signal, Species, Vial
from coulombook.findings import Findings
from coulombook.uncertainty.linearised import IntArray, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array


@dataclass(frozen=True, slots=True, eq=False)
class Samplings:
    """The samplings of the day: vials of one run and compartment taken at one time.

    ``time_second`` is infinite where the sample was taken at the end of the run's window.
    """

    run: IntArray  # (M,)
    compartment: tuple[str, ...]
    time_second: FloatArray  # (M,)
    vials: tuple[tuple[int, ...], ...]  # places in Day.vials


def list_samplings(day: Day) -> Samplings:
    """All samplings, ordered by run, compartment and time; blanks and unused vials are none."""
    place = {run.name: number for number, run in enumerate(day.runs)}
    groups: dict[tuple[int, str, float], list[int]] = {}
    for number, vial in enumerate(day.vials):
        if vial.used and not vial.blank and vial.run is not None:
            time = np.inf if vial.time_second is None else vial.time_second
            groups.setdefault((place[vial.run], vial.compartment.casefold(), time), []).append(number)
    keys = sorted(groups)
    return Samplings(
        np.array([run for run, _, _ in keys], dtype=np.intp),
        tuple(compartment for _, compartment, _ in keys),
        np.array([time for _, _, time in keys], dtype=float),
        tuple(tuple(groups[key]) for key in keys),
    )


@dataclass(frozen=True, slots=True, eq=False)
class LiquidPlan:
    """Fixed structure of the liquid readings."""

    samplings: Samplings
    vials: tuple[Vial, ...]
    # signals
    standard_signals: tuple[Signal, ...]
    standard_vial: IntArray  # (T,)
    signals: tuple[Signal, ...]
    signal_vial: IntArray  # (S,)
    signal_curve: IntArray  # (S,) -1: the line of slope 1
    # analytes of a vial
    signal_analyte: IntArray  # (S,) the analyte (A) each signal speaks of
    analyte_vial: IntArray  # (A,)
    analyte_species: tuple[Species, ...]
    blanks: csr_array  # (A, A) mean of the blanks to be subtracted
    # products of a compartment
    replicate_mean: csr_array  # (L, A) concentration at the last sampling
    volume_mean: csr_array  # (L, V) compartment volume at that sampling
    withdrawn: csr_array  # (L, A) what earlier samplings took away: weights of concentration x aliquot
    product_sampling: IntArray  # (L,) sampling of each
    electrons: FloatArray  # (L,)
    # products of a run
    compartments: csr_array  # (LP, L) sum over compartments
    carbon_per_run: csr_array  # (R, LP) CO2 molecules per molecule of product
    group_run: IntArray  # (LP,)
    group_species: tuple[Species, ...]


def plan_liquid(day: Day, curves: CurvesUsed, findings: Findings) -> LiquidPlan:
    """Lay out the liquid readings."""
    samplings = list_samplings(day)
    in_use = [
        number for number, vial in enumerate(day.vials) if vial.used and (vial.blank or vial.run is not None)
    ]
    vials = tuple(day.vials[number] for number in in_use)
    vial_place = {day.vials[number].name: place for place, number in enumerate(in_use)}
    place_of = {number: place for place, number in enumerate(in_use)}

    standard_signals, standard_vial, signals, signal_vial, signal_curve, signal_analyte = (
        [],
        [],
        [],
        [],
        [],
        [],
    )
    analytes: dict[tuple[int, str], int] = {}
    uncurved: dict[tuple[str, str], Signal] = {}
    saturated: dict[tuple[str, str], Signal] = {}
    for signal in day.signals:
        place = vial_place.get(signal.vial)
        if place is None:
            continue
        if signal.analyte == vials[place].standard:
            standard_signals.append(signal)
            standard_vial.append(place)
            continue
        if day.species[signal.analyte].carrier:
            continue
        curve = curves.index(LIQUID, signal.signal, signal.analyte)
        if curve is None and LIQUID in curves.kinds:
            uncurved.setdefault((signal.analyte, signal.signal), signal)
        if curve is not None and signal.relaxation_second is not None:
            saturated.setdefault((signal.analyte, signal.signal), signal)
        signals.append(signal)
        signal_vial.append(place)
        signal_curve.append(-1 if curve is None else curve)
        signal_analyte.append(analytes.setdefault((place, signal.analyte), len(analytes)))
    for (analyte, name), signal in uncurved.items():
        findings.add(
            "no-curve",
            signal.origin,
            f"{analyte} {name} has no curve in the day's liquid calibrations; proton counting (slope 1) was used",
            "add standards of it to the liquid calibration",
        )
    for (analyte, name), signal in saturated.items():
        findings.add(
            "saturation-in-curve",
            signal.origin,
            f"{analyte} {name} is read by a curve, whose standards were saturated as well; its T1 corrects nothing",
            "measure standards and samples with the same pulse and repetition time",
        )

    keys = list(analytes)
    last = _last_samplings(samplings, place_of, analytes)
    products = list(last)
    groups = dict.fromkeys((int(samplings.run[last[key]]), key[2]) for key in products)
    group_place = {key: place for place, key in enumerate(sorted(groups, key=lambda key: key[0]))}
    species = tuple(day.species[name] for _, name in group_place)
    group_run = np.array([run for run, _ in group_place], dtype=np.intp)
    replicate_mean, volume_mean, withdrawn = _sampling_maps(samplings, last, place_of, analytes, len(vials))
    return LiquidPlan(
        samplings,
        vials,
        tuple(standard_signals),
        np.array(standard_vial, dtype=np.intp),
        tuple(signals),
        np.array(signal_vial, dtype=np.intp),
        np.array(signal_curve, dtype=np.intp),
        np.array(signal_analyte, dtype=np.intp),
        np.array([place for place, _ in keys], dtype=np.intp),
        tuple(day.species[name] for _, name in keys),
        _blank_map(vials, analytes),
        replicate_mean,
        volume_mean,
        withdrawn,
        np.array([last[key] for key in products], dtype=np.intp),
        np.array([day.species[key[2]].electrons for key in products], dtype=float),
        sparse_map(
            [group_place[int(samplings.run[last[key]]), key[2]] for key in products],
            np.arange(len(products)),
            1.0,
            (len(group_place), len(products)),
        ),
        sparse_map(
            group_run,
            np.arange(len(species)),
            [one.carbon for one in species],
            (len(day.runs), len(species)),
        ),
        group_run,
        species,
    )


def _blank_map(vials: tuple[Vial, ...], analytes: dict[tuple[int, str], int]) -> csr_array:
    """(A, A): for each analyte of a sample, the mean over the blanks of its compartment that report the analyte."""
    blanks: dict[tuple[str, str], list[int]] = {}
    for (place, name), number in analytes.items():
        if vials[place].blank:
            blanks.setdefault((vials[place].compartment.casefold(), name), []).append(number)
    rows, columns, weights = [], [], []
    for (place, name), number in analytes.items():
        found = [] if vials[place].blank else blanks.get((vials[place].compartment.casefold(), name), [])
        rows += [number] * len(found)
        columns += found
        weights += [1.0 / len(found) for _ in found]
    return sparse_map(rows, columns, weights, (len(analytes), len(analytes)))


# a product of a compartment: run, compartment, species
ProductKey = tuple[int, str, str]


def _last_samplings(
    samplings: Samplings, place_of: dict[int, int], analytes: dict[tuple[int, str], int]
) -> dict[ProductKey, int]:
    """The last sampling that reports each product of a compartment; samplings are in order of time."""
    reported: dict[int, set[str]] = {}
    for place, name in analytes:
        reported.setdefault(place, set()).add(name)
    last: dict[ProductKey, int] = {}
    for number, members in enumerate(samplings.vials):
        key = (int(samplings.run[number]), samplings.compartment[number])
        for vial in members:
            for name in sorted(reported.get(place_of[vial], ())):
                last[(*key, name)] = number
    return last


class _Entries:
    """Entries of a linear map, gathered one by one."""

    def __init__(self) -> None:
        self._rows: list[int] = []
        self._columns: list[int] = []
        self._weights: list[float] = []

    def put(self, row: int, column: int, weight: float) -> None:
        self._rows.append(row)
        self._columns.append(column)
        self._weights.append(weight)

    def matrix(self, shape: tuple[int, int]) -> csr_array:
        return sparse_map(self._rows, self._columns, self._weights, shape)


def _sampling_maps(
    samplings: Samplings,
    last: dict[ProductKey, int],
    place_of: dict[int, int],
    analytes: dict[tuple[int, str], int],
    n_vials: int,
) -> tuple[csr_array, csr_array, csr_array]:
    """Concentration, volume and earlier withdrawals of each product of a compartment at its last sampling."""
    of_compartment: dict[tuple[int, str], list[int]] = {}
    for number in range(len(samplings.run)):
        of_compartment.setdefault((int(samplings.run[number]), samplings.compartment[number]), []).append(
            number
        )
    mean, volume, taken = _Entries(), _Entries(), _Entries()
    for row, ((run, compartment, name), number) in enumerate(last.items()):
        places = [place_of[vial] for vial in samplings.vials[number]]
        reporting = [place for place in places if (place, name) in analytes]
        for place in reporting:
            mean.put(row, analytes[place, name], 1.0 / len(reporting))
            volume.put(row, place, 1.0 / len(reporting))
        for earlier in of_compartment[run, compartment]:
            if earlier >= number:
                break
            for vial in samplings.vials[earlier]:
                if (place_of[vial], name) in analytes:
                    taken.put(row, analytes[place_of[vial], name], 1.0)
    shape = (len(last), len(analytes))
    return (
        mean.matrix(shape),
        volume.matrix((len(last), n_vials)),
        taken.matrix(shape),
    )
