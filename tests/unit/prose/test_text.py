from __future__ import annotations

import unicodedata

from hypothesis import given
from hypothesis import strategies as st

from coulombook.prose.text import LONGEST, crop, visible


def test_escape_sequences_are_shown_and_not_obeyed() -> None:
    assert visible("a\x1b[2Jb\x07\x9b") == "a\\x1b[2Jb\\x07\\x9b"


def test_marks_that_turn_the_line_around_are_shown() -> None:
    assert visible("mesh\u202egpj.exe\u2066\u200b") == "mesh\\u202egpj.exe\\u2066\\u200b"


def test_line_breaks_stay_on_the_line() -> None:
    assert visible("a\nb\tc\u2028d") == "a\\nb\\tc\\u2028d"


def test_letters_of_any_script_and_emoji_stay() -> None:
    assert visible("électrode µ 電極 🧪") == "électrode µ 電極 🧪"


def test_a_lone_surrogate_is_shown_by_its_number() -> None:
    assert visible("a\udcff") == "a\\udcff"


def test_long_text_is_cut_with_dots() -> None:
    shown = visible("x" * 5000)
    assert len(shown) == LONGEST
    assert shown.endswith("x...")
    assert crop("abcdef", 3) == "..."


@given(st.text(max_size=400))
def test_nothing_that_acts_on_a_terminal_is_left(text: str) -> None:
    assert not {unicodedata.category(one) for one in visible(text)} & {"Cc", "Cf", "Cs", "Zl", "Zp"}
    assert len(visible(text)) <= LONGEST
