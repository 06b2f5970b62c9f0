"""The tables of a comparison: their heads, and how verdicts are entered.

A quantity stands in its cell as the head of a column would carry it, with its unit behind a slash; the numbers of a row
are in that unit.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence

from coulombook.book import Cell, Table
from coulombook.book.entries import Row
from coulombook.compare.ranking import Ranking, flips
from coulombook.comparison.judge import AlongRoughness, Judged, Verdicts
from coulombook.comparison.quantities import GEOMETRIC, REAL
from coulombook.comparison.runs import ComparedRuns
from coulombook.findings import Finding
from coulombook.uncertainty.linearised import nominal, standard_uncertainty

_POINT = ("quantity", "basis", "at", "point")
SERIES = (
    *_POINT, "catalyst", "E vs RHE / V", "u(E vs RHE) / V", "runs", "electrodes", "value", "u(value)", "s(value)",
    "agreement p", "rank",
)  # fmt: skip
PAIRS = (
    *_POINT, "catalyst", "other", "difference", "u(difference)", "difference low", "difference high", "ratio",
    "ratio low", "ratio high", "degrees of freedom", "p", "Holm p", "verdict", "Welch t", "Welch degrees of freedom",
    "Welch p", "Hedges g",
)  # fmt: skip
RANKINGS = (*_POINT, "ranking", "leaders", "analysis of variance p", "turned round on the other area")
ELECTRODES = (
    *_POINT, "day", "electrode", "catalyst", "roughness factor", "u(roughness factor)", "value", "u(value)",
)  # fmt: skip
CORRELATIONS = (
    *_POINT, "electrodes", "catalysts", "Spearman rho", "rho low", "rho high", "p", "p by", "verdict",
)  # fmt: skip
FINDINGS = ("severity", "kind", "where", "text", "mend")

TABLES: Mapping[str, tuple[str, ...]] = {
    "series": SERIES,
    "pairs": PAIRS,
    "rankings": RANKINGS,
    "electrodes": ELECTRODES,
    "correlations": CORRELATIONS,
    "findings": FINDINGS,
}

HIGHER, CANNOT_TELL = "higher", "cannot tell"
RISES, FALLS, TOO_FEW = "rises", "falls", "too few"


def enter(
    verdicts: Sequence[Verdicts],
    along: Sequence[AlongRoughness],
    runs: ComparedRuns,
    names: Sequence[str],
    findings: Iterable[Finding],
    level: float,
) -> dict[str, Table]:
    """Every table of a comparison; ``names`` are those of the electrodes, by run."""
    return {
        "series": _table("series", _series(verdicts)),
        "pairs": _table("pairs", _pairs(verdicts, level)),
        "rankings": _table("rankings", _rankings(verdicts, level)),
        "electrodes": _table("electrodes", _electrodes(along, runs, names)),
        "correlations": _table("correlations", _correlations(along, runs, names, level)),
        "findings": _table(
            "findings",
            (
                {
                    "severity": str(one.severity),
                    "kind": one.kind,
                    "where": one.where,
                    "text": one.text,
                    "mend": one.mend,
                }
                for one in findings
            ),
        ),
    }


def _table(name: str, rows: Iterable[Row]) -> Table:
    heads = TABLES[name]
    return Table(name, heads, tuple(tuple(_finite(row.get(head)) for head in heads) for row in rows))


def _finite(cell: Cell) -> Cell:
    return None if isinstance(cell, float) and not math.isfinite(cell) else cell


def _point(one: Verdicts, judged: Judged) -> Row:
    quantity = one.quantity
    return {"quantity": quantity.head, "basis": quantity.basis, "at": judged.at, "point": judged.point}


def _series(verdicts: Sequence[Verdicts]) -> Iterable[Row]:
    for one in verdicts:
        for judged in one.points:
            for value in judged.values:
                yield {
                    **_point(one, judged),
                    "catalyst": value.owner,
                    "E vs RHE / V": value.potential_volt,
                    "u(E vs RHE) / V": value.u_potential_volt,
                    "runs": value.runs,
                    "electrodes": value.electrodes,
                    "value": value.value,
                    "u(value)": value.u,
                    "s(value)": value.deviation,
                    "agreement p": value.agreement,
                    "rank": judged.ranking.catalysts.index(value.owner) + 1,
                }


def _pairs(verdicts: Sequence[Verdicts], level: float) -> Iterable[Row]:
    for one in verdicts:
        for judged in one.points:
            for pair in judged.contest.pairs:
                test = judged.tests.get((pair.one, pair.other))
                yield {
                    **_point(one, judged),
                    "catalyst": pair.one,
                    "other": pair.other,
                    "difference": pair.difference,
                    "u(difference)": pair.u,
                    "difference low": pair.low,
                    "difference high": pair.high,
                    "ratio": pair.ratio,
                    "ratio low": pair.ratio_low,
                    "ratio high": pair.ratio_high,
                    "degrees of freedom": pair.degrees_of_freedom,
                    "p": pair.p,
                    "Holm p": pair.p_holm,
                    "verdict": HIGHER if pair.told_apart(level) else CANNOT_TELL,
                    "Welch t": None if test is None else test.t,
                    "Welch degrees of freedom": None if test is None else test.degrees_of_freedom,
                    "Welch p": None if test is None else test.p,
                    "Hedges g": None if test is None else test.effect,
                }


def _rankings(verdicts: Sequence[Verdicts], level: float) -> Iterable[Row]:
    for one in verdicts:
        for judged in one.points:
            turned = turned_round(one, judged, verdicts, level)
            yield {
                **_point(one, judged),
                "ranking": ranking_text(judged.ranking),
                "leaders": "; ".join(judged.ranking.leaders),
                "analysis of variance p": None if judged.variance is None else judged.variance.p,
                "turned round on the other area": None
                if turned is None
                else "; ".join(f"{a} > {b}" for a, b in turned),
            }


def ranking_text(ranking: Ranking, names: Mapping[str, str] | None = None) -> str:
    """The ranking in a line: > is told apart, ~ is not; pairs told apart across such steps follow in brackets."""
    called = {one: one for one in ranking.catalysts} if names is None else names
    steps = ("", *(" > " if apart else " ~ " for apart in ranking.steps))
    # nobody at all has one step less
    line = "".join(step + called[catalyst] for step, catalyst in zip(steps, ranking.catalysts, strict=False))
    beyond = ", ".join(f"{called[a]} > {called[b]}" for a, b in ranking.beyond)
    return f"{line} ({beyond})" if beyond else line


def turned_round(
    one: Verdicts, judged: Judged, verdicts: Sequence[Verdicts], level: float
) -> tuple[tuple[str, str], ...] | None:
    """Pairs of a point told apart the other way round on the other area; None where there is no other area."""
    other_basis = {GEOMETRIC: REAL, REAL: GEOMETRIC}.get(one.quantity.basis)
    for other in verdicts:
        same = (other.quantity.product, other.quantity.kind) == (one.quantity.product, one.quantity.kind)
        if same and other.quantity.basis == other_basis:
            for there in other.points:
                if (there.at, there.point) == (judged.at, judged.point):
                    return flips(judged.contest, there.contest, level)
    return None


def _electrodes(along: Sequence[AlongRoughness], runs: ComparedRuns, names: Sequence[str]) -> Iterable[Row]:
    rough = nominal(runs.roughness_factor), standard_uncertainty(runs.roughness_factor)
    first = {name: names.index(name) for name in dict.fromkeys(names)}
    for one in along:
        for value in one.values:
            run = first[value.owner]
            yield {
                "quantity": one.quantity.head,
                "basis": one.quantity.basis,
                "at": one.at,
                "point": one.point,
                "day": runs.day[run],
                "electrode": runs.electrode[run][1],
                "catalyst": runs.catalyst[run],
                "roughness factor": float(rough[0][run]),
                "u(roughness factor)": float(rough[1][run]),
                "value": value.value,
                "u(value)": value.u,
            }


def _correlations(
    along: Sequence[AlongRoughness], runs: ComparedRuns, names: Sequence[str], level: float
) -> Iterable[Row]:
    catalyst = dict(zip(names, runs.catalyst, strict=True))
    for one in along:
        found = one.correlation
        yield {
            "quantity": one.quantity.head,
            "basis": one.quantity.basis,
            "at": one.at,
            "point": one.point,
            "electrodes": found.count,
            "catalysts": len({catalyst[value.owner] for value in one.values}),
            "Spearman rho": found.rho,
            "rho low": found.low,
            "rho high": found.high,
            "p": found.p,
            "p by": found.method,
            "verdict": conclusion(one, level),
        }


def conclusion(one: AlongRoughness, level: float) -> str:
    """What a rank correlation says, in a word or two."""
    from coulombook.compare.rank_correlation import FEWEST

    found = one.correlation
    if found.independent < FEWEST:
        return TOO_FEW
    if not found.p < 1.0 - level:
        return CANNOT_TELL
    return RISES if found.rho > 0 else FALLS
