"""How cells look. No meaning hangs on colour alone: entered cells are framed, computed ones slanted."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from coulombook.report.workbook.cells import Kind
from coulombook.report.workbook.digits import GENERAL

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


class Styles:
    """The formats of one workbook, each made once."""

    def __init__(self, workbook: Workbook) -> None:
        self._workbook = workbook
        self._made: dict[tuple[object, object], Format] = {}

    def look(self, name: str) -> Format:
        """One of `LOOKS`."""
        return self._of(("look", name), LOOKS[name])

    def cell(self, kind: Kind, number_format: str = "") -> Format:
        """A number of a kind, with its number format."""
        made = self._made.get((kind, number_format))
        return made or self._of(
            (kind, number_format), {**_KINDS[kind], "num_format": number_format or GENERAL}
        )

    def words(self, kind: Kind, wrapped: bool = False) -> Format:
        """Text of a kind."""
        return self._of((kind, wrapped), {**_KINDS[kind], "align": "left", "indent": 1, "text_wrap": wrapped})

    def _of(self, key: tuple[object, object], look: Mapping[str, Any]) -> Format:
        made = self._made.get(key)
        if made is None:
            made = self._made[key] = self._workbook.add_format({**_BASE, **look})
        return made
