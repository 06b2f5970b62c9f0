"""The runs of several days one under another, with the errors that the days share as one error.

One error over the days are: the errors of a calibration curve that the days fitted to the same standards; what a curve
borrowed by carbon number is uncertain by; a specific capacitance of the same value, uncertainty and source; and the
day-wide error of a quantity that the user says is one, such as of the same flow meter. Everything else is independent
between days, even where it might not be: the interval of a difference between days is then too wide rather than too
narrow.

A sum of products counts those below detection as nothing, which they need not be: each adds an error of its detection
limit over sqrt(3), as of anything between nothing and that limit (JCGM 100:2008, 4.3.7). All runs of a catalyst share
it, for a product that hides from one hides from the next.
"""

from __future__ import annotations

import hashlib
import math
from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from coulombook.balance.readings import DaySettings, StandardSet
from coulombook.balance.settle import Settled
from coulombook.balance.verdicts import closures
from coulombook.book import Book
from coulombook.book.entries import level_of
from coulombook.compare.replicates import widened
from coulombook.compare.stacking import share_errors, stack
from coulombook.uncertainty.errors import DAY
from coulombook.uncertainty.linearised import Linearised, Number, gather, linear_map, nominal, sparse_map

if TYPE_CHECKING:
    from scipy.sparse import csr_array

TOTALS = ("C2+", "C1", "H2")


@dataclass(frozen=True, slots=True, eq=False)
class ComparedRuns:
    """The runs of all days. (R,) each."""

    day: tuple[str, ...]
    run: tuple[str, ...]
    catalyst: tuple[str, ...]
    electrode: tuple[tuple[str, str], ...]  # day and name: an electrode of another day is another one
    level: tuple[str, ...]
    closure: tuple[str, ...]
    potential_rhe_volt: Linearised
    current_density_ampere_per_m2: Linearised
    roughness_factor: Linearised  # NaN where it is not known
    ratio: Linearised  # C2+/C1 by charge, NaN where no C1 product was found
    efficiency: Mapping[
        str, Linearised
    ]  # of the `TOTALS`, and of products, NaN where a run does not report one

    def __len__(self) -> int:
        return len(self.run)

    def kept(self, places: Sequence[int]) -> ComparedRuns:
        """Some of the runs."""
        index = np.array(places, dtype=np.intp)

        def of(x: Linearised) -> Linearised:
            found = gather(x, index)
            assert isinstance(found, Linearised)
            return found

        def words(column: Sequence[str]) -> tuple[str, ...]:
            return tuple(column[place] for place in places)

        return ComparedRuns(
            words(self.day),
            words(self.run),
            words(self.catalyst),
            tuple(self.electrode[place] for place in places),
            words(self.level),
            words(self.closure),
            of(self.potential_rhe_volt),
            of(self.current_density_ampere_per_m2),
            of(self.roughness_factor),
            of(self.ratio),
            {name: of(x) for name, x in self.efficiency.items()},
        )


@dataclass(frozen=True, slots=True)
class Contender:
    """What is known of one catalyst. Roughness factors are NaN where none is known."""

    name: str
    days: int
    electrodes: int
    runs: int
    lowest_volt: float
    highest_volt: float
    least_rough: float
    roughest: float


def contenders(runs: ComparedRuns) -> tuple[Contender, ...]:
    """The catalysts in the order of the runs."""
    potential, rough = runs.potential_rhe_volt.value, runs.roughness_factor.value
    found = []
    for name in dict.fromkeys(runs.catalyst):
        own = [place for place, one in enumerate(runs.catalyst) if one == name]
        known = rough[own][np.isfinite(rough[own])]
        found.append(
            Contender(
                name,
                len({runs.day[place] for place in own}),
                len({runs.electrode[place] for place in own}),
                len(own),
                float(potential[own].min()),
                float(potential[own].max()),
                float(known.min()) if known.size else math.nan,
                float(known.max()) if known.size else math.nan,
            )
        )
    return tuple(found)


def compared_runs(
    books: Sequence[Book], labels: Sequence[str], *, one_error: Sequence[str] = (), apart: bool = False
) -> ComparedRuns:
    """The runs of books that hold what they were computed from.

    Parameters
    ----------
    books, labels
        Days, and what each is called.
    one_error : sequence of str
        Quantities whose error that a day shares is one error over all days.
    apart : bool
        A catalyst of one day is another catalyst than that of the same name on another day.
    """
    days = [_settled(book) for book in books]
    owners = [
        [f"{run.catalyst} ({label})" if apart else run.catalyst for run in day.plan.runs]
        for label, day in zip(labels, days, strict=True)
    ]
    hidden = [_below_detection(day, of_day) for day, of_day in zip(days, owners, strict=True)]
    shared = share_errors(
        [[*_keys(day, one_error), *more.keys] for day, more in zip(days, hidden, strict=True)]
    )
    outcomes = [day.outcome for day in days]
    sums = [_with_hidden(day, more) for day, more in zip(days, hidden, strict=True)]

    def number(of_day: Sequence[Number]) -> Linearised:
        return stack(of_day, shared)

    products = sorted({name for day in days for name in day.plan.products.species})
    runs = [(label, run) for label, day in zip(labels, days, strict=True) for run in day.plan.runs]
    return ComparedRuns(
        tuple(label for label, _ in runs),
        tuple(run.name for _, run in runs),
        tuple(owner for of_day in owners for owner in of_day),
        # a run that names no electrode had one of its own
        tuple((label, run.electrode or f"of run {run.name}") for label, run in runs),
        tuple(level_of(run) for _, run in runs),
        tuple(word for day in days for word in closures(day)[0]),
        number([one.electrical.potential_rhe_volt for one in outcomes]),
        number([one.electrical.current_density_ampere_per_m2 for one in outcomes]),
        number([one.run_roughness_factor for one in outcomes]),
        number([_ratio(day, of_day) for day, of_day in zip(days, sums, strict=True)]),
        {
            **{name: number([of_day[name] for of_day in sums]) for name in TOTALS},
            **{name: number([_of_product(day, name) for day in days]) for name in products},
        },
    )


