"""Text from the bench's files, made harmless for a screen.

A cell may hold anything: terminal escape sequences, marks that turn the line around, five thousand
characters. What people see shows such characters by their number instead of obeying them. Nothing here
interprets markup.
"""

from __future__ import annotations

import unicodedata

# Characters that act instead of being seen: control, format (bidirectional marks, zero-width), surrogate,
# private use, unassigned, and the separators of lines and paragraphs.
_ACTING = frozenset({"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"})
_SHORT = {"\t": "\\t", "\n": "\\n", "\r": "\\r"}
LONGEST = 300  # characters of one cell worth reading on a screen; the files hold the rest


def visible(text: str, longest: int = LONGEST) -> str:
    r"""The text with every acting character shown by its number, cut to ``longest`` characters.

    >>> visible("a\x1b[31mb\u202ec"), visible("x" * 500, 8)
    ('a\\x1b[31mb\\u202ec', 'xxxxx...')
    """
    # cut first: the rest is not looked at, however long it is
    head = text[: longest + 1]
    shown = head if head.isascii() and head.isprintable() else "".join(map(_shown, head))
    return crop(shown, longest)


def crop(text: str, longest: int) -> str:
    """The text cut to ``longest`` characters, dots standing for what was cut.

    >>> crop("n-propanol", 20), crop("n-propanol", 6), crop("n-propanol", 2)
    ('n-propanol', 'n-p...', '..')
    """
    if len(text) <= longest:
        return text
    return text[: max(longest - 3, 0)] + "..."[:longest]


def _shown(character: str) -> str:
    if character in _SHORT:
        return _SHORT[character]
    if unicodedata.category(character) not in _ACTING:
        return character
    number = ord(character)
    if number < 0x100:
        return f"\\x{number:02x}"
    return f"\\u{number:04x}" if number < 0x10000 else f"\\U{number:08x}"
