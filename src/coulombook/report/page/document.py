"""The whole page: head, contents, parts, and the style and scripts it carries, allowed by their own fingerprints."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Sequence
from functools import cache
from importlib.resources import files

from coulombook.book import Book
from coulombook.report.page.drawings import Drawings
from coulombook.report.page.html import Html, element, join, trusted
from coulombook.report.page.parts import Part, parts_of
from coulombook.report.page.svg import Styles
from coulombook.report.terminal import HOW_TO_READ

_STYLES = ("vendor/uPlot.min.css", "style.css")
_SCRIPTS = ("page.js", "tables.js", "figures.js", "traces.js")
_VENDOR, _VENDOR_LICENCE = "vendor/uPlot.iife.min.js", "vendor/uPlot-LICENSE.txt"


def page_html(book: Book) -> str:
    """The page of a book, whole in itself. The same book gives the same page."""
    styles = Styles()
    drawings = Drawings(book, styles)
    parts = parts_of(book, drawings)
    style = "".join(_asset(name) for name in _STYLES) + styles.sheet()
    script = _script()
    title = f"{book.day}: {book.title}" if book.title else book.day
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=_policy(style, script)),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="color-scheme", content="light dark"),
        element("title", title),
        trusted(f"<style>{style}</style>"),
    )
    body = element(
        "body",
        element("a", "Skip to the results", href="#verdict", class_="skip"),
        element(
            "header",
            element("p", "Ledger of the day", class_="over"),
            element("h1", book.day),
            element("p", book.title, class_="title") if book.title else None,
            element("p", HOW_TO_READ, class_="how"),
        ),
        _contents(parts),
        element("main", (_section(part) for part in parts)),
        element(
            "footer",
            element(
                "p", "Written by coulombook. Every figure stands in full in the tables beside this page."
            ),
        ),
        trusted(f"<script>{script}</script>"),
    )
    return f'<!DOCTYPE html>\n<html lang="en">{join(head, body).text}</html>\n'


def _contents(parts: Sequence[Part]) -> Html:
    return element(
        "nav",
        element("ul", (element("li", element("a", part.short, href=f"#{part.name}")) for part in parts)),
        aria_label="Parts of this page",
    )


def _section(part: Part) -> Html:
    heading = f"h-{part.name}"
    return element(
        "section",
        element("h2", part.heading, id=heading),
        part.content,
        id=part.name,
        aria_labelledby=heading,
    )


@cache
def _asset(name: str) -> str:
    return files("coulombook.report.page").joinpath(name).read_text(encoding="utf-8")


@cache
def _script() -> str:
    """All scripts as one. The notice of what is vendored stands before it; its own first line names an address."""
    vendored = _asset(_VENDOR).partition("\n")[2]
    own = "\n".join(_asset(name) for name in _SCRIPTS)
    return (
        f'/* uPlot 1.6.32\n{_asset(_VENDOR_LICENCE)}*/\n{vendored}\n(() => {{\n"use strict";\n{own}}})();\n'
    )


def _policy(style: str, script: str) -> str:
    """Nothing from anywhere, and of what stands inline only what was written here."""
    return (
        f"default-src 'none'; style-src 'sha256-{_digest(style)}'; script-src 'sha256-{_digest(script)}'; "
        "base-uri 'none'; form-action 'none'"
    )


def _digest(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode("ascii")
