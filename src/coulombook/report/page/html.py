"""Markup that cannot be broken by what stands in it.

An element is made of its name, its attributes and its children. A child is either markup that was made here
(`Html`) or plain text, and plain text is escaped: there is no way to turn a string into markup but `trusted`,
which is for files of the package alone. Names of elements and attributes come from the code, never from data.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import TypeAlias

from coulombook.prose.text import visible

LONGEST = 2000  # characters of one text; a cell of five thousand is cut, the files hold it whole
_EMPTY = frozenset({"meta"})  # without content
_ENDS_ITSELF = frozenset(
    {"td", "th", "tr", "li"}
)  # HTML lets the next one, or the end of what holds it, end it
_BARE = re.compile(r"[\w.+-]+")  # needs no quotes


@dataclass(frozen=True, slots=True)
class Html:
    """Finished markup."""

    text: str


Child: TypeAlias = "Html | str | Iterable[Child] | None"
Attribute: TypeAlias = "str | int | float | bool | Html | None"


def element(name: str, /, *children: Child, **attributes: Attribute) -> Html:
    """One element.

    An attribute is written as in Python: ``class_``, ``aria_label``, ``data_u``; True gives it without a value, None
    and False leave it out.

    >>> element("p", "1 < 2 & ", element("b", "so"), class_="note", hidden=False).text
    '<p class=note>1 &lt; 2 &amp; <b>so</b></p>'
    >>> element("p", "<script>", title='"quoted"').text
    '<p title="&quot;quoted&quot;">&lt;script&gt;</p>'
    """
    opening = f"<{name}{_attributes(attributes)}>" if attributes else f"<{name}>"
    if name in _EMPTY:
        return Html(opening)
    if name in _ENDS_ITSELF:
        return Html(opening + _content(children))
    return Html(f"{opening}{_content(children)}</{name}>")


def join(*children: Child) -> Html:
    """Children side by side, without an element around them."""
    return Html(_content(children))


def whole(text: str) -> Html:
    """Text escaped but neither cut nor changed: for figures and records that a script reads from an attribute.

    >>> whole('["<b>"]').text
    '[&quot;&lt;b&gt;&quot;]'
    """
    return Html(_escaped(text))


def trusted(text: str) -> Html:
    """Markup as it stands. Only for what the package itself wrote, never for anything read from a day."""
    return Html(text)


def _content(children: Iterable[Child]) -> str:
    parts = []
    for child in children:
        if isinstance(child, Html):
            parts.append(child.text)
        elif isinstance(child, str):
            parts.append(escaped(child))
        elif child is not None:
            parts.append(_content(child))
    return "".join(parts)


def _attributes(attributes: dict[str, Attribute]) -> str:
    parts = []
    for key, value in attributes.items():
        name = key.rstrip("_").replace("_", "-")
        if isinstance(value, Html):
            parts.append(f' {name}="{value.text}"')
        elif value is True:
            parts.append(f" {name}")
        elif value is not None and value is not False:
            text = str(value)
            parts.append(f" {name}={text}" if _BARE.fullmatch(text) else f' {name}="{escaped(text)}"')
    return "".join(parts)


@lru_cache(maxsize=8192)
def escaped(text: str) -> str:
    """Text as it stands in an element or between the quotes of an attribute, acting characters made visible."""
    # names of runs and products come again on every row
    return _escaped(visible(text, LONGEST))


def _escaped(text: str) -> str:
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;").replace('"', "&quot;")
