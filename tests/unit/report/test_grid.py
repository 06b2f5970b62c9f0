from __future__ import annotations

import pytest

from coulombook.report.grid import Column, grid


def lines(*columns: Column, gap: int = 2) -> list[str]:
    return grid(columns, rule="-", gap=gap).plain.split("\n")


def test_words_begin_and_numbers_end_under_one_another() -> None:
    run = Column(("", "run"), ("a1", "long-name", ""), words=True)
    total = Column(("total FE", "%"), ("94.6(16)", "101(2)", ""))
    assert lines(run, total) == [
        "           total FE",
        "run               %",
        "-------------------",
        "a1         94.6(16)",
        "long-name    101(2)",
        "",
    ]


def test_an_empty_cell_between_two_others_keeps_its_room() -> None:
    columns = (Column(("a",), ("1",)), Column(("head",), ("",)), Column(("b",), ("2",)))
    assert lines(*columns, gap=1)[-1] == "1      2"


def test_wide_characters_count_as_the_two_cells_they_take() -> None:
    name = Column(("catalyst",), ("電極", "mesh"), words=True)
    number = Column(("n",), ("1", "2"))
    # four cells of text and four of blanks up to the width of the head, then the gap
    assert lines(name, number)[2:] == ["電極      1", "mesh      2"]


@pytest.mark.parametrize("words", [True, False])
def test_a_style_covers_its_cell_and_no_blanks_behind_it(words: bool) -> None:
    text = grid([Column(("closure",), ("short",), words, {0: "yellow"})], rule="-")
    (span,) = [one for one in text.spans if one.style == "yellow"]
    assert text.plain[span.start : span.end].strip() == "short"
    assert not text.plain[span.start : span.end].endswith(" ")
