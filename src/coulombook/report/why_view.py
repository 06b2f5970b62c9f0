"""The page of a kind of finding on the terminal, and the list of all kinds."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping

from rich.console import Console
from rich.text import Text

from coulombook.findings import KINDS, Severity
from coulombook.report.terminal import STYLE, WORD
from coulombook.why import Page, without_links

_RANKS = {
    Severity.STOP: ("Faults", "the day cannot be tallied as it stands; nothing is written"),
    Severity.WARN: ("Warnings", "a number may mislead; it is written all the same, and --strict refuses"),
    Severity.NOTE: ("Notes", "something was assumed or left aside"),
}
_MARK = ">"
_TAB = 4  # a tab of a file, in blanks


def show_page(page: Page, console: Console) -> None:
    """Print a page: what it means, why it matters, what to do, and its examples with the differing lines marked."""
    name = f"{WORD[page.severity]}[{page.kind}]"
    _paragraph(name, f": {page.title}", console, STYLE[page.severity])
    _paragraph("", f"{_RANKS[page.severity][0][:-1]}: {_RANKS[page.severity][1]}.", console)
    for head, text in (
        ("What it means. ", page.means),
        ("Why it matters. ", page.matters),
        ("What to do. ", page.mend),
    ):
        console.print()
        _paragraph(head, without_links(text), console)
    told = "" if page.command == "tally DAY" else f", told of by coulombook {page.command}"
    _example(f"Bad{told}", page.bad, page.mended, console)
    _example("Mended", page.mended, page.bad, console)
    if page.beside:
        console.print()
        _paragraph("", f"The same mistake also brings {', '.join(page.beside)}.", console)
    console.print()
    _paragraph(
        "",
        f"The files are invented. Tables are shown whole, settings by section; {_MARK} marks what differs.",
        console,
    )


def show_kinds(console: Console) -> None:
    """Print every kind with its meaning in a line, by severity."""
    for place, (severity, (title, meaning)) in enumerate(_RANKS.items()):
        if place:
            console.print()
        _paragraph(f"{title}: ", meaning, console)
        kinds = {kind: text for kind, (rank, text) in KINDS.items() if rank is severity}
        longest = max(map(len, kinds))
        for kind, text in kinds.items():
            head = Text("  ") + Text(kind.ljust(longest), style=STYLE[severity]) + "  "
            lines = textwrap.wrap(text, max(console.width - len(head), 20))
            for number, line in enumerate(lines):
                console.print((Text(" " * len(head)) if number else head) + line, soft_wrap=True)
    console.print()
    _paragraph("", "coulombook why KIND explains one.", console)


def _paragraph(head: str, text: str, console: Console, style: str = "bold") -> None:
    """Print a paragraph, its head in a style."""
    lines = textwrap.wrap(head + text, max(console.width, 20), break_on_hyphens=False)
    for place, line in enumerate(lines):
        shown = Text(line)
        if not place:
            shown.stylize(style, 0, len(head))
        console.print(shown, soft_wrap=True)


def _example(title: str, files: Mapping[str, str], others: Mapping[str, str], console: Console) -> None:
    console.print()
    console.print(Text(f"{title}:", style="bold"))
    for name, text in files.items():
        console.print(Text(f"  {name}", style="bold"), soft_wrap=True)
        known = others.get(name, "").splitlines()
        if not text:
            console.print(Text("    (not there)"))
        for line in text.splitlines():
            mark = " " if line in known or not line else _MARK
            # rows are not wrapped: they are to be read, and copied, as they stand in the file
            console.print(Text(f"  {mark} {line.expandtabs(_TAB)}".rstrip()), soft_wrap=True)
