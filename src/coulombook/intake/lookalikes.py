"""Letters that look like others: a Cyrillic E in a head reads like a Latin one to everybody but a program."""

from __future__ import annotations

import unicodedata

# Letters of other alphabets whose usual shape is that of a Latin one. From memory of the two alphabets, checked by
# their names in the Unicode database in the tests; shapes are not part of that database.
_CYRILLIC = dict(zip("АВЕЅІЈКМНОРСТУХаеѕіјорсухԁһ", "ABESIJKMHOPCTYXaesijopcyxdh", strict=True))
_GREEK = dict(zip("ΑΒΕΖΗΙΚΜΝΟΡΤΥΧονυ", "ABEZHIKMNOPTYXovu", strict=True))
_SIGNS = {
    "\N{FRACTION SLASH}": "/",
    "\N{DIVISION SLASH}": "/",
    "\N{HYPHEN}": "-",
    "\N{NON-BREAKING HYPHEN}": "-",
    "\N{EN DASH}": "-",
    "\N{EM DASH}": "-",
}
_LOOKALIKES = _CYRILLIC | _GREEK | _SIGNS


def plain(text: str) -> str:
    """The text with each lookalike written as what it looks like, and without marks that show nothing.

    >>> plain("\\u0415 / V")
    'E / V'
    """
    if text.isascii():
        return text
    shown = "".join(_LOOKALIKES.get(one, one) for one in text if not _shows_nothing(one))
    # full-width and other compatibility forms, but not the signs of units that have forms of their own
    return "".join(unicodedata.normalize("NFKC", one) if one not in "µΩ²³⁻¹" else one for one in shown)


def _shows_nothing(sign: str) -> bool:
    # zero-width spaces, joiners, byte order marks and marks of writing direction
    return unicodedata.category(sign) == "Cf"


def lookalike(text: str) -> str | None:
    """What deceives in a text, in words; None where nothing does.

    >>> lookalike("\\u0415 / V")
    "sign 1 is 'Е' (U+0415, cyrillic capital letter ie), not 'E'"
    """
    for place, one in enumerate(text, 1):
        name = unicodedata.name(one, "unnamed").lower()
        if not one.isascii() and _shows_nothing(one):
            return f"sign {place} shows nothing (U+{ord(one):04X}, {name})"
        seen = plain(one)
        if seen != one and one not in "\N{NO-BREAK SPACE}":
            return f"sign {place} is '{one}' (U+{ord(one):04X}, {name}), not '{seen}'"
    return None
