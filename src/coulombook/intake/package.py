"""The package of a workbook before anything of it is parsed: whether it is whole, of a bearable size, and plain XML.

A workbook is a ZIP of XML parts (ECMA-376). Both unpack to thousands of times their size if somebody means harm, so
that sizes, numbers of tags and document types are looked at first; nothing is ever unpacked to the disk.
"""

from __future__ import annotations

import itertools
import re
import zipfile
import zlib
from collections.abc import Iterator
from xml.parsers import expat

from coulombook.intake.limits import (
    LARGEST_MARKUP_BYTE,
    LARGEST_SIDE_PART_BYTE,
    LARGEST_UNPACKED_BYTE,
    LONGEST_PROLOGUE_BYTE,
    MOST_PARTS,
    MOST_ROW_TAGS,
    MOST_SHEETS,
    MOST_SIDE_TAGS,
    MOST_TAGS,
)

_BLOCK = 1 << 20
_OLD_WORKBOOK = bytes.fromhex(
    "d0cf11e0a1b11ae1"
)  # a compound file: an old workbook, or one behind a password
_SHEET_PART = re.compile(r"xl/worksheets/[^/]*\.xml", re.IGNORECASE)
_STRINGS_PART = re.compile(r"xl/sharedStrings\.xml", re.IGNORECASE)
_ROW_END = re.compile(rb"</(?:[\w.-]+:)?row\s*>")
_EMPTY_ROW = re.compile(rb"<(?:[\w.-]+:)?row(?:\s[^<>]*)?/>")
_SHEET = re.compile(rb"<(?:[\w.-]+:)?sheet\s")
# of a package that is damaged or means harm, whatever its reading happens to hit
DAMAGE = (zipfile.BadZipFile, OSError, ValueError, EOFError, RuntimeError, NotImplementedError, zlib.error)


class BadPackage(ValueError):
    """A package that is not opened; ``found``, ``expected`` and ``mend`` say why."""

    def __init__(self, found: str, expected: str = "", mend: str = "") -> None:
        self.found = found
        self.expected = expected or "a workbook (.xlsx) that opens"
        self.mend = mend
        super().__init__(found)


def refuse_foreign(data: bytes) -> None:
    """Raise `BadPackage` for what is no package, where it can be told what it is."""
    if data.startswith(_OLD_WORKBOOK):
        raise BadPackage(
            "an old workbook (.xls), or one locked with a password",
            mend="save it as .xlsx without a password; protected sheets may stay protected",
        )


def refuse_harmful(package: zipfile.ZipFile) -> None:
    """Raise `BadPackage` for a package that would fill the memory or an evening, or whose XML is more than data.

    Raises one of `DAMAGE` where the package is not whole.
    """
    parts = package.infolist()
    unpacked = sum(part.file_size for part in parts)
    markup = sum(part.file_size for part in parts if _is_of_tables(part))
    smaller = "move what is no table of the day to another workbook"
    if unpacked > LARGEST_UNPACKED_BYTE or len(parts) > MOST_PARTS:
        raise BadPackage(f"{unpacked / 1e6:.0f} MB in {len(parts)} parts when unpacked",
                         f"a workbook of at most {LARGEST_UNPACKED_BYTE / 1e6:.0f} MB unpacked", smaller)  # fmt: skip
    if markup > LARGEST_MARKUP_BYTE:
        raise BadPackage(f"{markup / 1e6:.0f} MB of cells when unpacked",
                         f"at most {LARGEST_MARKUP_BYTE / 1e6:.0f} MB of cells", smaller)  # fmt: skip
    tags = side_tags = 0
    for part in parts:
        if not _is_xml(package, part):
            continue  # a picture
        if _is_of_tables(part):
            here, in_row = _tags(package, part)
            tags += here
            if in_row > MOST_ROW_TAGS and _SHEET_PART.fullmatch(part.filename):
                raise BadPackage(f"more than {MOST_ROW_TAGS} tags from one row to the next in {part.filename}",
                                 "rows of at most 16384 cells, as spreadsheet programs keep them", smaller)  # fmt: skip
            continue
        if part.file_size > LARGEST_SIDE_PART_BYTE:
            raise BadPackage(f"{part.file_size / 1e6:.0f} MB of {part.filename}",
                             f"at most {LARGEST_SIDE_PART_BYTE / 1e6:.0f} MB beside the cells", smaller)  # fmt: skip
        side_tags += _tags(package, part)[0]
    if tags > MOST_TAGS:
        raise BadPackage(f"{tags / 1e6:.0f} million tags of cells",
                         f"at most {MOST_TAGS / 1e6:.0f} million, some two million cells", smaller)  # fmt: skip
    if side_tags > MOST_SIDE_TAGS:
        raise BadPackage(f"{side_tags / 1e6:.1f} million tags of styles and the like",
                         f"at most {MOST_SIDE_TAGS / 1e6:.1f} million beside the cells",
                         "copy the values of the tables into a new workbook")  # fmt: skip
    _refuse_many_sheets(package)


