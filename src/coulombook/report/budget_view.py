"""Where an uncertainty comes from, as bars of plain characters for a terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich.cells import cell_len
from rich.console import Console
from rich.text import Text

from coulombook.book.shares import SourceShare, largest
from coulombook.prose.numbers import fixed, plain
from coulombook.prose.text import crop, visible
from coulombook.report.terminal import hanging

LONGEST_SOURCE = 32
LONGEST_BAR = 30
LEAST = 0.005  # of the variance; smaller shares are summed up in one line


def show_budget(
    title: str, shares: Sequence[SourceShare], unit: str, others: Sequence[str], console: Console
) -> None:
    """Print the sources of one output, largest first.

    ``unit`` follows the standard uncertainty of each source where one run was asked for; ``others`` are the outputs
    that could be asked for instead.
    """
    console.print(Text(visible(title, 300), style="bold"), soft_wrap=True)
    shown, rest = largest(shares, LEAST)
    if not shares:
        hanging("", "Nothing is known about its uncertainty.", console)
    names = [crop(visible(one.source), LONGEST_SOURCE) for one in shown]
    width = max(map(cell_len, names), default=0)
    shared = max((len(one.shared) for one in shown), default=0)
    for one, name in zip(shown, names, strict=True):
        u = "" if one.u is None else f"  {plain(one.u, 2)}{unit}"
        fixed_part = (
            f"{name}{' ' * (width - cell_len(name))}  {one.shared:{shared}}  {fixed(100 * one.share, 1):>5} %"
        )
        room = min(LONGEST_BAR, console.width - cell_len(fixed_part) - len(u) - 2)
        bar = "#" * max(round(one.share * room), 1 if room > 0 else 0)
        console.print(Text(f"{fixed_part}  {bar:{max(room, 0)}}{u}".rstrip()), soft_wrap=True)
    if rest:
        small = fixed(100 * sum(one.share for one in rest), 1)
        console.print(Text(f"and {len(rest)} smaller, together {small} %", style="dim"))
    if others:
        hanging("", "Others: " + ", ".join(visible(one, 60) for one in others), console)
