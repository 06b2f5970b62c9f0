"""Tables for a notebook, as HTML of the plainest kind; every text from a file is escaped."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

from coulombook.prose.text import visible

MOST_ROWS = 60  # as many as people scroll through; the frame holds the rest
_NUMBER = 'style="text-align: right; font-variant-numeric: tabular-nums"'
_TEXT = 'style="text-align: left"'


def html_table(
    caption: str, heads: Sequence[str], rows: Iterable[Sequence[str]], texts: Iterable[str] = ()
) -> str:
    """A table of cells that are text already; columns under ``texts`` begin, the others end under one another.

    >>> print(html_table("a < b", ["run"], [["<b>"]], ["run"]))
    <table>
    <caption style="text-align: left; font-weight: bold">a &lt; b</caption>
    <thead><tr><th scope="col" style="text-align: left">run</th></tr></thead>
    <tbody>
    <tr><td style="text-align: left">&lt;b&gt;</td></tr>
    </tbody>
    </table>
    """
    begin = set(texts)
    styles = [_TEXT if head in begin else _NUMBER for head in heads]
    scoped = [f'scope="col" {style}' for style in styles]
    lines = [
        "<table>",
        f'<caption style="text-align: left; font-weight: bold">{_text(caption)}</caption>',
        f"<thead>{_row('th', heads, scoped)}</thead>",
        "<tbody>",
    ]
    left = 0
    for place, cells in enumerate(rows):
        if place < MOST_ROWS:
            lines.append(_row("td", cells, styles))
        else:
            left += 1
    if left:
        lines.append(f'<tr><td colspan="{len(heads)}" {_TEXT}>and {left} more rows</td></tr>')
    return "\n".join([*lines, "</tbody>", "</table>"])


def _row(tag: str, cells: Sequence[str], styles: Sequence[str]) -> str:
    inner = "".join(
        f"<{tag} {style}>{_text(cell)}</{tag}>" for cell, style in zip(cells, styles, strict=True)
    )
    return f"<tr>{inner}</tr>"


def _text(text: str) -> str:
    return escape(visible(text))