def _is_of_tables(part: zipfile.ZipInfo) -> bool:
    return bool(_SHEET_PART.fullmatch(part.filename) or _STRINGS_PART.fullmatch(part.filename))


def _is_xml(package: zipfile.ZipFile, part: zipfile.ZipInfo) -> bool:
    """Whether a part is XML as far as its first element. Raises `BadPackage` for a document type above it.

    A document type is where bombs of entities live; no spreadsheet program writes one. The prologue is read by the
    parser that will read the rest, for it may stand behind comments of any length and in any encoding.
    """
    parser = expat.ParserCreate()
    seen: list[str] = []

    def refuse(*_: object) -> None:
        raise BadPackage(f"a document type in {part.filename}", mend="save the file again")

    parser.StartDoctypeDeclHandler = refuse
    parser.StartElementHandler = lambda name, attributes: seen.append(name)
    above = 0
    for block in blocks(package, part, 4096):
        try:
            parser.Parse(block, False)
        except expat.ExpatError:
            return bool(seen)
        if seen:
            return True
        above += len(block)
        if above > LONGEST_PROLOGUE_BYTE:  # the parser would begin anew with each block
            raise BadPackage(f"more than {LONGEST_PROLOGUE_BYTE / 1e6:.0f} MB of comments above the XML of "
                             f"{part.filename}", mend="save the file again")  # fmt: skip
    return False


def blocks(package: zipfile.ZipFile, part: zipfile.ZipInfo | str, first: int = _BLOCK) -> Iterator[bytes]:
    """The bytes of a part, block by block."""
    with package.open(part) as stream:
        take = first
        while block := stream.read(take):
            yield block
            take = _BLOCK


def _tags(package: zipfile.ZipFile, part: zipfile.ZipInfo) -> tuple[int, int]:
    """How many tags a part has, and how many at most from one row's end to the next, rows without cells left out."""
    tags = most = since = 0
    left = b""
    for block in itertools.chain(blocks(package, part), (b"<",)):  # the last one lets the rest go
        text = left + block
        # a tag may lie across two blocks
        cut = max(text.rfind(b"<"), 0)
        text, left = text[:cut], text[cut:]
        tags += text.count(b"<")
        for place, piece in enumerate(_ROW_END.split(text)):
            since = (0 if place else since) + piece.count(b"<") - len(_EMPTY_ROW.findall(piece))
            most = max(most, since)
    return tags, most


def _refuse_many_sheets(package: zipfile.ZipFile) -> None:
    sheets = sum(
        len(_SHEET.findall(package.read(part)))
        for part in package.infolist()
        if part.filename.casefold().endswith("workbook.xml")
    )
    if sheets > MOST_SHEETS:
        raise BadPackage(f"{sheets} sheets", f"at most {MOST_SHEETS} sheets", "keep the tables of the day")
