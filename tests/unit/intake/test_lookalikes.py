"""Letters of other alphabets that look Latin."""

from __future__ import annotations

import unicodedata

import pytest

from coulombook.intake import lookalikes
from coulombook.intake.lookalikes import lookalike, plain


def test_table_pairs_letters_of_one_case_from_other_alphabets() -> None:
    """The shapes are from memory; that each is a letter of the alphabet and case it is listed for is not."""
    for alphabet, table in (("CYRILLIC", lookalikes._CYRILLIC), ("GREEK", lookalikes._GREEK)):
        for letter, latin in table.items():
            assert unicodedata.name(letter).startswith(alphabet)
            assert latin.isascii()
            assert unicodedata.category(letter) == unicodedata.category(latin)


@pytest.mark.parametrize(
    ("text", "seen", "told"),
    [
        ("\u0415 / V", "E / V", "sign 1 is '\u0415' (U+0415, cyrillic capital letter ie), not 'E'"),
        ("I / m\u0391", "I / mA", "sign 6 is '\u0391' (U+0391, greek capital letter alpha), not 'A'"),
        ("E\u200b / V", "E / V", "sign 2 shows nothing (U+200B, zero width space)"),
        ("\u202eE / V", "E / V", "sign 1 shows nothing (U+202E, right-to-left override)"),
        ("\uff25 / V", "E / V", "sign 1 is '\uff25' (U+FF25, fullwidth latin capital letter e), not 'E'"),
        ("E \u2044 V", "E / V", "sign 3 is '\u2044' (U+2044, fraction slash), not '/'"),
    ],
)
def test_deceiving_sign_is_named_with_its_place(text: str, seen: str, told: str) -> None:
    assert plain(text) == seen
    assert lookalike(text) == told


@pytest.mark.parametrize("text", ["E / V", "I / µA", "R / Ω", "scan rate / mV s⁻¹", "Fläche / cm²", "ß"])
def test_honest_text_deceives_nobody(text: str) -> None:
    assert lookalike(text) is None
