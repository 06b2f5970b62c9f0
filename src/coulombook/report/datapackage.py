"""The description of a results folder for machines, after the open Data Package standard.

Source: Data Package, version 2.0 (https://datapackage.org/standard/data-package/), with its parts Data Resource,
Table Schema and Table Dialect. A unit has no place of its own there and stands as the property ``unit``, which the
standard allows.
"""

from __future__ import annotations

import hashlib
import json
import re
import unicodedata
from collections.abc import Mapping

import coulombook
from coulombook.book import Book
from coulombook.book.columns import About, Column, Kind, about_tables

NAME = "datapackage.json"
_PROFILE = "https://datapackage.org/profiles/2.0/datapackage.json"
_TYPES = {Kind.TEXT: "string", Kind.WHOLE: "integer", Kind.NUMBER: "number"}


def datapackage_text(book: Book, files: Mapping[str, bytes]) -> str:
    """The descriptor as JSON: every table with its columns, their types, units and meanings.

    Parameters
    ----------
    book : Book
        Gives the day its name and title.
    files : mapping of file name to bytes
        As written beside it; those that are no table of the results are left to the manifest.
    """
    known = about_tables()
    content = {
        "$schema": _PROFILE,
        "name": _slug(book.day),
        "title": book.title or book.day,
        "description": "Faradaic efficiencies of a day of CO2 electrolysis; u(...) is a standard uncertainty, k = 1.",
        "version": coulombook.__version__,
        "resources": [
            _resource(about, files[f"{name}.csv"]) for name, about in known.items() if f"{name}.csv" in files
        ],
    }
    return json.dumps(content, indent=2, ensure_ascii=True) + "\n"


def _resource(about: About, content: bytes) -> dict[str, object]:
    schema: dict[str, object] = {
        "fields": [_field(column) for column in about.columns],
        "missingValues": [""],
    }
    if about.key:
        schema["primaryKey"] = list(about.key)
    return {
        "name": about.name,
        "type": "table",
        "path": f"{about.name}.csv",
        "description": f"one row per {about.rows}",
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "dialect": {"delimiter": ",", "lineTerminator": "\n", "quoteChar": '"', "doubleQuote": True},
        "bytes": len(content),
        "hash": f"sha256:{hashlib.sha256(content).hexdigest()}",
        "schema": schema,
    }


def _field(column: Column) -> dict[str, str]:
    field = {"name": column.head, "type": _TYPES[column.kind], "description": column.meaning}
    return field | ({"unit": column.unit} if column.unit else {})


def _slug(text: str) -> str:
    """A name as the standard wants it: small letters, digits and hyphens."""
    plain = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode().casefold()
    return re.sub(r"[^a-z0-9]+", "-", plain).strip("-") or "day"
