"""How cells look. No meaning hangs on colour alone: entered cells are framed, computed ones slanted."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from coulombook.report.workbook.cells import Kind

if TYPE_CHECKING:
    from xlsxwriter import Workbook
    from xlsxwriter.format import Format

_INK, _SOFT, _PAPER = "#1B2A33", "#5B6B75", "#FFFFFF"
_HEAD, _HOW = "#24485C", "#E9EFF2"
_THIN = 1  # of borders
_BASE: Mapping[str, Any] = {"font_name": "Calibri", "font_size": 10, "font_color": _INK, "valign": "top"}

LOOKS: Mapping[str, Mapping[str, Any]] = {
    "title": {"font_size": 15, "bold": True, "font_color": _HEAD, "valign": "vcenter"},
    "about": {"font_color": _SOFT, "valign": "vcenter"},
    "section": {"font_size": 12, "bold": True, "font_color": _HEAD, "bottom": _THIN, "bottom_color": _HEAD},
    "head": {"bold": True, "font_color": _PAPER, "bg_color": _HEAD, "text_wrap": True, "valign": "vcenter",
             "border": _THIN, "border_color": _PAPER, "align": "left", "indent": 1},
    "how": {"italic": True, "font_size": 8, "font_color": _SOFT, "bg_color": _HOW, "text_wrap": True,
            "bottom": _THIN, "bottom_color": _HEAD, "align": "left", "indent": 1},
    "link": {"font_color": "#0B5CAD", "underline": 1},
    "plain": {"text_wrap": True},
    "code": {"font_name": "Consolas", "font_size": 8, "font_color": _SOFT},
}  # fmt: skip
_KINDS: Mapping[Kind, Mapping[str, Any]] = {
    Kind.TEXT: {"align": "left", "indent": 1},  # numbers as well: they are labels
    Kind.ENTERED: {"bg_color": "#FFF6D6", "border": _THIN, "border_color": "#B99A3C"},
    Kind.COMPUTED: {"italic": True, "font_color": "#5A3E78", "bg_color": "#F3F0F7"},
    Kind.FORMULA: {},
}
PARTED: Mapping[str, Any] = {"top": _THIN, "top_color": _SOFT}


class Numbers(dict[str, "Format"]):
    """Formats of one kind of cell by number format, each made when it is first asked for."""

    def __init__(self, workbook: Workbook, kind: Kind) -> None:
        super().__init__()
        self._make, self._look = workbook.add_format, _KINDS[kind]

    def __missing__(self, number_format: str) -> Format:
        self[number_format] = made = self._make({**_BASE, **self._look, "num_format": number_format})
        return made


class Styles:
    """The formats of one workbook, each made once."""

    def __init__(self, workbook: Workbook) -> None:
        self._workbook = workbook
        self._looks: dict[object, Format] = {}
        self._numbers = {kind: Numbers(workbook, kind) for kind in Kind}

    def look(self, name: str) -> Format:
        """One of `LOOKS`."""
        return self._of(name, LOOKS[name])

    def numbers(self, kind: Kind) -> Numbers:
        """The formats of the numbers of a kind."""
        return self._numbers[kind]

    def words(self, kind: Kind, wrapped: bool = False) -> Format:
        """Text of a kind."""
        return self._of((kind, wrapped), {**_KINDS[kind], "align": "left", "indent": 1, "text_wrap": wrapped})

    def _of(self, key: object, look: Mapping[str, Any]) -> Format:
        made = self._looks.get(key)
        if made is None:
            made = self._looks[key] = self._workbook.add_format({**_BASE, **look})
        return made
