"""A day on the terminal: what a tired person needs of it, at 80 columns or more.

First Faradaic efficiency against potential for each catalyst, then how each run closes, then what the
reader should know, and last where the files are. Text from the bench's files goes through `prose.text` and
is never taken for markup; colour repeats what words say already.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TextIO

from rich.console import Console
from rich.text import Text

from coulombook.book import Book
from coulombook.findings import KINDS, Finding, Severity
from coulombook.prose.text import LONGEST, visible
from coulombook.report.pivot import catalyst_tables
from coulombook.report.terminal_tables import show_catalyst, show_runs

NARROWEST, USUAL = 20, 80  # columns of a console
AT_MOST = 10  # findings of one kind; the rest are counted

CAUTIONS = (
    "Carbon monoxide poisons, hydrogen burns, and gas under pressure can burst a cell: vent, detect and "
    "relieve them as your local codes and licensed professionals require. No figure here stands in for that."
)
HOW_TO_ASK = "coulombook why KIND explains one"
HOW_TO_READ = "FE in %; 31.2(14) is 31.2 with a standard uncertainty (k = 1) of 1.4."

WORD = {Severity.STOP: "error", Severity.WARN: "warning", Severity.NOTE: "note"}
STYLE = {Severity.STOP: "bold red", Severity.WARN: "bold yellow", Severity.NOTE: "bold cyan"}
_RANK = {Severity.STOP: 0, Severity.WARN: 1, Severity.NOTE: 2}
_KIND_RANK = {kind: place for place, kind in enumerate(KINDS)}


class _Console(Console):
    def on_broken_pipe(self) -> None:
        # rich would end the process; whether an unread report is a fault is for the command to say
        raise


def console_for(stream: TextIO) -> Console:
    """A console that takes no text for markup, links or emoji names."""
    console = _Console(file=stream, markup=False, emoji=False, highlight=False, soft_wrap=False)
    # a terminal that tells of no columns has some; and in very few every word would be cut to pieces
    console.width = max(console.width or USUAL, NARROWEST)
    return console


def show_book(book: Book, console: Console, *, written: Path | None = None) -> None:
    """Print a whole book; ``written`` is the folder its files went to."""
    title = f"{visible(book.day, 100)}: {visible(book.title, 200)}" if book.title else visible(book.day, 100)
    console.print(Text(title, style="bold"))
    console.print(Text(HOW_TO_READ, style="dim"))
    for table in catalyst_tables(book):
        console.print()
        show_catalyst(table, console)
    console.print()
    show_runs(list(book.tables["summary"].records()), console)
    console.print()
    if "closure" in book.tables and "explanations" in book.tables:
        from coulombook.report.explain_view import verdict

        hanging("", verdict(book), console)
        console.print()
    if book.findings:
        show_findings(book.findings, console)
        console.print()
    console.print(Text(CAUTIONS, style="dim"))
    if written is not None:
        # one line even if it is long, so that it can be copied
        console.print(Text(f"Written to {visible(str(written), 1000)}"), soft_wrap=True)


def show_check(lines: Sequence[str], findings: Sequence[Finding], console: Console) -> None:
    """Print what a tally would compute, and every finding."""
    for line in lines:
        console.print(Text(visible(line, 1000)))
    console.print()
    if findings:
        show_findings(findings, console)
        console.print()
    stops = sum(one.severity is Severity.STOP for one in findings)
    if stops:
        console.print(
            Text(f"{_count(stops, 'fault')} to mend before this day can be tallied.", style="bold red")
        )
    else:
        console.print(Text("This day can be tallied.", style="bold green"))


def show_findings(findings: Iterable[Finding], console: Console, *, least: Severity = Severity.NOTE) -> None:
    """Print findings: faults first, causes before consequences, at most ten of one kind; then how to learn more.

    ``least`` leaves out what is milder than that severity.
    """
    kinds: dict[tuple[int, int, str], list[Finding]] = {}
    for one in findings:
        if _RANK[one.severity] <= _RANK[least]:
            rank = (_RANK[one.severity], _KIND_RANK.get(one.kind, len(_KIND_RANK)), one.kind)
            kinds.setdefault(rank, []).append(one)
    for place, (_, same) in enumerate(sorted(kinds.items(), key=lambda item: item[0])):
        if place:
            console.print()
        _show_kind(same, console)
    if kinds:
        console.print()
        console.print(Text(HOW_TO_ASK, style="dim"))


def _show_kind(same: Sequence[Finding], console: Console) -> None:
    """Findings of one kind; equal ones at several places stand together, a common advice once."""
    places: dict[Finding, list[str]] = {}
    for one in same:
        places.setdefault(replace(one, where=""), []).append(one.where)
    shown = list(places.items())[:AT_MOST]
    advice = {one.mend for one, _ in shown}
    for place, (one, wheres) in enumerate(shown):
        last = place == len(shown) - 1
        _show_finding(
            one, wheres, console, with_mend=last or len(advice) > 1 or one.severity is Severity.STOP
        )
    if len(places) > AT_MOST:
        console.print(Text(f"and {len(places) - AT_MOST} more of {WORD[same[0].severity]}[{same[0].kind}]"))


def _show_finding(one: Finding, wheres: Sequence[str], console: Console, *, with_mend: bool) -> None:
    where = "; ".join(map(visible, wheres[:AT_MOST]))
    if len(wheres) > AT_MOST:
        where += f"; and {len(wheres) - AT_MOST} more"
    kind = Text(f"{WORD[one.severity]}[{visible(one.kind, 60)}]", style=STYLE[one.severity])
    console.print(kind + Text(f": {where}", style="default"))
    if one.text:
        hanging("  ", one.text, console)
    for label, text in (
        ("found:", one.found),
        ("expected:", one.expected),
        ("mend:", one.mend if with_mend else ""),
    ):
        if text:
            hanging(f"  {label:10}", text, console)


def hanging(label: str, text: str, console: Console, *, longest: int = LONGEST) -> None:
    """Print a text behind its label, further lines under its own beginning."""
    lines = Text(visible(text, longest)).wrap(console, max(console.width - len(label), 20))
    for place, line in enumerate(lines):
        line.rstrip()
        console.print(Text(" " * len(label) if place else label) + line, soft_wrap=True)


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
