"""A drawing of the figures, made part of the page.

An SVG is read as XML and written again from what is known to draw and do nothing else. Its ids are made its own, its
styles become classes that all drawings share (a page that forbids inline styles stays obeyed), its inks turn with the
page's light and dark, and every mark says its value: as a title for any reader, as an attribute for the script.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from itertools import count
from xml.etree import ElementTree as ET

from coulombook.report.page.html import Html, escaped, trusted
from coulombook.report.page.paths import dots, rounded, short_path

_DRAWS = frozenset(
    {"g", "path", "use", "text", "tspan", "rect", "circle", "line", "clipPath", "defs", "pattern"}
)
_PLACES = frozenset({
    "x", "y", "x1", "y1", "x2", "y2", "cx", "cy", "r", "width", "height", "transform", "patternUnits",
    "patternTransform", "clip-path", "viewBox",
})  # fmt: skip
_STYLES = frozenset({
    "fill", "fill-rule", "fill-opacity", "stroke", "stroke-width", "stroke-linecap", "stroke-linejoin",
    "stroke-dasharray", "stroke-dashoffset", "stroke-opacity", "stroke-miterlimit", "opacity", "font-size",
    "text-anchor",
})  # fmt: skip
_REFERENCE = re.compile(r"url\(#([^)]+)\)")
_FONT = re.compile(r"(?:^|\s)([\d.]+px)")
_SAFE = re.compile(r"[\w#.,%()\s-]*")
_PATH = re.compile(r"[MLHVCSQTAZmlhvcsqtaz\d\s.,eE+-]*")
_DARK_INKS = frozenset({"#000000", "#222222", "#333333", "black"})
_PAPERS = frozenset({"#ffffff", "white"})
_SOFT_INKS = frozenset({"#666666", "#808080", "#999999"})
_UPRIGHT = re.compile(r"rotate\(-?0[ )]")
_HREF = "{http://www.w3.org/1999/xlink}href"


@dataclass(slots=True)
class Styles:
    """The classes and hatches of all drawings of a page: each once."""

    classes: dict[str, str] = field(default_factory=dict)
    hatches: dict[str, str] = field(default_factory=dict)  # what a hatch holds -> its id

    def named(self, style: str) -> str:
        """The class of a style."""
        return self.classes.setdefault(style, f"z{len(self.classes)}")

    def sheet(self) -> str:
        """The rules of all classes."""
        return "".join(f".{name}{{{style}}}" for style, name in self.classes.items())


def adopt(svg: str, number: int, styles: Styles, *, label: str, marks: Mapping[str, str]) -> Html:
    """The drawing as an element of the page.

    Parameters
    ----------
    svg : str
        Of `coulombook.figures.sheet.inline_svg`.
    number : int
        Of the drawing within the page; makes its ids its own.
    styles : Styles
        Is filled with what the drawing needs.
    label : str
        What it shows, for readers that do not see it.
    marks : mapping of str to str
        What the element of each id says: its value in words.
    """
    root = ET.fromstring(svg)
    writer = _Writer(f"d{number}-", styles, marks)
    view = root.get("viewBox", "0 0 1 1")
    # what refers to a hatch stands before it
    writer.share_hatches(root)
    content = "".join(writer.written(one, False) for one in root)
    return trusted(
        f'<svg viewBox="{rounded(view)}" role="group" aria-label="{escaped(label)}" class="drawing">{content}</svg>'
    )


class _Writer:
    """Writes the elements of one drawing."""

    def __init__(self, prefix: str, styles: Styles, marks: Mapping[str, str]) -> None:
        self._prefix, self._styles, self._marks = prefix, styles, marks
        self._ids: dict[str, str] = {}
        self._next: Iterator[int] = count()

    def written(self, one: ET.Element, fixed: bool) -> str:
        """An element with all below it; ``fixed`` keeps its inks as they are."""
        name = one.tag.rpartition("}")[2]
        if name not in _DRAWS:
            return ""
        said = self._marks.get(one.get("id", ""))
        if name == "pattern" and not self._ids[one.attrib["id"]].startswith(self._prefix):
            return ""
        if name == "path" and fixed and (points := dots(one.get("d", ""))) is not None:
            return self._points(one, *points)
        inside = fixed or name == "pattern"
        content = "".join(self.written(child, inside) for child in one)
        if name in ("text", "tspan"):
            content = escaped(one.text or "") + content
        if name in ("g", "defs") and not content:
            return ""
        attributes = self._attributes(one, name, inside)
        if name == "g" and not attributes and said is None:
            return content
        if said is not None:
            attributes += ' class="mark"'
            content = f"<title>{escaped(said)}</title>{content}"
        return f"<{name}{attributes}>{content}</{name}>" if content else f"<{name}{attributes}/>"

    def share_hatches(self, root: ET.Element) -> None:
        """Let hatches that an earlier drawing of the page holds be taken from there."""
        for one in root.iter():
            if one.tag.endswith("}pattern"):
                content = "".join(self.written(child, True) for child in one)
                own = self._id(one.attrib["id"])
                self._ids[one.attrib["id"]] = self._styles.hatches.setdefault(content, own)

    def _attributes(self, one: ET.Element, name: str, fixed: bool) -> str:
        parts = []
        # only what others refer to needs a name
        if name in ("path", "clipPath", "pattern") and "id" in one.attrib:
            parts.append(f' id="{self._id(one.attrib["id"])}"')
        style = self._style(one, fixed)
        if style:
            parts.append(f' class="{self._styles.named(style)}"')
        for key, value in one.attrib.items():
            if key == _HREF and value.startswith("#"):
                parts.append(f' href="#{self._id(value[1:])}"')
            elif key == "d" and _PATH.fullmatch(value):
                parts.append(f' d="{short_path(value)}"')
            elif key == "transform" and _UPRIGHT.match(value):
                continue
            elif key in _PLACES:
                parts.append(f' {key}="{escaped(self._referring(rounded(value)))}"')
        return "".join(parts)

    def _points(self, one: ET.Element, path: str, width: float) -> str:
        """The discs of a hatch as points with round caps."""
        colour = re.search(r"fill:\s*(#[0-9a-fA-F]{6})", one.get("style", ""))
        style = f"stroke:{colour[1] if colour else '#222222'};stroke-width:{width:.2f};stroke-linecap:round"
        return f'<path class="{self._styles.named(style)}" d="{path}"/>'

    def _id(self, name: str) -> str:
        known = self._ids.get(name)
        if known is None:
            known = self._ids[name] = f"{self._prefix}{next(self._next)}"
        return known

    def _referring(self, value: str) -> str:
        return _REFERENCE.sub(lambda found: f"url(#{self._id(found[1])})", value)

    def _style(self, one: ET.Element, fixed: bool) -> str:
        parts = [part.partition(":")[::2] for part in one.get("style", "").split(";")]
        parts += [(key, one.get(key, "")) for key in ("fill", "stroke", "opacity")]
        found = {}
        for key, value in ((key.strip(), value.strip()) for key, value in parts):
            if key == "font" and (size := _FONT.search(value)):
                found["font-size"] = size[1]
            # a style is words, numbers and colours; anything else is nothing a drawing needs
            elif key in _STYLES and value and _SAFE.fullmatch(value):
                found[key] = self._referring(rounded(value))
        coloured = found.get("fill", "none") not in {"none", *_DARK_INKS, *_PAPERS}
        if not (fixed or coloured):
            found = {key: _ink(value) for key, value in found.items()}
        return ";".join(f"{key}:{value}" for key, value in found.items())


def _ink(value: str) -> str:
    """Black, white and grey as the inks of the page, which turn with light and dark."""
    if value in _DARK_INKS:
        return "var(--ink)"
    if value in _PAPERS:
        return "var(--paper)"
    return "var(--soft)" if value in _SOFT_INKS else value
