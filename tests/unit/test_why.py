"""The pages of the kinds of finding: what they hold and how they are found; the examples are tallied elsewhere."""

from __future__ import annotations

import ast
import re
import tomllib
from importlib.resources import files
from pathlib import Path

import pytest

import coulombook
from coulombook.findings import KINDS
from coulombook.why import UnknownKind, page_of, without_links

PLACE = files("coulombook").joinpath("data", "why")
KEYS = {"means", "matters", "mend", "bad", "mended"}
# a row of an example stands behind four blanks on a terminal of 80 columns
WIDEST = 76


def test_every_kind_has_a_page_and_every_page_a_kind() -> None:
    assert sorted(one.name for one in PLACE.iterdir()) == sorted(f"{kind}.toml" for kind in KINDS)


def test_every_kind_that_the_program_tells_of_is_in_the_list_and_every_one_in_the_list_is_told_of() -> None:
    source = Path(coulombook.__file__).parent
    words: set[str] = set()
    for path in source.rglob("*.py"):
        if path.name != "findings.py" or path.parent != source:
            tree = ast.parse(path.read_text(encoding="utf-8"))
            words |= {
                node.value
                for node in ast.walk(tree)
                if isinstance(node, ast.Constant) and isinstance(node.value, str)
            }
    # put together from the side on which a reading lies
    assert "-calibration" in words
    words |= {"above-calibration", "below-calibration"}
    assert set(KINDS) - words == set()


@pytest.mark.parametrize("kind", KINDS)
def test_a_page_holds_what_it_should_and_nothing_else(kind: str) -> None:
    text = PLACE.joinpath(f"{kind}.toml").read_text(encoding="utf-8")
    assert all(len(line) <= 120 for line in text.splitlines())
    entry = tomllib.loads(text)
    assert set(entry) >= KEYS
    assert set(entry) - KEYS <= {"command", "beside"}
    assert set(entry.get("beside", ())) <= set(KINDS) - {kind}
    for text in (entry["means"], entry["matters"], entry["mend"]):
        assert text.rstrip().endswith((".", '."', ".)"))
        assert text.isascii()
        assert text.count("`") % 2 == 0
    assert len(entry["means"].split()) > 5
    assert len(entry["matters"].split()) > 10


@pytest.mark.parametrize("kind", KINDS)
def test_an_example_differs_where_it_is_mended_and_is_narrow_enough_for_a_terminal(kind: str) -> None:
    page = page_of(kind)
    assert page.bad != page.mended
    for shown in (page.bad, page.mended):
        for name, text in shown.items():
            assert re.fullmatch(r"[a-z0-9./-]+\.(csv|tsv|toml)|day\.xlsx, sheet '[a-z]+'( \(hidden\))?", name)
            assert all(len(line.expandtabs(4)) <= WIDEST for line in text.splitlines()), name
            assert text.isascii()


@pytest.mark.parametrize(
    "word",
    ["unknown-unit", "error[unknown-unit]", "error[unknown-unit]: runs.csv, row 1", "[unknown-unit]",
     "Unknown Unit", "unknown_unit", " unknown-unit "],
)  # fmt: skip
def test_a_kind_is_found_however_it_was_copied(word: str) -> None:
    assert page_of(word).kind == "unknown-unit"


@pytest.mark.parametrize(
    ("word", "near"),
    [
        ("unknwn-unit", "unknown-unit"),
        ("missing-colum", "missing-column"),
        ("roughness", "no-roughness"),
        ("scan", "scan-rate-off"),
        ("standard outlyin", "standard-outlying"),
    ],
)
def test_an_unknown_kind_suggests_near_ones(word: str, near: str) -> None:
    with pytest.raises(UnknownKind) as caught:
        page_of(word)
    assert near in caught.value.near
    assert len(caught.value.near) <= 8


@pytest.mark.parametrize("word", ["zzz", "", "../../secret", "[]"])
def test_what_is_near_nothing_suggests_nothing(word: str) -> None:
    with pytest.raises(UnknownKind) as caught:
        page_of(word)
    assert caught.value.near == ()


def test_links_become_their_words() -> None:
    assert without_links("add [`[species.NAME]`](day_folder.md#speciesname) to `day.toml`") == (
        "add `[species.NAME]` to `day.toml`"
    )
    assert without_links("`[[uncertainty]]` (of [this](a.md) and [that](b.md))") == (
        "`[[uncertainty]]` (of this and that)"
    )
    for kind in KINDS:
        page = page_of(kind)
        assert ".md" not in without_links(page.means + page.matters + page.mend)
