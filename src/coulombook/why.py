"""What each kind of finding means: one page for each, kept as TOML in ``data/why/<kind>.toml``.

A page holds

- ``means``, ``matters``, ``mend``: what it means, which outputs it moves and to which side, and what to do; plain
  words in which a name from the files stands between back-ticks, and links are those of the folder ``docs``;
- ``bad`` and ``mended``: files of a day as the bench may write them, and as they should be. A table is shown whole,
  of a settings file the sections it is about, and an empty text says that the file is not there; the rest of the day
  is good. ``day.xlsx, sheet 'gas'`` is a sheet, in which ``^`` is a cell merged with the one above;
- ``command``, if it is not that of every day: what tells of it, such as ``tally DAY --reconcile``;
- ``beside``, if any: kinds that the same mistake brings as well.

Severity and title are those of `coulombook.findings.KINDS` and stand nowhere else. A test tallies every example and
holds that the kind is told of, and that it is gone once mended; the document of the findings is written from the
pages.
"""

from __future__ import annotations

import difflib
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.resources import files

from coulombook.findings import KINDS, Severity

_LINK = re.compile(r"\[((?:`[^`]*`|[^]\[`])*)\]\([^()]*\)")
_MOST_NEAR = 8  # suggestions for a kind that is not known


@dataclass(frozen=True, slots=True)
class Page:
    """What there is to know of one kind; ``bad`` and ``mended`` map the name of a file to its text."""

    kind: str
    severity: Severity
    title: str
    means: str
    matters: str
    mend: str
    bad: Mapping[str, str]
    mended: Mapping[str, str]
    command: str = "tally DAY"
    beside: tuple[str, ...] = ()


class UnknownKind(Exception):
    """No kind is called so; ``near`` holds those that may be meant, the likeliest first."""

    def __init__(self, word: str, near: tuple[str, ...]) -> None:
        self.word = word
        self.near = near
        super().__init__(f"there is no kind of finding '{word}'")


def page_of(word: str) -> Page:
    """The page of a kind, named as it is or as a finding shows it.

    Raises `UnknownKind`.

    >>> page_of("unknown-unit") == page_of("error[unknown-unit]:") == page_of("Unknown unit")
    True
    """
    kind = _as_kind(word)
    if kind not in KINDS:
        raise UnknownKind(word, _near(kind))
    severity, title = KINDS[kind]
    text = files("coulombook").joinpath("data", "why", f"{kind}.toml").read_text(encoding="utf-8")
    entry = tomllib.loads(text)
    return Page(
        kind,
        severity,
        title,
        _one_line(entry["means"]),
        _one_line(entry["matters"]),
        _one_line(entry["mend"]),
        entry["bad"],
        entry["mended"],
        entry.get("command", "tally DAY"),
        tuple(entry.get("beside", ())),
    )


def without_links(text: str) -> str:
    """A text of a page where nothing can be followed: the words of its links alone.

    >>> without_links("see [closure](equations.md#closure) of `[balance]`")
    'see closure of `[balance]`'
    """
    return _LINK.sub(r"\1", text)


def _as_kind(word: str) -> str:
    inner = re.search(r"\[([^]\[]*)\]", word)
    return "-".join((inner[1] if inner else word).casefold().replace("_", " ").split())


def _near(word: str) -> tuple[str, ...]:
    """Kinds that are written like the word, then those that have all its words."""
    parts = word.split("-")
    alike = difflib.get_close_matches(word, KINDS, 3, 0.7)
    holding = [kind for kind in KINDS if word and all(part in kind.split("-") for part in parts)]
    return tuple(dict.fromkeys([*alike, *holding]))[:_MOST_NEAR]


def _one_line(text: str) -> str:
    return " ".join(text.split())
