"""The order of a comparison: tally the days, put their runs under one another, judge, enter."""

from __future__ import annotations

import math
import os
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from coulombook.balance.verdicts import CLOSED
from coulombook.book import Book, InputFile, Table
from coulombook.compare.potentials import common_potentials, ranges
from coulombook.comparison.doubts import report_doubts
from coulombook.comparison.judge import AlongRoughness, Verdicts, along_roughness, judge
from coulombook.comparison.quantities import BASES, KINDS, RATIO, Quantity, leading_products, quantities
from coulombook.comparison.runs import TOTALS, ComparedRuns, Contender, compared_runs, contenders
from coulombook.comparison.tables import enter
from coulombook.comparison.words import verdict
from coulombook.findings import Finding, Findings, Severity
from coulombook.species import load_species
from coulombook.tally import Progress, tally

if TYPE_CHECKING:
    import pandas as pd

LEVEL = 0.95


class ComparisonError(ValueError):
    """What was asked for cannot be compared; the message says why and what would do."""


@dataclass(frozen=True, slots=True, eq=False)
class Comparison:
    """Everything a comparison of days produced.

    The attributes `series`, `pairs`, `rankings`, `electrodes` and `correlations` are pandas frames; `tables` holds the
    same as plain tables, and ``verdicts`` and ``along`` what they were entered from. ``verdict`` says it in words.
    """

    days: tuple[str, ...]
    verdict: str
    contenders: tuple[Contender, ...]
    verdicts: tuple[Verdicts, ...]  # by quantity
    along: tuple[AlongRoughness, ...]
    level: float
    tables: Mapping[str, Table]
    findings: tuple[Finding, ...]
    inputs: tuple[InputFile, ...]
    options: Mapping[str, str]
    warnings: Mapping[str, int]  # of each day's own findings

    @property
    def series(self) -> pd.DataFrame:
        """Quantity x point x catalyst: value, uncertainty, scatter, rank."""
        return self.tables["series"].frame()

    @property
    def pairs(self) -> pd.DataFrame:
        """Quantity x point x pair: difference, ratio, tests."""
        return self.tables["pairs"].frame()

    @property
    def rankings(self) -> pd.DataFrame:
        """Quantity x point: who leads, and where the data cannot tell."""
        return self.tables["rankings"].frame()

    @property
    def electrodes(self) -> pd.DataFrame:
        """Quantity x point x electrode, with its roughness factor."""
        return self.tables["electrodes"].frame()

    @property
    def correlations(self) -> pd.DataFrame:
        """Quantity x point: rank correlation with the roughness factor."""
        return self.tables["correlations"].frame()


def compare_days(
    days: Sequence[str | os.PathLike[str] | Book],
    *,
    calibrations: Sequence[str | os.PathLike[str]] = (),
    products: Sequence[str] = (),
    kinds: Sequence[str] = (),
    bases: Sequence[str] = BASES,
    potentials: Sequence[float] | None = None,
    catalysts: Sequence[str] = (),
    closed_only: bool = False,
    apart: bool = False,
    one_error: Sequence[str] = (),
    level: float = LEVEL,
    progress: Progress | None = None,
) -> Comparison:
    """Compare the catalysts of one day or of several.

    Parameters
    ----------
    days : sequence of paths or books
        Day folders, which are tallied, or books as `coulombook.tally` returns them.
    calibrations : sequence of paths
        As in `coulombook.tally`.
    products : sequence of str
        Products by any of their names, or C2+, C1, H2. The first decides the verdict. Default: C2+ and H2, or the
        largest carbon product where there is no C2+.
    kinds : sequence of str
        Of 'FE', 'C2+/C1' and 'j'. Default: all; of a product that was asked for, 'FE' and 'j'.
    bases : sequence of str
        Areas that current densities are put on, of 'geometric' and 'real'.
    potentials : sequence of float, optional
        Common potentials against RHE; chosen where most ranges overlap, if not given. [V]
    catalysts : sequence of str
        Only these. Default: all.
    closed_only : bool
        Leave out runs whose charge balance does not close.
    apart : bool
        Take a catalyst on one day for another one than that of the same name on another day.
    one_error : sequence of str
        Quantities whose error shared by a day is one error over all days, such as 'outlet flow' by one meter.
    level : float
        Level of confidence of intervals and verdicts.
    progress : callable, optional
        As in `coulombook.tally`.

    Returns
    -------
    Comparison
        Nothing is written.

    Raises
    ------
    DayFaults
        A day has faults.
    ComparisonError
        The same logs stand in two days, or something is asked for that no run has.

    Examples
    --------
    >>> found = compare_days(["example_experiments/2043-05-18-mesh-foil-foam"])  # doctest: +SKIP
    >>> found.rankings  # doctest: +SKIP
    """
    books = [
        day if isinstance(day, Book) else tally(day, calibrations=calibrations, progress=progress)
        for day in days
    ]
    if not books:
        raise ComparisonError("no day was given")
    labels = _labels([book.day for book in books])
    _refuse_doubles(books, labels)
    findings = Findings()
    runs = _chosen(
        compared_runs(books, labels, one_error=one_error, apart=apart), catalysts, closed_only, findings
    )
    kinds = kinds or (KINDS if not products else tuple(one for one in KINDS if one != RATIO))
    asked = quantities(_products(products, runs), kinds, bases)
    if not asked:
        raise ComparisonError(
            f"nothing is left to compare; known: {', '.join(KINDS)}, on {' or '.join(BASES)}"
        )
    at = _potentials(runs, asked, potentials, level)
    verdicts = [judge(runs, one, at, level) for one in asked]
    names = _electrode_names(runs)
    along = [
        found
        for one in asked
        if not one.basis  # a current density on either area holds the area itself
        for found in along_roughness(runs, one, at, level, names)
    ]
    report_doubts(runs, verdicts, at, findings)
    return Comparison(
        tuple(labels),
        verdict(verdicts, level, sum(one != CLOSED for one in runs.closure)),
        contenders(runs),
        tuple(verdicts),
        tuple(along),
        level,
        enter(verdicts, along, runs, names, findings, level),
        tuple(findings),
        tuple(
            InputFile(f"{label}/{one.path}", one.sha256, one.size_byte)
            for label, book in zip(labels, books, strict=True)
            for one in book.inputs
        ),
        {
            "calibrations": os.pathsep.join(map(str, calibrations)),
            "products": ", ".join(products),
            "kinds": ", ".join(kinds),
            "bases": ", ".join(bases),
            "potentials": ", ".join(f"{one:g}" for one in at),
            "catalysts": ", ".join(catalysts),
            "closed only": "yes" if closed_only else "no",
            "apart": "yes" if apart else "no",
            "one error": ", ".join(one_error),
            "level": f"{level:g}",
        },
        {
            label: sum(one.severity is Severity.WARN for one in book.findings)
            for label, book in zip(labels, books, strict=True)
        },
    )


