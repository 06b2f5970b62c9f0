"""A comparison on the terminal: the verdict first, then who has what at which potential, then by how much.

Catalysts are called by letters in the tables, so that six of them fit 80 columns. Text from the bench's files goes
through `prose.text`.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from pathlib import Path
from string import ascii_uppercase

from rich.console import Console
from rich.text import Text

from coulombook.compare.rank_correlation import FEWEST
from coulombook.comparison.judge import LEVEL, POTENTIAL, AlongRoughness, Judged, Verdicts
from coulombook.comparison.order import Comparison
from coulombook.comparison.quantities import GEOMETRIC, REAL
from coulombook.comparison.runs import Contender
from coulombook.comparison.tables import TOO_FEW, conclusion, ranking_text
from coulombook.prose.numbers import ABSENT, between, fixed, plain, with_uncertainty
from coulombook.prose.text import crop, visible
from coulombook.report.grid import GAP, Column, grid
from coulombook.report.terminal import CAUTIONS, hanging, show_findings

LONGEST_NAME = 30
LONGEST_LEVEL = 12
LONGEST_QUANTITY = 24
LONGEST_VERDICT = 2000
LEAST_P = 1e-3  # smaller ones say nothing more to anybody
_AREA = {"": "", GEOMETRIC: ", per geometric area", REAL: ", per real area"}


def show_comparison(comparison: Comparison, console: Console, *, written: Path | None = None) -> None:
    """Print a comparison; ``written`` is the folder its tables went to."""
    names = _letters(comparison.contenders)
    hanging("", "; ".join(visible(day, 100) for day in comparison.days), console)
    console.print()
    hanging("", comparison.verdict, console, longest=LONGEST_VERDICT)
    console.print()
    _show_contenders(comparison.contenders, names, console)
    console.print()
    hanging("", _how_to_read(comparison.level), console)
    for place, one in enumerate(comparison.verdicts):
        for kind in (POTENTIAL, LEVEL):
            if one.at(kind):
                console.print()
                _show_points(one, kind, names, console)
        decided = one.at(POTENTIAL) or one.at(LEVEL)
        if place == 0 and decided:
            console.print()
            _show_lead(one, decided, names, comparison.level, console)
    _show_roughness(comparison, console)
    console.print()
    if comparison.findings:
        show_findings(comparison.findings, console)
        console.print()
    for day, count in comparison.warnings.items():
        if count:
            what = "warning" if count == 1 else "warnings"
            hanging("", f"{visible(day, 100)} has {count} {what} of its own; see coulombook check", console)
    console.print(Text(CAUTIONS, style="dim"))
    if written is not None:
        console.print(Text(f"Written to {visible(str(written), 1000)}"), soft_wrap=True)


def _how_to_read(level: float) -> str:
    return (
        "31.2(14) is 31.2 with a standard uncertainty (k = 1) of 1.4. Best first: > is told apart at "
        f"{plain(100 * level, 2)} % over all pairs of a table, ~ cannot be told apart."
    )


def _letters(contenders: Sequence[Contender]) -> dict[str, str]:
    """A letter for each catalyst; numbers where the alphabet ends."""
    if len(contenders) > len(ascii_uppercase):
        return {one.name: str(place) for place, one in enumerate(contenders, start=1)}
    return {one.name: letter for one, letter in zip(contenders, ascii_uppercase, strict=False)}


def _show_contenders(contenders: Sequence[Contender], names: Mapping[str, str], console: Console) -> None:
    rough = [
        ABSENT if math.isnan(one.roughest) else between(plain(one.least_rough, 3), plain(one.roughest, 3))
        for one in contenders
    ]
    columns = [
        Column(("", ""), tuple(names[one.name] for one in contenders), True),
        Column(("", "catalyst"), tuple(crop(visible(one.name), LONGEST_NAME) for one in contenders), True),
        Column(("", "electrodes"), tuple(str(one.electrodes) for one in contenders)),
        Column(("", "runs"), tuple(str(one.runs) for one in contenders)),
        Column(
            ("E vs RHE", "V"),
            tuple(between(fixed(one.lowest_volt, 2), fixed(one.highest_volt, 2)) for one in contenders),
        ),
        Column(("", "roughness"), tuple(rough)),
    ]
    _print(grid(columns, rule=_rule(console)), console)


def _show_points(one: Verdicts, kind: str, names: Mapping[str, str], console: Console) -> None:
    """One quantity at all points of a kind: catalysts across, in blocks where need be, and the order beside them."""
    points = one.at(kind)
    there = [
        name for name in names if any(name == value.owner for judged in points for value in judged.values)
    ]
    at_level = " at levels" if kind == LEVEL else ""
    title = f"{one.quantity.head}{_AREA[one.quantity.basis]}{at_level}"
    if one.quantity.lowest_first:
        title += ", lowest first"
    console.print(Text(title, style="bold"), soft_wrap=True)
    labels = Column(
        ("E vs RHE / V" if kind == POTENTIAL else "level",),
        tuple(crop(visible(judged.point), LONGEST_LEVEL) for judged in points),
        kind == LEVEL,
    )
    columns = [Column((names[name],), tuple(_value(judged, name) for judged in points)) for name in there]
    order = Column(("order",), tuple(ranking_text(judged.ranking, names) for judged in points), True)
    for block in _blocks([*columns, order], console.width - labels.width):
        if block[0] is not columns[0]:
            console.print()
        _print(grid([labels, *block], rule=_rule(console)), console)


def _value(judged: Judged, name: str) -> str:
    for value in judged.values:
        if value.owner == name:
            return with_uncertainty(value.value, value.u)
    return ABSENT


def _blocks(columns: Sequence[Column], room: int) -> list[list[Column]]:
    """Columns in blocks that fit the room, each with one column at least."""
    blocks: list[list[Column]] = [[]]
    left = room
    for column in columns:
        if blocks[-1] and column.width + GAP > left:
            blocks.append([])
            left = room
        blocks[-1].append(column)
        left -= column.width + GAP
    return blocks


def _show_lead(
    one: Verdicts, points: Sequence[Judged], names: Mapping[str, str], level: float, console: Console
) -> None:
    """How far the first of each point is ahead of the others."""
    rows = []
    for judged in points:
        first = judged.ranking.catalysts[0]
        order = {name: place for place, name in enumerate(judged.ranking.catalysts)}
        pairs = [pair for pair in judged.contest.pairs if first in (pair.one, pair.other)]
        for pair in sorted(pairs, key=lambda pair: max(order[pair.one], order[pair.other])):
            rows.append((judged, pair))
    percent = f"{plain(100 * level, 2)} %"
    console.print(
        Text(f"by how much: {one.quantity.head}, with intervals of {percent}", style="bold"), soft_wrap=True
    )
    shown = [
        "" if place and rows[place - 1][0] is judged else crop(visible(judged.point), LONGEST_LEVEL)
        for place, (judged, _) in enumerate(rows)
    ]
    columns = [
        Column(("E vs RHE / V" if points[0].at == POTENTIAL else "level",), tuple(shown)),
        Column(("pair",), tuple(f"{names[pair.one]} - {names[pair.other]}" for _, pair in rows), True),
        Column(("difference",), tuple(_interval(pair.difference, pair.low, pair.high) for _, pair in rows)),
        Column(("ratio",), tuple(_interval(pair.ratio, pair.ratio_low, pair.ratio_high) for _, pair in rows)),
        Column(("p (Holm)",), tuple(_probability(pair.p_holm) for _, pair in rows)),
    ]
    _print(grid(columns, rule=_rule(console)), console)


def _interval(value: float, low: float, high: float) -> str:
    """A value with the ends of its interval, to two digits of the shorter half."""
    if math.isnan(value):
        return ABSENT
    half = min(value - low, high - value)
    if not half > 0:
        return plain(value, 3)
    decimals = max(0, 1 - math.floor(math.log10(half)))
    return f"{fixed(value, decimals)} ({fixed(low, decimals)} to {fixed(high, decimals)})"


def _probability(p: float) -> str:
    if math.isnan(p):
        return ABSENT
    return fixed(p, 3) if p >= LEAST_P else f"< {LEAST_P:g}"


def _show_roughness(comparison: Comparison, console: Console) -> None:
    """Rank correlations with the roughness factor, at the potentials or, where there are none, the levels."""
    kind = POTENTIAL if any(one.at == POTENTIAL for one in comparison.along) else LEVEL
    shown = [one for one in comparison.along if one.at == kind]
    if not shown:
        return
    console.print()
    percent = f"{plain(100 * comparison.level, 2)} %"
    title = f"Spearman's rank correlation with the roughness factor over n electrodes, {percent}"
    console.print(Text(title, style="bold"), soft_wrap=True)
    heads = [one.quantity.head for one in shown]
    columns = [
        Column(
            ("quantity",),
            tuple(
                "" if place and heads[place - 1] == head else crop(visible(head), LONGEST_QUANTITY)
                for place, head in enumerate(heads)
            ),
            True,
        ),
        Column(
            ("E / V" if kind == POTENTIAL else "level",),
            tuple(crop(visible(one.point), LONGEST_LEVEL) for one in shown),
        ),
        Column(("n",), tuple(str(one.correlation.count) for one in shown)),
        Column(("rho",), tuple(_correlation(one) for one in shown)),
        Column(("p",), tuple(_probability(one.correlation.p) for one in shown)),
        Column(("",), tuple(conclusion(one, comparison.level) for one in shown), True),
    ]
    _print(grid(columns, rule=_rule(console)), console)
    hanging("", _about_roughness(shown, comparison), console)


def _correlation(one: AlongRoughness) -> str:
    found = one.correlation
    if math.isnan(found.low):
        return fixed(found.rho, 2)
    return f"{fixed(found.rho, 2)} ({fixed(found.low, 2)} to {fixed(found.high, 2)})"


def _about_roughness(shown: Sequence[AlongRoughness], comparison: Comparison) -> str:
    if all(conclusion(one, comparison.level) == TOO_FEW for one in shown):
        return (
            f"Too few: with fewer than {FEWEST} electrodes, or catalysts where these have several, no order of ranks "
            "convinces."
        )
    return (
        "Where catalysts have several electrodes, which are alike in more than roughness, p and intervals count the "
        "catalysts. These differ in more than roughness too: this is no proof of a cause."
    )


def _print(text: Text, console: Console) -> None:
    console.print(text, soft_wrap=True)


def _rule(console: Console) -> str:
    return "-" if console.options.ascii_only else "\N{BOX DRAWINGS LIGHT HORIZONTAL}"
