"""Delimited text in every dialect."""

from __future__ import annotations

import itertools

import pytest

from coulombook.intake import schema
from coulombook.intake.grid import Grid, grid_of_text
from coulombook.intake.text import UnreadableText, decode, lines_of

ROWS = [["vial", "analyte", "signal", "protons", "integral"], ["v1", "DMSO", "CH3", "6", "600.5"]]


def _grid(data: bytes) -> Grid:
    return grid_of_text(data, "liquid.csv", schema.LIQUID.score)


@pytest.mark.parametrize(
    ("separator", "encoding", "newline", "above"),
    list(
        itertools.product(
            ",;\t",
            ("utf-8", "utf-8-sig", "utf-16", "cp1252"),
            ("\n", "\r\n", "\r"),
            ([], ["Gerät µ°C", "", "a, b; c"]),
        )
    ),
)
def test_every_dialect_gives_the_same_table(
    separator: str, encoding: str, newline: str, above: list[str]
) -> None:
    text = newline.join([*above, *(separator.join(row) for row in ROWS), ""])
    grid = _grid(text.encode(encoding))
    assert grid.heads == tuple(ROWS[0])
    assert [list(row) for row in grid.rows] == [ROWS[1]]
    # counted as the spreadsheet does, blank lines and free text with it
    assert grid.head_row == len(above) + 1
    assert grid.numbers == (len(above) + 2,)


def test_trailing_blank_rows_and_columns_are_ignored() -> None:
    text = "vial;analyte;signal;protons;integral;;\nv1;DMSO;CH3;6;1;;\n;;;;;;\n\n  \n"
    grid = _grid(text.encode())
    assert grid.heads == tuple(ROWS[0])
    assert grid.numbers == (2,)


def test_quoted_cells_may_hold_separators_and_line_ends() -> None:
    text = 'vial,analyte,signal,protons,integral\n"v,1","DM\nSO",CH3,6,1\nv2,DMSO,CH3,6,1\n'
    grid = _grid(text.encode())
    assert list(grid.rows[0][:2]) == ["v,1", "DM\nSO"]
    # a spreadsheet shows a cell of two lines in one row
    assert grid.numbers == (2, 3)


def test_heads_are_found_below_free_text_that_names_one_of_them() -> None:
    text = "vial,of today\nvial,analyte,signal,protons,integral\nv1,DMSO,CH3,6,1\n"
    assert _grid(text.encode()).head_row == 2


@pytest.mark.parametrize(
    ("data", "found"),
    [
        (b"a,b\0c\n", "byte 0x00 in row 1"),
        (b"\x89PNG\r\n\x1a\n\x01\x02", "binary data"),
        (bytes([0x81, 0x8D, 0xFF]) * 9, "no text"),
        (b"x" * 3_000_000, "a line of more than"),
        (b"\n\n", "an empty file"),
        (b'vial,analyte,signal,protons,integral\nv1,"DMSO,CH3,6,1\n', "in row 2"),
    ],
)
def test_what_is_no_table_of_text_is_refused(data: bytes, found: str) -> None:
    with pytest.raises(UnreadableText, match=found):
        _grid(data)


def test_utf8_wins_over_windows_1252_where_it_is_valid() -> None:
    assert decode("µ".encode()) == "µ"
    assert decode("µ".encode("cp1252")) == "µ"


def test_only_line_feeds_and_returns_end_a_line() -> None:
    assert lines_of("a\x0cb\u2028c\r\nd") == ["a\x0cb\u2028c\r\n", "d"]