def _labels(names: Sequence[str]) -> list[str]:
    """What days are called: by their folders, numbered where two have the same name."""
    often, turn, labels = Counter(names), Counter[str](), []
    for name in names:
        turn[name] += 1
        labels.append(f"{name} #{turn[name]}" if often[name] > 1 else name)
    return labels


def _refuse_doubles(books: Sequence[Book], labels: Sequence[str]) -> None:
    """Raise for a log that stands in two days: its run would count twice and make replicates of itself."""
    known: dict[str, tuple[str, str]] = {}
    for book, label in zip(books, labels, strict=True):
        assert book.settled is not None
        traces = {Path(run.trace).as_posix() for run in book.settled.plan.runs}
        for one in book.inputs:
            if one.path not in traces:
                continue
            where, path = known.setdefault(one.sha256, (label, one.path))
            if where != label:
                raise ComparisonError(
                    f"'{path}' of {where} and '{one.path}' of {label} are the same log: a run counted twice "
                    "would be a replicate of itself; name each day once"
                )


def _chosen(
    runs: ComparedRuns, catalysts: Sequence[str], closed_only: bool, findings: Findings
) -> ComparedRuns:
    known = {one.casefold(): one for one in runs.catalyst}
    for one in catalysts:
        if one.casefold() not in known:
            raise ComparisonError(f"no run has the catalyst '{one}'; known: {', '.join(known.values())}")
    wanted = {one.casefold() for one in catalysts} or set(known)
    places = [place for place, one in enumerate(runs.catalyst) if one.casefold() in wanted]
    open_runs = [place for place in places if runs.closure[place] != CLOSED]
    if closed_only:
        places = [place for place in places if place not in open_runs]
        if open_runs:
            findings.add(
                "left-out",
                "; ".join(_run_names(runs, open_runs)),
                f"{len(open_runs)} of {len(places) + len(open_runs)} runs do not close and were left out, as asked for",
            )
        if not places:
            raise ComparisonError("no run closes; compare without leaving out those that do not")
    elif open_runs:
        findings.add(
            "open-runs-compared",
            "; ".join(_run_names(runs, open_runs)),
            "the charge balance does not close, so that a product may be missing from what is compared",
            "find out why (coulombook explain), or leave such runs out (--closed)",
        )
    return runs.kept(places)


def _run_names(runs: ComparedRuns, places: Sequence[int]) -> list[str]:
    several = len(set(runs.day)) > 1
    return [f"{runs.day[one]}: {runs.run[one]}" if several else f"run {runs.run[one]}" for one in places]


def _products(asked: Sequence[str], runs: ComparedRuns) -> tuple[str, ...]:
    """Products by the names under which the runs have them."""
    species, totals = load_species(), {one.casefold(): one for one in TOTALS}
    found = []
    for one in asked:
        known = species.find(one)
        by_name = {name.casefold(): name for name in runs.efficiency}
        name = totals.get(one.casefold()) or by_name.get(one.casefold()) or (known.name if known else None)
        if name is None or name not in runs.efficiency:
            have = ", ".join(runs.efficiency)
            raise ComparisonError(f"no run reports '{one}'; known: {have}")
        found.append(name)
    return tuple(dict.fromkeys(found)) or leading_products(runs)


def _potentials(
    runs: ComparedRuns, asked: Sequence[Quantity], potentials: Sequence[float] | None, level: float
) -> tuple[float, ...]:
    """The common potentials: as given, or round ones where the ranges of the first quantity overlap."""
    if potentials is not None:
        wrong = [one for one in potentials if not math.isfinite(one)]
        if wrong:
            raise ComparisonError(f"{wrong[0]} is no potential")
        return tuple(dict.fromkeys(potentials))
    return common_potentials(list(ranges(judge(runs, asked[0], (), level).series).values()))


def _electrode_names(runs: ComparedRuns) -> list[str]:
    """Names of the electrodes by run, with the day where another day has one of the same name."""
    days: dict[str, set[str]] = {}
    for day, name in runs.electrode:
        days.setdefault(name, set()).add(day)
    return [name if len(days[name]) == 1 else f"{name} ({day})" for day, name in runs.electrode]
