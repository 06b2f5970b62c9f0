"""The verdict of a comparison in plain words."""

from __future__ import annotations

import math
from collections.abc import Sequence

from coulombook.comparison.judge import LEVEL, POTENTIAL, Judged, Verdicts
from coulombook.comparison.quantities import GEOMETRIC
from coulombook.comparison.tables import turned_round


def verdict(verdicts: Sequence[Verdicts], level: float, open_runs: int) -> str:
    """Who leads by the first quantity, what becomes of current densities on the real area, and what mars it.

    ``open_runs`` is the number of runs whose balance does not close.
    """
    sentences = [_of_quantity(verdicts[0])]
    for one in verdicts:
        if one.quantity.basis == GEOMETRIC:
            sentences.append(_of_bases(one, verdicts, level))
    if open_runs:
        runs = "a run whose balance does" if open_runs == 1 else f"{open_runs} runs whose balances do"
        sentences.append(f"This counts {runs} not close.")
    return " ".join(filter(None, sentences))


def _of_quantity(one: Verdicts) -> str:
    points = one.at(POTENTIAL) or one.at(LEVEL)
    name = one.quantity.words
    if not points:
        return f"Nothing can be compared: no two catalysts have {name} at one level or one potential."
    leads = one.quantity.lowest_first
    word = "lowest" if leads else "highest"
    leaders = {judged.ranking.leaders for judged in points}
    if len(leaders) == 1 and points[0].ranking.settled:
        leader = points[0].ranking.leaders[0]
        return f"{leader} has the {word} {name} at every {_points(points)}{_how_much(leader, points)}."
    if not any(pair.p_holm < math.inf for judged in points for pair in judged.contest.pairs):
        return f"{name} has no uncertainty here by which catalysts could be told apart."
    if all(set(judged.ranking.leaders) == set(judged.ranking.catalysts) for judged in points) and not any(
        any(judged.ranking.steps) or judged.ranking.beyond for judged in points
    ):
        return f"The data cannot tell the catalysts apart by {name} at any {_points(points)}."
    places: dict[tuple[str, ...], list[str]] = {}
    for judged in points:
        places.setdefault(judged.ranking.leaders, []).append(_name(judged))
    parts = []
    for leading, names in places.items():
        where = _listed(names)
        if len(leading) == 1:
            parts.append(f"{leading[0]} has the {word} at {where}")
        else:
            parts.append(f"{_listed(leading)} cannot be told apart at the top at {where}")
    return f"By {name}: {'; '.join(parts)}."


def _how_much(leader: str, points: Sequence[Judged]) -> str:
    """By what factor the leader is ahead of the next, over the points."""
    found = []
    for judged in points:
        following = judged.ranking.catalysts[1]
        for pair in judged.contest.pairs:
            if {pair.one, pair.other} == {leader, following} and math.isfinite(pair.ratio):
                found.append(pair.ratio if pair.one == leader else 1.0 / pair.ratio)
    if len(found) < len(points):
        return ""
    low, high = f"{min(found):.3g}", f"{max(found):.3g}"
    return f", {low if low == high else f'{low} to {high}'} times that of the next"


def _points(points: Sequence[Judged]) -> str:
    kind = "potential" if points[0].at == POTENTIAL else "level"
    if len(points) == 1:
        return f"{kind} compared ({_name(points[0])})"
    first, last = _name(points[0]), _name(points[-1])
    return f"{kind} compared ({first.removesuffix(' V') if kind == 'potential' else first} to {last})"


def _name(judged: Judged) -> str:
    return f"{judged.point} V" if judged.at == POTENTIAL else judged.point


def _listed(words: Sequence[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"


def _of_bases(one: Verdicts, verdicts: Sequence[Verdicts], level: float) -> str:
    """Whether the order by a current density holds on the real area."""
    points = one.at(POTENTIAL) or one.at(LEVEL)
    turned: dict[tuple[str, str], list[str]] = {}
    known = False
    for judged in points:
        pairs = turned_round(one, judged, verdicts, level)
        known = known or pairs is not None
        for pair in pairs or ():
            turned.setdefault(pair, []).append(_name(judged))
    name = one.quantity.words
    if not known:
        return ""
    if not turned:
        return f"No order by {name} turns round on the real area."
    parts = []
    for (ahead, behind), where in turned.items():
        at = "throughout" if len(where) == len(points) else f"at {_listed(where)}"
        parts.append(f"{ahead} is ahead of {behind} per geometric area and behind it per real area {at}")
    return f"By {name}, {'; '.join(parts)}."
