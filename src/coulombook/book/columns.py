"""What the columns of the tables mean, from the one place that says it (`data/columns.toml`)."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum
from functools import cache
from importlib.resources import files

from coulombook.book.tables import TABLES


class Kind(StrEnum):
    """What the cells of a column are."""

    TEXT = "text"
    WHOLE = "whole"
    NUMBER = "number"


@dataclass(frozen=True, slots=True)
class Column:
    """One column; ``unit`` is empty for what has none."""

    head: str
    kind: Kind
    unit: str
    meaning: str


@dataclass(frozen=True, slots=True)
class About:
    """What one table holds: a row per ``rows``, told apart by the columns of ``key`` (none: not told apart)."""

    name: str
    rows: str
    key: tuple[str, ...]
    columns: tuple[Column, ...]


@cache
def about_tables() -> Mapping[str, About]:
    """Every table of the results, by its name."""
    text = files("coulombook").joinpath("data", "columns.toml").read_text(encoding="utf-8")
    content = tomllib.loads(text)
    return {name: _about(name, content[name]) for name in TABLES}


def _about(name: str, said: Mapping[str, object]) -> About:
    meanings, texts, wholes, key = (
        said["columns"],
        said.get("text", ()),
        said.get("whole", ()),
        said.get("key", ()),
    )
    assert isinstance(meanings, dict)
    assert isinstance(texts, list | tuple)
    assert isinstance(wholes, list | tuple)
    assert isinstance(key, list | tuple)

    def kind(head: str) -> Kind:
        return Kind.TEXT if head in texts else Kind.WHOLE if head in wholes else Kind.NUMBER

    columns = tuple(Column(head, kind(head), unit_of(head), meanings[head]) for head in TABLES[name])
    return About(name, str(said["rows"]), tuple(key), columns)


def unit_of(head: str) -> str:
    """The unit that a head names.

    >>> unit_of("E vs RHE / V"), unit_of("C2+/C1"), unit_of("run")
    ('V', '', '')
    """
    return head.partition(" / ")[2]
