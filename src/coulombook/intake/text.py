"""Delimited text of the bench, in every dialect: encoding, separator, free text above the heads."""

from __future__ import annotations

import codecs
import csv
import io
import re
from collections.abc import Callable, Sequence

from coulombook.intake.limits import LONGEST_LINE

# What stands between cells, the most telling first: a tab or semicolon is never a decimal sign.
SEPARATORS = ("\t", ";", ",")
KNOWN_ENCODINGS = "text in UTF-8, UTF-16 with byte order mark or Windows-1252"

_NEVER_IN_TEXT = re.compile(r"[\x00-\x08\x0b\x0e-\x1f]")


class UnreadableText(ValueError):
    """The bytes are no text of the kinds the bench writes; ``found`` and ``expected`` say why."""

    def __init__(self, found: str, expected: str) -> None:
        self.found = found
        self.expected = expected
        super().__init__(found)


def encoding_of(data: bytes) -> str:
    """The encoding of a text: UTF-16 by its byte order mark, else UTF-8 if it is valid, else Windows-1252.

    A text cut off inside a UTF-8 character still counts as UTF-8.
    """
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        return "utf-16"
    try:
        codecs.getincrementaldecoder("utf-8")().decode(data)
    except UnicodeDecodeError:
        return "cp1252"
    return "utf-8-sig"


def decode(data: bytes) -> str:
    """The text of some bytes.

    Raises `UnreadableText` for binary data: control characters, NUL bytes, or bytes that no known encoding has.
    """
    encoding = encoding_of(data)
    try:
        text = data.decode(encoding)
    except UnicodeDecodeError:
        raise UnreadableText("bytes that are no text", KNOWN_ENCODINGS) from None
    refuse_binary(text)
    return text


def refuse_binary(text: str, rows_above: int = 0) -> None:
    """Raise `UnreadableText` for a text with control characters, of a file with some rows above it."""
    control = _NEVER_IN_TEXT.search(text)
    if control:
        row = rows_above + text.count("\n", 0, control.start()) + 1
        raise UnreadableText(f"binary data (byte 0x{ord(control[0]):02x} in row {row})", KNOWN_ENCODINGS)


def lines_of(text: str) -> list[str]:
    """The lines of a text, ends kept: LF, CR LF and CR alone end a line, nothing else does.

    Raises `UnreadableText` when a line is longer than any table has.
    """
    # newline="" splits at exactly these three and keeps them; str.splitlines knows more
    lines = list(io.StringIO(text, newline=""))
    longest = max(map(len, lines), default=0)
    if longest > LONGEST_LINE:
        row = next(number for number, line in enumerate(lines, 1) if len(line) == longest)
        raise UnreadableText(
            f"a line of more than {LONGEST_LINE} characters in row {row}",
            f"lines of at most {LONGEST_LINE} characters",
        )
    return lines


def split_line(line: str, separator: str) -> list[str]:
    """The cells of one line, blanks around them removed."""
    if '"' not in line:
        return [cell.strip() for cell in line.split(separator)]
    return [cell.strip() for cell in next(csv.reader([line], delimiter=separator), [])]


def find_head_line(lines: Sequence[str], score: Callable[[Sequence[str]], float]) -> tuple[int, str] | None:
    """Place of the head line and its separator: the first line that scores 1, else the best; None if none scores.

    ``score`` says how well cells fill the role of the heads, from 0 to 1.
    """
    best: tuple[float, int, str] | None = None
    for place, line in enumerate(lines):
        if not line.strip():
            continue
        for separator in SEPARATORS:
            # a table of one column has no separator at all
            if separator not in line and separator != SEPARATORS[-1]:
                continue
            value = score(split_line(line, separator))
            if value > 0 and (best is None or value > best[0]):
                best = value, place, separator
        if best is not None and best[0] >= 1:
            break
    return None if best is None else (best[1], best[2])


def guess_separator(lines: Sequence[str]) -> str:
    """The separator that stands most often in a text whose heads nobody knows."""
    sample = "".join(lines[:50])
    return max(reversed(SEPARATORS), key=sample.count)


def rows_below(lines: Sequence[str], head_place: int, separator: str) -> list[tuple[int, list[str]]]:
    """Numbered rows from the head line on; a quoted cell may hold line ends, and is one row as in a spreadsheet."""
    source = io.StringIO("".join(lines[head_place:]), newline="")
    # strict: a quote that never closes would swallow every row below it
    reader = csv.reader(source, delimiter=separator, strict=True)
    rows: list[tuple[int, list[str]]] = []
    try:
        for number, cells in enumerate(reader, head_place + 1):
            rows.append((number, [cell.strip() for cell in cells]))
    except csv.Error as error:
        row = head_place + 1 + len(rows)
        raise UnreadableText(f"{error} in row {row}", "quotes that open and close around a cell") from None
    return rows
