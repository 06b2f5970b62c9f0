r"""Tables as CSV: full precision, RFC 4180, and no cell that a spreadsheet would run.

Numbers are written so that reading them back gives the same double. An absent value is an empty cell.

Text that came from the bench's files may begin with a sign that makes a spreadsheet take it for a formula.
Such a cell gets one apostrophe in front, as one would type it to keep a text a text, and likewise after a
semicolon, tab or line break within the cell, where a spreadsheet set to another separator would begin a new
cell. A number, with or without a unit ("-1.1 V", the usual level of a series), is no formula and stays as it
is. `original_text` takes the apostrophes away again, exactly.
"""

from __future__ import annotations

import re
from functools import lru_cache

from coulombook.book import Cell, Table

# The full-width signs count as well: a spreadsheet with an East Asian input method reads them as the plain
# ones.
_RUNS = "=+\\-@\N{FULLWIDTH EQUALS SIGN}\N{FULLWIDTH PLUS SIGN}\N{FULLWIDTH HYPHEN-MINUS}\N{FULLWIDTH COMMERCIAL AT}"
_BREAK = re.compile(r"([;\t\r\n])")
_FORMULA = re.compile(rf"([\s\"]*)('*[{_RUNS}])")
_GUARDED = re.compile(rf"([\s\"]*)'('*[{_RUNS}])")
# A number, with or without a unit behind it: nothing in it that a formula could call or refer to.
_NUMBER = re.compile(r"\s*[+-]?(\d+[.,]?\d*|[.,]\d+)([eE][+-]?\d+)?[A-Za-z%\s\u00b0\u00b5\u03bc\u03a9]*")
_QUOTED = re.compile(r"[\",;\t\r\n]|^\s|\s$")


def csv_text(table: Table) -> str:
    """The table as CSV text: heads first, lines ended by a line feed."""
    lines = [",".join(map(_quoted, table.heads))]
    lines.extend(",".join(map(csv_cell, row)) for row in table.rows)
    return "\n".join(lines) + "\n"


def csv_cell(cell: Cell) -> str:
    """One cell as it stands in the file.

    >>> csv_cell(0.1), csv_cell(12), csv_cell(None), csv_cell("=2+3"), csv_cell("-1.1 V"), csv_cell("a, b")
    ('0.1', '12', '', "'=2+3", '-1.1 V', '"a, b"')
    """
    if cell is None:
        return ""
    if isinstance(cell, str):
        return _text_cell(cell)
    if isinstance(cell, float):
        # float.__repr__ and not repr: a numpy double would add its type
        return float.__repr__(cell)
    return str(int(cell))


@lru_cache(maxsize=4096)
def _text_cell(text: str) -> str:
    # names of runs, catalysts and products come again on every row
    return _quoted(harmless_text(text))


def harmless_text(text: str) -> str:
    """The text with an apostrophe wherever a spreadsheet would begin a formula.

    >>> harmless_text("@SUM(A1)"), harmless_text("mesh; =1+1"), harmless_text("'=quoted")
    ("'@SUM(A1)", "mesh; '=1+1", "''=quoted")
    """
    return "".join(_guarded(part) for part in _BREAK.split(text))


def original_text(text: str) -> str:
    """What `harmless_text` was given.

    >>> original_text(harmless_text("'=quoted"))
    "'=quoted"
    """
    return "".join(
        f"{mark[1]}{part[mark.end(1) + 1 :]}" if (mark := _GUARDED.match(part)) else part
        for part in _BREAK.split(text)
    )


def _guarded(part: str) -> str:
    mark = _FORMULA.match(part)
    if mark is None or _NUMBER.fullmatch(part):
        return part
    return f"{mark[1]}'{part[mark.end(1) :]}"


def _quoted(text: str) -> str:
    return '"' + text.replace('"', '""') + '"' if _QUOTED.search(text) else text