def _settled(book: Book) -> Settled:
    if book.settled is None:
        raise ValueError(f"the book of {book.day} holds its tables alone; tally the day anew")
    return book.settled


@dataclass(frozen=True, slots=True, eq=False)
class _Hidden:
    """Errors of what a day counts as nothing: ``keys`` of each, and its loadings (n_runs, n_errors) on the totals."""

    keys: tuple[Hashable, ...]
    loadings: Mapping[str, csr_array]


def _below_detection(day: Settled, owner: Sequence[str]) -> _Hidden:
    """One error for each product that was looked for and not detected, by owner of the runs."""
    products = day.plan.products
    rows = np.flatnonzero(~day.detection.detected)
    run = products.run[rows]
    named = [
        (owner[one], products.species[row]) for one, row in zip(run.tolist(), rows.tolist(), strict=True)
    ]
    known = {key: place for place, key in enumerate(dict.fromkeys(named))}
    error = np.array([known[key] for key in named], dtype=np.intp)
    size = np.nan_to_num(day.detection.efficiency_limit[rows]) / math.sqrt(3.0)
    carbon = products.carbon[rows]
    loadings = {
        name: sparse_map(run, error, size * counts, (len(day.plan.runs), len(known)))
        for name, counts in (("C2+", carbon > 1), ("C1", carbon == 1), ("H2", carbon == 0))
    }
    return _Hidden(tuple(("below detection", *key) for key in known), loadings)


def _with_hidden(day: Settled, hidden: _Hidden) -> dict[str, Number]:
    """The totals of a day with the errors of what they count as nothing."""
    outcome = day.outcome
    totals = {"C2+": outcome.c2_plus, "C1": outcome.c1, "H2": outcome.hydrogen}
    if not hidden.keys:
        return totals
    nothing = sparse_map([], [], [], (len(day.plan.runs), len(day.inputs.sources)))
    return {
        name: widened(
            x if isinstance(x, Linearised) else Linearised(nominal(x), nothing), hidden.loadings[name]
        )
        for name, x in totals.items()
    }


def _ratio(day: Settled, totals: Mapping[str, Number]) -> Number:
    """C2+/C1 of each run, (R,); NaN where no C1 product was found."""
    found = np.where(np.isfinite(nominal(day.outcome.ratio)), 0.0, np.nan)
    with np.errstate(divide="ignore", invalid="ignore"):
        return totals["C2+"] / (totals["C1"] + found)


def _of_product(day: Settled, name: str) -> Number:
    """Faradaic efficiency of one product in each run of a day, (R,); NaN where a run does not report it."""
    products, count = day.plan.products, len(day.plan.runs)
    rows = np.array([row for row, one in enumerate(products.species) if one == name], dtype=np.intp)
    place = sparse_map(products.run[rows], rows, 1.0, (count, len(products.run)))
    missing = np.full(count, np.nan)
    missing[products.run[rows]] = 0.0
    return linear_map(place, day.outcome.faradaic_efficiency) + missing


def _keys(day: Settled, one_error: Sequence[str]) -> list[Hashable | None]:
    """What each error of a day is known by to the other days."""
    curves = {f"curve {one.name}": _fingerprint(one.standards) for one in day.plan.curves.used}
    settings = day.plan.settings
    found: list[Hashable | None] = []
    for source in day.inputs.sources:
        if source.name in curves:
            found.append((source.name, curves[source.name]))
        elif source.name.startswith("carbon number "):
            found.append(source.name)  # of a table that is the same for all days
        elif source.name == "specific capacitance":
            found.append((source.name, *_specific_capacitance(settings)))
        elif source.shared == DAY and source.name in one_error:
            found.append((source.name, DAY))
        else:
            found.append(None)
    return found


def _specific_capacitance(settings: DaySettings) -> tuple[Hashable, ...]:
    declared = tuple(
        (one.relative, one.absolute)
        for one in settings.declared
        if one.quantity == "specific capacitance" and one.shared == DAY
    )
    return (
        settings.specific_capacitance_farad_per_m2,
        settings.u_specific_capacitance,
        settings.specific_capacitance_source,
        declared,
    )


def _fingerprint(standards: StandardSet) -> str:
    """The same for curves whose fit is the same to the last digit, whatever their calibration is called."""
    digest = hashlib.sha256()
    for values in (standards.x, standards.y, standards.u_x, standards.u_parent):
        digest.update(b"none" if values is None else np.ascontiguousarray(values, dtype=float).tobytes())
    digest.update(repr((standards.kind, standards.parent, standards.options)).encode())
    return digest.hexdigest()
